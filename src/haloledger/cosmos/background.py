"""A cosmology as fast functions of redshift, made once from astropy's exact ones."""

from __future__ import annotations

from functools import cached_property, lru_cache

import numpy as np
from scipy.interpolate import CubicSpline

from haloledger.errors import InputError

Z_MAX = 12.0
# where astropy does not tell them: Planck 2018 VI (A&A 641, A6), table 2, last column
SPECTRUM = {"sigma8": 0.8102, "n_s": 0.9665}


class Cosmos:
    """Distances [kpc, Mpc, proper unless the name says comoving], densities [Msun kpc-3] and the baryon share.

    Splines over ln(1+z) with 4,000 nodes up to z = 12 reproduce astropy to 1e-9. All methods take and give arrays.
    """

    def __init__(self, name: str, exact) -> None:
        self.name = name
        self.astropy = exact
        self.h = float(exact.h)
        self.omega_m = float(exact.Om0)
        self.omega_b = float(exact.Ob0)
        self.baryon_share = self.omega_b / self.omega_m
        about = getattr(exact, "meta", None) or {}
        self.sigma8 = float(about.get("sigma8") or SPECTRUM["sigma8"])
        self.n_s = float(about.get("n") or SPECTRUM["n_s"])

    @cached_property
    def _nodes(self) -> np.ndarray:
        return np.linspace(0.0, np.log1p(Z_MAX), 4000)

    @cached_property
    def _comoving(self) -> CubicSpline:
        return CubicSpline(self._nodes, self.astropy.comoving_distance(np.expm1(self._nodes)).to_value("Mpc"))

    @cached_property
    def _e(self) -> CubicSpline:
        return CubicSpline(self._nodes, self.astropy.efunc(np.expm1(self._nodes)))

    @cached_property
    def _rho_c0(self) -> float:
        return float(self.astropy.critical_density0.to_value("Msun kpc-3"))

    def e_of_z(self, z):
        """H(z)/H0."""
        return self._e(np.log1p(z))

    def comoving_distance_mpc(self, z):
        """Line-of-sight comoving distance [Mpc]."""
        return self._comoving(np.log1p(z))

    def angular_distance_kpc(self, z):
        """Angular-diameter distance [proper kpc per radian]; flat space."""
        return 1e3 * self.comoving_distance_mpc(z) / (1 + np.asarray(z))

    def luminosity_distance_mpc(self, z):
        """Luminosity distance [Mpc]; flat space."""
        return self.comoving_distance_mpc(z) * (1 + np.asarray(z))

    def z_at_comoving_distance(self, mpc):
        """Redshift of the Hubble flow at a comoving distance [Mpc]."""
        return np.expm1(np.interp(mpc, self._comoving(self._nodes), self._nodes))

    def critical_density(self, z):
        """Critical density [Msun kpc-3, proper]."""
        return self._rho_c0 * self.e_of_z(z) ** 2

    def omega_m_z(self, z):
        """Matter density over the critical density at z."""
        return self.omega_m * (1 + np.asarray(z)) ** 3 / self.e_of_z(z) ** 2

    def r200c_kpc(self, log_m200c, z):
        """Radius [proper kpc] inside which the mean density is 200 times critical: (3 M / 800 pi rho_c)^(1/3)."""
        return np.cbrt(3 * 10.0 ** np.asarray(log_m200c) / (800 * np.pi * self.critical_density(z)))

    def volume_element(self, z):
        """Comoving volume [Mpc3 per sr per unit redshift]: D_c^2 c / H."""
        hubble_mpc = 299792.458 / (100 * self.h)
        return self.comoving_distance_mpc(z) ** 2 * hubble_mpc / self.e_of_z(z)


@lru_cache(maxsize=8)
def cosmology(name: str = "Planck18") -> Cosmos:
    """The named astropy cosmology; InputError lists the names that can be used (flat ones)."""
    from astropy import cosmology as library

    if name not in library.available:
        raise InputError(
            f"--cosmology: '{name}' is not one of astropy's. Write one of: {', '.join(library.available)}."
        )
    exact = getattr(library, name)
    if not exact.is_flat:
        raise InputError(f"--cosmology: '{name}' is not flat; distances here are for flat space. Use Planck18.")
    return Cosmos(name, exact)
