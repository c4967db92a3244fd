"""The one place where the colossus library is set up: our parameters, nothing kept on disk."""

from __future__ import annotations

import warnings
from contextlib import contextmanager

from haloledger.cosmos.background import Cosmos


@contextmanager
def colossus_cosmology(cosmos: Cosmos):
    """Make `cosmos` colossus' current cosmology for the block, and put the previous one back afterwards.

    Persistence is off: nothing is written to or unpickled from the user's home.
    """
    from colossus.cosmology import cosmology as library

    before = library.current_cosmo
    name = f"haloledger-{cosmos.name}"
    parameters = {
        "flat": True,
        "H0": 100 * cosmos.h,
        "Om0": cosmos.omega_m,
        "Ob0": cosmos.omega_b,
        "Tcmb0": float(cosmos.astropy.Tcmb0.value) or 2.7255,
        "sigma8": cosmos.sigma8,
        "ns": cosmos.n_s,
    }
    library.setCosmology(name, **parameters, persistence="")
    try:
        with warnings.catch_warnings():
            # tables reach a little past the fits' ranges; models state their range and the output flags it
            warnings.filterwarnings("ignore", message="Some masses or redshifts", category=UserWarning)
            yield library.current_cosmo
    finally:
        if before is not None:
            library.setCurrent(before)
