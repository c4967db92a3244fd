"""Pictures: one a sightline, one a halo model. Matplotlib without a screen, imported when a picture is asked for."""

from haloledger.report.figures.model import model_figure
from haloledger.report.figures.sightline import sightline_figure
from haloledger.report.figures.style import save

__all__ = ["model_figure", "save", "sightline_figure"]
