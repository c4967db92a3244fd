"""Whether the catalogues could have listed anything at a position at all."""

from __future__ import annotations

import numpy as np

UNDETERMINED = "reach not determined, unlisted haloes drawn between none and the whole average"


def reach_of(ra_deg: float, dec_deg: float, footprints: list) -> tuple[float, str]:
    """Reach where it is certain, and what to say: 0 outside every given footprint, NaN (not determined) elsewhere."""
    if not footprints:
        return np.nan, f"no footprint given, so nothing found is not nothing there: {UNDETERMINED}"
    inside = [f.label for f in footprints if bool(np.all(f.contains(np.array([ra_deg]), np.array([dec_deg]))))]
    if not inside:
        return 0.0, "outside every footprint: the catalogues could list nothing here"
    return np.nan, f"inside {', '.join(inside)}: {UNDETERMINED}"
