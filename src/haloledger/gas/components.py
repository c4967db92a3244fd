"""One density shape with its amount of gas. A halo model is one component, or several mixed by mass."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from haloledger.cosmos import electrons
from haloledger.cosmos.background import Cosmos
from haloledger.cosmos.mass_definitions import r500c_over_r200c
from haloledger.gas.kept import KeptLaw
from haloledger.gas.quadrature import enclosed
from haloledger.gas.shapes import AXES, Shape

MEAN_DENSITY = 200.0  # of the sphere of radius r200c, in critical densities


@dataclass(frozen=True)
class Component:
    """A shape and, unless the shape is absolute, the kept law that fixes its amount.

    All densities here are relative: rho_gas 4 pi r200c^3 / (f_b M200c), dimensionless. In this unit
    M_gas(<x) / (f_b M200c) = integral of x^2 density dx.
    """

    shape: Shape
    kept: KeptLaw | None
    boundary_r200c: float

    @property
    def depends_on(self) -> tuple[str, ...]:
        """Which of AXES the relative density at fixed x depends on."""
        found = set(self.shape.depends_on)
        if self.kept is not None:
            found |= set(self.kept.depends_on)
            if self.kept.radius != "r200c":  # total mass inside another radius
                found.add("concentration")
        return tuple(a for a in AXES if a in found)

    def amplitude(self, log_m200c, z, c200c, cosmos: Cosmos) -> np.ndarray:
        """Relative density per unit of `shape.density`; arguments broadcast."""
        if self.kept is None:
            return np.asarray(self._absolute_unit(cosmos))
        x = self._kept_radius(c200c)
        share = self.kept.value(log_m200c, z, c200c, cosmos) * nfw_mass_share(x, c200c)
        args = (np.asarray(a, dtype=float)[..., None] for a in (log_m200c, z, c200c))
        log_m, z_, c = args
        return share / enclosed(lambda r: self.shape.density(r, log_m, z_, c), x)

    def density(self, x, log_m200c, z, c200c, cosmos: Cosmos) -> np.ndarray:
        """Relative density at x = r / r200c, boundary not applied; arguments broadcast."""
        return self.amplitude(log_m200c, z, c200c, cosmos) * self.shape.density(x, log_m200c, z, c200c)

    def _absolute_unit(self, cosmos: Cosmos) -> float:
        if self.shape.fixes == "gas":
            return 1.0
        at = getattr(self.shape, "at_redshift", 0.0)
        per_gas_density = electrons.PER_PROTON * electrons.CM3_PER_MSUN_KPC3
        gas_unit = cosmos.baryon_share * MEAN_DENSITY / 3 * float(cosmos.critical_density(at))
        return 1 / (per_gas_density * gas_unit)

    def _kept_radius(self, c200c) -> np.ndarray:
        assert self.kept is not None
        if self.kept.radius == "r500c":
            return r500c_over_r200c(c200c)
        return np.asarray(self.boundary_r200c if self.kept.radius == "boundary" else 1.0)


def nfw_mass_share(x, c200c) -> np.ndarray:
    """Total mass inside x = r / r200c over M200c, for an NFW halo: m(c x) / m(c), m(y) = ln(1+y) - y/(1+y)."""
    y, c = np.asarray(c200c) * x, np.asarray(c200c)
    return (np.log1p(y) - y / (1 + y)) / (np.log1p(c) - c / (1 + c))
