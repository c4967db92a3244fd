"""The beta model of X-ray groups and clusters, steepening in the outskirts."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from haloledger.cosmos.mass_definitions import r500c_over_r200c
from haloledger.gas.shapes.base import Shape


@dataclass(frozen=True, kw_only=True)
class SteepenedBeta(Shape):
    """density = [1 + (r/core)^2]^(-3 beta/2) [1 + (r/outer_scale)^3]^(-outer_steepening/3).

    core, outer_scale  in r500c, which the concentration ties to r200c
    beta               dimensionless, above 1/3
    outer_steepening   what the log slope gains far outside outer_scale; 0 leaves the plain beta model

    Beta model: Cavaliere & Fusco-Femiano 1976, A&A 49, 137. The steepening factor has the form of
    Vikhlinin et al. 2006, ApJ 640, 691, equation 3 (with their gamma = 3).
    """

    kind = "steepened-beta"
    core: float
    beta: float
    outer_scale: float = 1.0
    outer_steepening: float = 0.0

    @property
    def depends_on(self) -> tuple[str, ...]:
        return ("concentration",)

    def density(self, x, log_m200c, z, c200c) -> np.ndarray:
        r = x / r500c_over_r200c(c200c)
        inner = (1 + (r / self.core) ** 2) ** (-1.5 * self.beta)
        if not self.outer_steepening:
            return inner
        return inner * (1 + (r / self.outer_scale) ** 3) ** (-self.outer_steepening / 3)

    def check(self) -> str | None:
        if not 0.005 <= self.core <= 2:
            return f"core = {self.core} is outside 0.005..2 (in r500c); common practice is 0.1 to 0.2"
        if not 1 / 3 < self.beta <= 2:
            return f"beta = {self.beta:g} must lie above 1/3 and not above 2; common practice is 0.667"
        if not 0.1 <= self.outer_scale <= 10:
            return f"outer_scale = {self.outer_scale} is outside 0.1..10 (in r500c)"
        if not 0 <= self.outer_steepening <= 5:
            return f"outer_steepening = {self.outer_steepening} is outside 0..5"
        return None
