"""A log-normal halo density in a periodic box, one field for each bias, all from the same phases.

The Gaussian field of bias b has the correlation xi_g = ln(1 + b^2 xi), so that the halo density exp(g - var/2) has the
correlation b^2 xi(r), xi the linear matter correlation smoothed to the cells (Coles & Jones 1991, MNRAS 248, 1).
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy import fft

from haloledger.cosmos.background import Cosmos
from haloledger.cosmos.colossus_link import colossus_cosmology

SMOOTH_CELLS = 0.5  # Gaussian radius over the cell's side


@dataclass(frozen=True)
class Box:
    """Densities over their mean, one array (n, n, n) a bias, in a periodic box with cells of `cell_mpc` (comoving)."""

    biases: tuple[float, ...]
    densities: tuple[np.ndarray, ...]
    cell_mpc: float

    def at(self, k: int, x_mpc, y_mpc, z_mpc) -> np.ndarray:
        """Density of bias `k` in the cells that hold these points."""
        field = self.densities[k]
        n = field.shape[0]
        i, j, m = ((np.floor(a / self.cell_mpc).astype(np.int32)) % n for a in (x_mpc, y_mpc, z_mpc))
        return field[i, j, m]


def make_box(biases, z: float, cosmos: Cosmos, rng: np.random.Generator, n: int = 256, cell_mpc: float = 3.0) -> Box:
    """Fields of all `biases` at redshift z."""
    wave = _wave_numbers(n, cell_mpc)
    power = matter_power(wave, z, cosmos) * np.exp(-((SMOOTH_CELLS * cell_mpc * wave) ** 2))
    xi = fft.irfftn(power.astype(np.float32) / cell_mpc**3, s=(n, n, n), workers=2)
    phases = fft.rfftn(rng.standard_normal((n, n, n), dtype=np.float32), workers=2)
    fields = tuple(_log_normal(xi, b, phases) for b in biases)
    return Box(tuple(float(b) for b in biases), fields, cell_mpc)


def _log_normal(xi: np.ndarray, bias: float, phases: np.ndarray) -> np.ndarray:
    power = np.maximum(fft.rfftn(np.log1p(bias**2 * xi), workers=2).real, 0.0)
    gauss = fft.irfftn(phases * np.sqrt(power), s=xi.shape, workers=2)
    density = np.exp(gauss, out=gauss)
    return density / density.mean(dtype=np.float64)


def _wave_numbers(n: int, cell_mpc: float) -> np.ndarray:
    """|k| [1/Mpc] on the half grid of a real transform."""
    full, half = 2 * np.pi * fft.fftfreq(n, cell_mpc), 2 * np.pi * fft.rfftfreq(n, cell_mpc)
    return np.sqrt(full[:, None, None] ** 2 + full[None, :, None] ** 2 + half[None, None, :] ** 2).astype(np.float32)


def matter_power(wave, z: float, cosmos: Cosmos) -> np.ndarray:
    """Linear matter power [Mpc3] at wave numbers [1/Mpc]; 0 at k = 0. Eisenstein & Hu 1998, from colossus."""
    nodes = np.geomspace(1e-4, 50.0, 600)
    with colossus_cosmology(cosmos) as library:
        values = library.matterPowerSpectrum(nodes / cosmos.h, z) / cosmos.h**3
    ln_power = np.interp(np.log(np.maximum(wave, 1e-4)), np.log(nodes), np.log(values))
    return np.where(np.asarray(wave) > 0, np.exp(ln_power), 0.0)


def halo_bias(log_m200c, z: float, cosmos: Cosmos) -> np.ndarray:
    """Linear bias of M200c haloes (Tinker et al. 2010, ApJ 724, 878), from colossus."""
    from colossus.lss import bias as library

    with colossus_cosmology(cosmos):
        return library.haloBias(10 ** np.asarray(log_m200c) * cosmos.h, z, mdef="200c", model="tinker10")
