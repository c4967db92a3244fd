"""Small catalogues for the tests of haloes."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
import pytest

from haloledger.catalogs.canonical import Galaxies, Groups


@pytest.fixture(scope="session")
def make_galaxies() -> Callable[..., Galaxies]:
    """make_galaxies(label, n, **columns): scalars fill a column, everything else stays unknown."""

    def make(label: str, n: int, **given) -> Galaxies:
        blank = np.full(n, np.nan)
        columns = _places(label, n) | {
            "group": np.full(n, "", dtype=object),
            "mag": {},
        }
        for name in ("log_mstar", "log_m200c", "distance"):
            unit = "_mpc" if name == "distance" else ""
            columns |= {name + unit: blank, f"{name}_err{unit}": blank}
        return Galaxies(**(columns | _filled(given, n)))

    return make


@pytest.fixture(scope="session")
def make_groups() -> Callable[..., Groups]:
    """make_groups(label, n, **columns), as `make_galaxies`."""

    def make(label: str, n: int, **given) -> Groups:
        blank = np.full(n, np.nan)
        columns = _places(label, n) | {
            "centre_err_kpc": np.zeros(n),
            "mass_def": np.full(n, "200c", dtype=object),
        }
        names = ("log_mass", "log_mass_err", "sigma_v_kms", "n_members", "richness", "lx_1e44_erg_s")
        columns |= dict.fromkeys((*names, "distance_mpc", "distance_err_mpc"), blank)
        return Groups(**(columns | _filled(given, n)))

    return make


def _places(label: str, n: int) -> dict:
    return {
        "label": label,
        "row": np.array([f"{label}:{i:06d}" for i in range(n)], dtype=object),
        "ra_deg": np.full(n, 150.0),
        "dec_deg": np.full(n, 2.0),
        "z": np.full(n, 0.1),
        "z_err": np.zeros(n),
        "photometric": np.zeros(n, dtype=bool),
    }


def _filled(given: dict, n: int) -> dict:
    whole = {"mag_rest", "mass_err_holds_z", "z_outlier"}
    return {
        k: np.full(n, v) if isinstance(v, int | float | bool) and k not in whole | {"precedence"} else v
        for k, v in given.items()
    }
