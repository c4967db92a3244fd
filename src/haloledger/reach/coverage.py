"""What the catalogues could have listed on a sightline, as far as it is certain without their depths."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from haloledger.reach.census import LOG_M, LOG_M_STEP, Census

UNDETERMINED = (
    "reach not determined, unlisted haloes drawn from the least that lists of this depth leave out to the whole average"
)
DEEPEST_SHARE = 0.99
"""The redshift below which this share of the listed haloes of a mass lie counts as how deep a list goes."""


@dataclass(frozen=True)
class Reach:
    """Bounds of the reach on one sightline: equal where it is known, and then `known`."""

    lowest: float
    highest: float

    @property
    def known(self) -> float:
        """The reach, NaN where only bounds are known."""
        return self.lowest if self.lowest == self.highest else np.nan

    def draws(self, share: np.ndarray) -> np.ndarray:
        """Reach of each draw: uniform between the bounds, `share` being uniform in 0..1."""
        return self.lowest + (self.highest - self.lowest) * share


def deepest_by_mass(log_m200c: np.ndarray, z: np.ndarray) -> np.ndarray:
    """Redshift to which haloes of each mass bin of the census are listed anywhere (n_mass,); 0 where none is."""
    bins = np.floor((log_m200c - LOG_M[0]) / LOG_M_STEP + 0.5).astype(int)
    deepest = np.zeros(len(LOG_M))
    for k in np.unique(bins[(bins >= 0) & (bins < len(LOG_M))]):
        deepest[k] = np.quantile(z[bins == k], DEEPEST_SHARE)
    return deepest


def reach_bounds(z: float, census: Census, deepest: np.ndarray, outside: bool) -> Reach:
    """Bounds of the reach at redshift z: 0 outside every footprint, else from 0 to what lists this deep could hold."""
    return Reach(0.0, 0.0 if outside else census.share_before(z, deepest))


def place(ra_deg: float, dec_deg: float, footprints: list) -> tuple[bool, str]:
    """Whether a position is outside every given footprint, and what to say of it."""
    if not footprints:
        return False, f"no footprint given, so nothing found is not nothing there: {UNDETERMINED}"
    inside = [f.label for f in footprints if bool(np.all(f.contains(np.array([ra_deg]), np.array([dec_deg]))))]
    if not inside:
        return True, "outside every footprint: the catalogues could list nothing here"
    return False, f"inside {', '.join(inside)}: {UNDETERMINED}"
