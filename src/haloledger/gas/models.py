"""Halo models: what a model file says, as an object that gives densities, gas masses and kept fractions."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Any

import numpy as np

from haloledger.cosmos import electrons
from haloledger.cosmos.background import Cosmos
from haloledger.gas.components import MEAN_DENSITY, Component, nfw_mass_share
from haloledger.gas.quadrature import enclosed
from haloledger.gas.shapes import AXES
from haloledger.gas.spread import Spread

DEFAULT_MODEL = "blended"


@dataclass(frozen=True, eq=False)
class Model:
    """A halo model as its file states it. Arrays broadcast; masses log10 M200c [Msun], x and radii in r200c."""

    name: str
    status: str
    summary: str
    source: str
    phases: str
    boundary_r200c: float
    concentration: str | float
    components: tuple[Component, ...]
    handover_log_m200c: tuple[float, ...]
    handover_width_dex: tuple[float, ...]
    spread: Spread
    log_mass_range: tuple[float, float]
    z_range: tuple[float, float]
    notes: tuple[str, ...]
    file: str
    raw: dict[str, Any] = field(repr=False)
    sha256: str

    def __eq__(self, other: object) -> bool:
        return isinstance(other, Model) and self.sha256 == other.sha256

    def __hash__(self) -> int:
        return hash(self.sha256)

    @property
    def spread_shared_dex(self) -> float:
        """Spread of the kept fraction that all haloes of a draw share [dex]; the largest over mass."""
        return self.spread.largest_shared

    @property
    def spread_own_dex(self) -> float:
        """Spread of the kept fraction from halo to halo [dex]; the largest over mass."""
        return self.spread.largest_own

    @property
    def depends_on(self) -> tuple[str, ...]:
        """Which of AXES the relative density at fixed x depends on."""
        found = {a for c in self.components for a in c.depends_on}
        if len(self.components) > 1:
            found.add("mass")
        return tuple(a for a in AXES if a in found)

    def log_weight(self, k: int, log_m200c) -> np.ndarray:
        """ln of the weight of component k at this mass: logistic in log mass at each handover, one after the other."""
        log_m = np.asarray(log_m200c, dtype=float)
        steps = [(log_m - m) / w for m, w in zip(self.handover_log_m200c, self.handover_width_dex, strict=True)]
        passed = sum((-np.logaddexp(0.0, -s) for s in steps[:k]), np.zeros(log_m.shape))
        return passed - np.logaddexp(0.0, steps[k]) if k < len(steps) else passed

    def weights(self, log_m200c) -> list[np.ndarray]:
        """Weight of each component at this mass; they add up to 1 and hand over along the list as mass rises."""
        return [np.exp(self.log_weight(k, log_m200c)) for k in range(len(self.components))]

    def relative_density(self, x, log_m200c, z, c200c, cosmos: Cosmos) -> np.ndarray:
        """rho_gas 4 pi r200c^3 / (f_b M200c) at x = r / r200c, boundary not applied."""
        total: Any = 0.0
        for weight, part in zip(self.weights(log_m200c), self.components, strict=True):
            total = total + weight * part.density(x, log_m200c, z, c200c, cosmos)
        return total

    def density_cm3(self, x, log_m200c, z, c200c, cosmos: Cosmos) -> np.ndarray:
        """Electron density [cm-3] at x = r / r200c; 0 beyond the boundary.

        n_e = 7/8 rho_gas / m_p with rho_gas = relative density x f_b x (200/3) rho_c(z).
        """
        x = np.asarray(x, dtype=float)
        inside = np.clip(x, 1e-9, self.boundary_r200c)
        gas_unit = cosmos.baryon_share * MEAN_DENSITY / 3 * cosmos.critical_density(z)
        n_e = self.relative_density(inside, log_m200c, z, c200c, cosmos) * gas_unit
        n_e = n_e * electrons.PER_PROTON * electrons.CM3_PER_MSUN_KPC3
        return np.where(x <= self.boundary_r200c, n_e, 0.0)

    def gas_share(self, log_m200c, z, c200c, cosmos: Cosmos, within: float | np.ndarray | None = None) -> np.ndarray:
        """M_gas(<within) / (f_b M200c), by integrating the density; nothing is added beyond the boundary.

        within  radius in r200c, by default the boundary; arguments broadcast
        """
        radius = np.minimum(self.boundary_r200c if within is None else within, self.boundary_r200c)
        total: Any = 0.0
        args = tuple(np.asarray(a, dtype=float)[..., None] for a in (log_m200c, z, c200c))
        for weight, part in zip(self.weights(log_m200c), self.components, strict=True):
            mass = enclosed(lambda r, part=part: part.shape.density(r, *args), radius)
            total = total + weight * part.amplitude(log_m200c, z, c200c, cosmos) * mass
        return total

    def kept(self, log_m200c, z, c200c, cosmos: Cosmos, within: float | np.ndarray) -> np.ndarray:
        """M_gas(<within) / (f_b M_total(<within)), total mass NFW with c200c, `within` in r200c.

        Beyond the boundary the gas stays what it is there, so the kept fraction falls.
        """
        return self.gas_share(log_m200c, z, c200c, cosmos, within) / nfw_mass_share(within, c200c)

    def shape_scatter_dex(self, b_over_r200c) -> np.ndarray:
        """Scatter [dex] of one column against the mean at this impact parameter (triaxiality, clumps)."""
        return self.spread.shape_scatter(b_over_r200c)

    def outside_validity(self, log_m200c, z) -> np.ndarray:
        """Where a halo lies outside the range the model's numbers were found for: flagged, not dropped."""
        log_m200c, z = np.asarray(log_m200c), np.asarray(z)
        low, high = self.log_mass_range
        return (log_m200c < low) | (log_m200c > high) | (z < self.z_range[0]) | (z > self.z_range[1])

    def stated(self) -> dict[str, Any]:
        """What the file states, for output: plain values only."""
        rest = {key: value for key, value in self.raw.items() if key != "name"}
        return {"name": self.name, "file": self.file, "sha256": self.sha256, **rest}


def load_model(name_or_path: str) -> Model:
    """A shipped model by name, or a model file by path; InputError with a near match otherwise."""
    from haloledger.gas.model_file import read_model

    return read_model(name_or_path)


def model_names() -> list[str]:
    """Names of the shipped models."""
    from haloledger.gas.model_file import shipped_models

    return sorted(shipped_models())
