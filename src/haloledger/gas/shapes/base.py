"""What a density shape is: a formula with parameters. Mass inside a radius and projection are received, not written."""

from __future__ import annotations

from dataclasses import dataclass
from typing import ClassVar, Literal

import numpy as np

AXES = ("mass", "redshift", "concentration")


@dataclass(frozen=True, kw_only=True)
class Shape:
    """Base of all density shapes.

    A subclass gives `density(x, log_m200c, z, c200c)` with x = r / r200c, arrays that broadcast, above 0 for every
    x > 0 up to `x_max`, and says in `fixes` what its numbers are:
    "nothing"    any normalisation will do, the kept fraction sets it
    "gas"        rho_gas 4 pi r200c^3 / (f_b M200c): absolute, takes no kept fraction
    "electrons"  n_e [cm-3]: absolute, unless the model file states a kept fraction
    """

    kind: ClassVar[str]
    fixes: ClassVar[Literal["nothing", "gas", "electrons"]] = "nothing"

    @property
    def depends_on(self) -> tuple[str, ...]:
        """Which of AXES the density at fixed x depends on."""
        raise NotImplementedError

    @property
    def x_max(self) -> float:
        """Largest x at which the shape is defined."""
        return np.inf

    def density(self, x, log_m200c, z, c200c) -> np.ndarray:
        raise NotImplementedError

    def check(self) -> str | None:
        """What is wrong with the parameters and what to write instead, or None."""
        return None
