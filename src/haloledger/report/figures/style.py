"""What all pictures share: colours that differ in lightness too, type sizes, saving."""

from __future__ import annotations

from pathlib import Path
from typing import Any

from matplotlib import colormaps, rc_context
from matplotlib.axis import Axis
from matplotlib.backends.backend_agg import FigureCanvasAgg
from matplotlib.colors import Colormap, ListedColormap
from matplotlib.figure import Figure
from matplotlib.ticker import FuncFormatter

from haloledger.errors import InputError
from haloledger.report.names import shorten

INK = "#1b1b1b"
QUIET = "#8a8a8a"
DETAIL = "#5f5f5f"
FAINT = "#d9d9d9"
BURST = "#d55e00"  # vermilion of the Okabe-Ito set: apart from every colour of the map, also without red or green
LEFT_OVER = "#0072b2"
LINES = ("#0072b2", "#d55e00", "#009e73", "#cc79a7", "#e69f00", "#56b4e9", "#1b1b1b")  # Okabe & Ito 2008
STYLES = ("-", "--", "-.", ":", (0, (5, 1, 1, 1, 1, 1)), (0, (1, 1)), (0, (8, 3)))

PIXELS_PER_INCH = 110

_RC: dict[str, Any] = {
    "font.size": 10,
    "font.family": "DejaVu Sans",
    "axes.titlesize": 10.5,
    "axes.titlelocation": "left",
    "axes.titleweight": "bold",
    "axes.spines.top": False,
    "axes.spines.right": False,
    "axes.edgecolor": QUIET,
    "axes.labelcolor": INK,
    "xtick.color": INK,
    "ytick.color": INK,
    "text.color": INK,
    "svg.fonttype": "path",
}


def styled():
    """Context in which a picture is drawn: nothing of the user's own settings is changed or used."""
    import matplotlib

    settings: Any = {**matplotlib.rcParamsDefault}
    return rc_context(settings | _RC | {"backend": "agg", "text.parse_math": False})


def dm_colours() -> Colormap:
    """Light to dark with DM; the palest part is left out so that every halo is seen on white."""
    return ListedColormap(colormaps["viridis_r"](range(45, 256)), name="dm")


def same_minus(axis: Axis) -> None:
    """Numbers on the axis with the minus of the tables and the screen, wherever the picture is drawn."""
    axis.set_major_formatter(FuncFormatter(lambda value, _: f"{value:.10g}"))


def new_figure(width: float, height: float) -> Figure:
    """A figure on its own canvas: no window system, no global state."""
    figure = Figure(figsize=(width, height), dpi=PIXELS_PER_INCH, facecolor="white")
    FigureCanvasAgg(figure)
    return figure


def short(name: str, longest: int = 30) -> str:
    """A name that fits a label, without control characters."""
    return shorten(name, longest)


def save(figure: Any, path: Path | str) -> Path:
    """Save as PNG or SVG, by the suffix; InputError for another one."""
    path = Path(path)
    kind = path.suffix.lower().removeprefix(".")
    if kind not in ("png", "svg"):
        raise InputError(f"{path}: pictures are written as .png or .svg. Write {path.with_suffix('.png')}.")
    with styled():
        try:
            # no date inside: the same picture is the same file
            figure.savefig(path, format=kind, metadata={"Date": None} if kind == "svg" else None)
        except OSError as error:
            raise InputError(f"{path}: cannot be written ({error.strerror}). Name another place.") from error
    return path
