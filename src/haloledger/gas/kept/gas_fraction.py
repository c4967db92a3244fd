"""Gas fractions measured in X-rays inside r500c."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from haloledger.cosmos.mass_definitions import from_200c
from haloledger.gas.kept.base import KeptLaw, fraction_fault, smaller
from haloledger.gas.stars import star_share


@dataclass(frozen=True, kw_only=True)
class GasFraction(KeptLaw):
    """M_gas(<r500c)/M500c = fraction_at_pivot (M500c / 10^pivot_log_m500c)^slope, held below f_b minus stars.

    hubble  the h of the measurement; its fractions scale as h^(-3/2) and its masses as 1/h
    The radius is r500c; the model's own profile carries the gas from there to any other radius.
    """

    law = "gas-fraction"
    depends_on = ("mass", "concentration")
    radius: str = "r500c"
    fraction_at_pivot: float
    pivot_log_m500c: float
    slope: float
    hubble: float

    def value(self, log_m200c, z, c200c, cosmos) -> np.ndarray:
        log_m500c = from_200c(log_m200c, "500c", 0.0, c200c, cosmos) + np.log10(cosmos.h / self.hubble)
        fraction = self.fraction_at_pivot * 10.0 ** (self.slope * (log_m500c - self.pivot_log_m500c))
        fraction = fraction * (self.hubble / cosmos.h) ** 1.5
        return smaller(fraction / cosmos.baryon_share, 1 - star_share(log_m200c, cosmos))

    def check(self) -> str | None:
        if self.radius != "r500c":
            return f'radius = "{self.radius}": these fractions are measured inside r500c; write radius = "r500c"'
        if not 0.4 <= self.hubble <= 1:
            return f"hubble = {self.hubble} is outside 0.4..1"
        return fraction_fault("fraction_at_pivot", self.fraction_at_pivot)
