"""Generalised NFW whose parameters are power laws in mass and redshift, fitted to simulated haloes."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from haloledger.gas.shapes.base import Shape

PIVOT_LOG_M200C = 14.0
MEAN_DENSITY = 200.0  # of the sphere of radius r200c, in critical densities


@dataclass(frozen=True, kw_only=True)
class GNFWFit(Shape):
    """rho_gas = f_b rho_c amplitude (x/scale)^inner [1 + (x/scale)^sharpness]^(-(outer + inner)/sharpness).

    amplitude, sharpness, outer  each (value, mass power, redshift power): value (M200c/1e14)^mass (1+z)^redshift
    scale   in r200c;  inner  the inner log slope (negative: cusp)

    The exponent is outer + inner, so that the outer log slope is -outer exactly. Equation A1 of the paper prints
    outer - inner, which would leave too little gas in the run without feedback (0.60 of f_b M at 1e14, where 0.91 is
    expected). f_b rho_c is ours, not the simulation's: an absolute density, without a kept fraction of its own.

    Battaglia 2016, JCAP 08, 058, table 2 and equation A1.
    """

    kind = "gnfw-fit"
    fixes = "gas"
    amplitude: tuple[float, float, float]
    sharpness: tuple[float, float, float]
    outer: tuple[float, float, float]
    scale: float
    inner: float

    @property
    def depends_on(self) -> tuple[str, ...]:
        return ("mass", "redshift")

    def parameters(self, log_m200c, z) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
        """Amplitude, sharpness and outer slope of haloes of this mass and redshift."""
        log_m, log_1z = np.asarray(log_m200c) - PIVOT_LOG_M200C, np.log10(1 + np.asarray(z))
        amplitude, sharpness, outer = (
            p[0] * 10.0 ** (p[1] * log_m + p[2] * log_1z) for p in (self.amplitude, self.sharpness, self.outer)
        )
        return amplitude, sharpness, outer

    def density(self, x, log_m200c, z, c200c) -> np.ndarray:
        amplitude, sharpness, outer = self.parameters(log_m200c, z)
        log_t = np.log(x / self.scale)
        log_bracket = np.log1p(np.exp(sharpness * log_t))
        relative = np.exp(self.inner * log_t - (outer + self.inner) / sharpness * log_bracket)
        return 3 / MEAN_DENSITY * amplitude * relative

    def check(self) -> str | None:
        for name in ("amplitude", "sharpness", "outer"):
            value = getattr(self, name)
            if len(value) != 3 or not value[0] > 0:
                return f"{name} = {list(value)} must be [value above 0, power of mass, power of 1+z]"
        if not 0.01 <= self.scale <= 5:
            return f"scale = {self.scale} is outside 0.01..5 (in r200c)"
        if not -0.9 <= self.inner <= 2:
            return f"inner = {self.inner} is outside -0.9..2: a steeper cusp has an infinite column at the centre"
        return None
