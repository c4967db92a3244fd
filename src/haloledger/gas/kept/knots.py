"""A kept fraction given at a few masses."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy.interpolate import PchipInterpolator

from haloledger.gas.kept.base import KeptLaw, fraction_fault


@dataclass(frozen=True, kw_only=True)
class Knots(KeptLaw):
    """kept = monotone cubic through (log_m200c, kept), constant outside the knots, so it never over- or undershoots."""

    law = "knots"
    depends_on = ("mass",)
    log_m200c: tuple[float, ...]
    kept: tuple[float, ...]

    def value(self, log_m200c, z, c200c, cosmos) -> np.ndarray:
        curve = PchipInterpolator(self.log_m200c, self.kept)
        return curve(np.clip(log_m200c, self.log_m200c[0], self.log_m200c[-1]))

    def check(self) -> str | None:
        if len(self.log_m200c) != len(self.kept) or len(self.kept) < 2:
            return f"log_m200c has {len(self.log_m200c)} values and kept {len(self.kept)}; write two or more of each"
        if np.any(np.diff(self.log_m200c) <= 0):
            return f"log_m200c = {list(self.log_m200c)} must rise"
        return next((fault for k in self.kept if (fault := fraction_fault("kept", k))), None)
