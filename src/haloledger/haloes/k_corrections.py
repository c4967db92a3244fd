"""K-corrections of optical magnitudes by the library kcorrect, where it is installed (the extra `photometry`).

Blanton & Roweis 2007, AJ 133, 734: non-negative sums of galaxy templates through SDSS bandpasses.
"""

from __future__ import annotations

from collections.abc import Mapping
from functools import lru_cache
from importlib.metadata import PackageNotFoundError, version
from importlib.util import find_spec

import numpy as np

BANDS = ("u", "g", "r", "i", "z")
MAG_ERROR = 0.02  # for the weights of the fit: the bands count alike
Z_MAX = 0.7
N_REDSHIFTS = 141  # steps of 0.005, between which the library interpolates


def available() -> bool:
    """Is the library there? It is looked for, not imported."""
    return find_spec("kcorrect") is not None


def made_by() -> str:
    """Name and version, for the note of each mass."""
    try:
        return f"kcorrect {version('kcorrect')}"
    except PackageNotFoundError:
        return "kcorrect"


def k_corrections(mag: Mapping[str, np.ndarray], z: np.ndarray) -> dict[str, np.ndarray]:
    """What to take off apparent AB magnitudes for rest-frame ones, band by band.

    mag  band of `BANDS` -> apparent magnitudes (n,), NaN where not measured; two bands are needed
    z    redshifts (n,); NaN comes back beyond 0 to 0.7 and where fewer than two bands are measured
    """
    bands = tuple(b for b in BANDS if b in mag)
    table = np.array([mag[b] for b in bands], dtype=float).T.reshape(-1, len(bands))
    seen = np.isfinite(table)
    use = (seen.sum(axis=1) >= 2) & (z >= 0) & (z <= Z_MAX)
    result = np.full(table.shape, np.nan)
    if use.any():
        maggies = np.where(seen, 10 ** (-0.4 * np.where(seen, table, 0.0)), 0.0)[use]
        err = MAG_ERROR * 0.4 * np.log(10) * maggies
        ivar = np.where(seen[use], 1 / np.where(err > 0, err, 1.0) ** 2, 0.0)
        fitter = _fitter(bands)
        at = z[use].astype(np.float32)
        sums = fitter.fit_coeffs(redshift=at, maggies=maggies.astype(np.float32), ivar=ivar.astype(np.float32))
        result[use] = fitter.kcorrect(redshift=at, coeffs=sums)
    return {b: np.where(seen[:, k], result[:, k], np.nan) for k, b in enumerate(bands)}


@lru_cache(maxsize=4)
def _fitter(bands: tuple[str, ...]):
    from kcorrect.kcorrect import Kcorrect

    return Kcorrect(responses=[f"sdss_{b}0" for b in bands], redshift_range=[0.0, Z_MAX], nredshift=N_REDSHIFTS)
