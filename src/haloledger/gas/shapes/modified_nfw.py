"""NFW with a flattened inner part, the profile most used for the gas of galaxy haloes."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from haloledger.gas.shapes.base import Shape


@dataclass(frozen=True, kw_only=True)
class ModifiedNFW(Shape):
    """density = y^(inner_slope - 1) / (inner_offset + y)^(2 + inner_slope), y = c200c x.

    inner_slope   alpha of the paper, dimensionless; 0 with offset 1 is NFW
    inner_offset  y0 of the paper, in scale radii
    core          softening radius in r200c, x -> sqrt(x^2 + core^2); needed where inner_slope < 0.5, since the
                  projection of an inner_slope of 0 diverges at b = 0

    Mathews & Prochaska 2017, ApJ 846, L24; Prochaska & Zheng 2019, MNRAS 485, 648.
    """

    kind = "modified-nfw"
    inner_slope: float
    inner_offset: float
    core: float = 0.0

    @property
    def depends_on(self) -> tuple[str, ...]:
        return ("concentration",)

    def density(self, x, log_m200c, z, c200c) -> np.ndarray:
        y = c200c * (np.sqrt(x**2 + self.core**2) if self.core else x)
        if self.inner_slope == 2:  # the common case, without powers
            return y / (self.inner_offset + y) ** 4
        return y ** (self.inner_slope - 1) / (self.inner_offset + y) ** (2 + self.inner_slope)

    def check(self) -> str | None:
        if not 0 <= self.inner_slope <= 4:
            return f"inner_slope = {self.inner_slope} is outside 0..4; the usual value is 2"
        if not 0.1 <= self.inner_offset <= 20:
            return f"inner_offset = {self.inner_offset} is outside 0.1..20 scale radii; the usual value is 2"
        if self.core and not 0.001 <= self.core < 1:
            return f"core = {self.core} is outside 0.001..1 (in r200c); leave it out or write 0.01"
        if self.inner_slope < 0.5 and not self.core:
            return f"inner_slope = {self.inner_slope} has an infinite column at the centre; add core = 0.01 (in r200c)"
        return None
