"""A rehearsal on the screen: calibration, bias by kind of halo, scores."""

from __future__ import annotations

from rich.console import Console
from rich.table import Table

from haloledger.rehearse.ideal import Ideal
from haloledger.rehearse.rehearsal import Rehearsal
from haloledger.rehearse.score import LEVELS, Calibration

FAR = 3.0
"""Standard errors from which a departure is marked."""


def show(result: Rehearsal, to: Console, title: str = "", ideal: Ideal | None = None) -> None:
    """Print the tables of one rehearsal."""
    to.print(_calibration(result.rows, title or "Share of true sums inside central intervals"))
    to.print(_kinds(result))
    spare = f"True DM in haloes the survey does not show: {result.unlisted.mean():.1f} pc cm-3 a sightline."
    to.print(f"Score (CRPS) {result.crps:.2f}, median 16-84 width {result.width:.1f} pc cm-3. {spare}")
    if ideal is not None:
        to.print(
            f"Ideal posterior (every halo and the survey known): CRPS {ideal.crps:.2f}, width {ideal.width:.1f}; "
            f"the audit's is {result.width / ideal.width:.2f} times as wide."
        )


def cell(held: float, level: float, error: float) -> str:
    """Share held and its distance from the level in standard errors, marked where it is far."""
    off = (held - level) / error if error > 0 else float("nan")
    return f"{100 * held:.1f} ({off:+.1f}{'!' if abs(off) > FAR else ''})"


def _calibration(rows: list[Calibration], title: str) -> Table:
    table = Table(title=title, title_justify="left", box=None, pad_edge=False, header_style="bold")
    table.add_column("sightlines")
    for name in ("number", *(f"{100 * level:.0f}%" for level in LEVELS), "true mean", "predicted", "bias"):
        table.add_column(name, justify="right")
    for row in rows:
        if not row.n:
            continue
        held = [cell(h, level, e) for h, level, e in zip(row.held, LEVELS, row.error, strict=True)]
        means = (f"{row.mean_truth:.1f}", f"{row.mean_predicted:.1f}", bias_text(row))
        table.add_row(row.name, str(row.n), *held, *means)
    return table


def bias_text(row: Calibration) -> str:
    """Bias and its standard error in per cent of the true mean; in pc cm-3 where nothing is true."""
    if row.mean_truth <= 0:
        return f"{row.mean_predicted - row.mean_truth:+.2f} pc cm-3"
    return f"{100 * row.bias:+.1f} ± {100 * row.bias_error / row.mean_truth:.1f}%"


def _kinds(result: Rehearsal) -> Table:
    table = Table(box=None, pad_edge=False, header_style="bold")
    table.add_column("what is listed of a halo")
    for name in ("haloes", "true DM a line", "predicted"):
        table.add_column(name, justify="right")
    for name, (n, true, predicted) in result.entry_bias.items():
        table.add_row(name, str(n), f"{true:.2f}", f"{predicted:.2f}")
    return table
