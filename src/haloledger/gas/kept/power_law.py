"""A kept fraction that is a power of mass, up to a ceiling."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from haloledger.gas.kept.base import KeptLaw, fraction_fault, smaller


@dataclass(frozen=True, kw_only=True)
class PowerLaw(KeptLaw):
    """kept = kept_at_pivot (M200c / 10^pivot_log_m200c)^slope, smoothly held below `ceiling`."""

    law = "power-law"
    depends_on = ("mass",)
    kept_at_pivot: float
    pivot_log_m200c: float
    slope: float
    ceiling: float = 1.0

    def value(self, log_m200c, z, c200c, cosmos) -> np.ndarray:
        power = self.kept_at_pivot * 10.0 ** (self.slope * (np.asarray(log_m200c) - self.pivot_log_m200c))
        return smaller(power, self.ceiling)

    def check(self) -> str | None:
        if not -2 <= self.slope <= 2:
            return f"slope = {self.slope} is outside -2..2"
        return fraction_fault("kept_at_pivot", self.kept_at_pivot) or fraction_fault("ceiling", self.ceiling)
