"""Gas that follows the dark matter."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from haloledger.gas.shapes.base import Shape


@dataclass(frozen=True, kw_only=True)
class CoredNFW(Shape):
    """density = 1 / (y (1 + y)^2), y = c200c sqrt(x^2 + core^2).

    core  softening radius in r200c. It must be stated: without it the projection diverges at b = 0.

    Navarro, Frenk & White 1997, ApJ 490, 493.
    """

    kind = "nfw"
    core: float

    @property
    def depends_on(self) -> tuple[str, ...]:
        return ("concentration",)

    def density(self, x, log_m200c, z, c200c) -> np.ndarray:
        y = c200c * np.sqrt(x**2 + self.core**2)
        return 1 / (y * (1 + y) ** 2)

    def check(self) -> str | None:
        if not 0.001 <= self.core < 1:
            return f"core = {self.core} is outside 0.001..1 (in r200c): without a core the column diverges; write 0.01"
        return None
