"""What a kept-fraction law is: gas inside a named radius over the baryon share of the total mass inside that radius."""

from __future__ import annotations

from dataclasses import dataclass
from typing import ClassVar

import numpy as np

from haloledger.cosmos.background import Cosmos

RADII = ("r500c", "r200c", "boundary")


@dataclass(frozen=True, kw_only=True)
class KeptLaw:
    """Base of all kept-fraction laws.

    radius  the radius the fraction refers to, one of RADII
    A subclass gives `value(log_m200c, z, c200c, cosmos)` = M_gas(<radius) / (f_b M_total(<radius)), smooth in log mass.
    """

    law: ClassVar[str]
    depends_on: ClassVar[tuple[str, ...]] = ()
    radius: str = "r200c"

    def value(self, log_m200c, z, c200c, cosmos: Cosmos) -> np.ndarray:
        raise NotImplementedError

    def check(self) -> str | None:
        """What is wrong with the parameters and what to write instead, or None."""
        return None


def smaller(a, b, sharpness: float = 8.0) -> np.ndarray:
    """A smooth minimum, (a^-s + b^-s)^(-1/s): 8% below both where they meet, the smaller one elsewhere.

    Nature has no kink there, and a table over mass could not follow one.
    """
    return (a**-sharpness + b**-sharpness) ** (-1 / sharpness)


def fraction_fault(name: str, value: float) -> str | None:
    """Why `value` cannot be a kept fraction, or None."""
    if 0 < value <= 2:
        return None
    return f"{name} = {value} must be a fraction above 0 and not above 2 (1 is the cosmic share)"
