"""Hot gas of one temperature at rest in an NFW halo: a core that needs no parameter."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from haloledger.gas.shapes.base import Shape

POTENTIAL = 3.7


@dataclass(frozen=True, kw_only=True)
class MallerBullock(Shape):
    """density = [1 + 3.7 ln(1+y)/y - 3.7 ln(1+C)/C]^(3/2), y = C x, with C = c200c.

    The paper's C is the virial concentration; this package's haloes end the hydrostatic region at r200c, hence c200c.

    Maller & Bullock 2004, MNRAS 355, 694 (form from memory).
    """

    kind = "maller-bullock"

    @property
    def depends_on(self) -> tuple[str, ...]:
        return ("concentration",)

    @property
    def x_max(self) -> float:
        return 2.0  # the bracket stays above 0 to here for c200c >= 1

    def density(self, x, log_m200c, z, c200c) -> np.ndarray:
        y = c200c * x
        bracket = 1 + POTENTIAL * np.log1p(y) / y - POTENTIAL * np.log1p(c200c) / c200c
        return bracket**1.5
