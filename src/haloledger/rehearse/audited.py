"""The audit's own code on the tables of a simulated survey; only the draws of the foreground sums are kept."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from haloledger.catalogs import read_bursts, read_galaxies, read_groups
from haloledger.cosmos.background import Cosmos
from haloledger.engine.universe import Universe
from haloledger.gas.models import load_model
from haloledger.haloes.build import Haloes, halo_list
from haloledger.ledger.nuisances import checked
from haloledger.ledger.sightline_ledger import make_ledger, prepare
from haloledger.rehearse.survey import Seen

Progress = Callable[[int, int, str], None]


@dataclass(frozen=True)
class Audited:
    """Draws of the foreground sum of each line (n_lines, n_draws) [pc cm-3], and the mean of each entry in it."""

    sums: np.ndarray
    at_source: np.ndarray  # mean DM at the source (n_lines,)
    entry_line: np.ndarray
    entry_row: np.ndarray  # catalogue row that stands for the halo
    entry_mean: np.ndarray  # mean DM, in the foreground sum or at the source
    haloes: Haloes


def run_audit(
    seen: Seen, model: str, draws: int, seed: int, cosmos: Cosmos, hold: dict[str, str], tell: Progress
) -> Audited:
    """Audit all lines of the survey."""
    tell(0, 1, "one list of haloes")
    haloes = halo_list([read_galaxies(t) for t in seen.galaxies], [read_groups(t) for t in seen.groups], cosmos)
    bursts = read_bursts(seen.bursts)
    universe = Universe(seed=seed, n_draws=draws, held=checked(hold))
    ground = prepare(bursts, haloes, [load_model(model)], [], universe, cosmos, None)
    n = len(bursts)
    sums, at_source = np.empty((n, draws), dtype=np.float32), np.empty(n)
    line, row, mean = [], [], []
    for i in range(n):
        tell(i, n, "sightlines")
        (ledger,) = make_ledger(ground, i, keep_draws=True)
        assert ledger.terms is not None
        sums[i] = ledger.terms["dm_foreground"]
        at_source[i] = ledger.terms["dm_at_source"].mean()
        for entry in ledger.entries:
            if entry["halo"] != "shared":
                line.append(i)
                row.append(entry["halo"])
                mean.append(entry["dm_mean"])
    return Audited(sums, at_source, np.array(line, dtype=int), np.array(row), np.array(mean), haloes)
