"""Columns of a galaxy table that hold p(z): quantiles such as `z_p16`, or densities such as `pz_0.25` on a grid."""

from __future__ import annotations

import re
from collections.abc import Iterable

QUANTILE = re.compile(r"z_p(\d{1,2}(?:\.\d+)?)$", re.I)
GRID = re.compile(r"pz_(\d+(?:\.\d+)?)$", re.I)


def density_columns(names: Iterable[str]) -> list[str]:
    """The columns among `names` that hold quantiles or densities of the redshift."""
    return [n for n in names if QUANTILE.match(n) or GRID.match(n)]
