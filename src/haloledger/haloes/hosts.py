"""The halo of a satellite whose host no list has: heavier than its own, and centred elsewhere."""

from __future__ import annotations

import numpy as np

from haloledger.cosmos.background import Cosmos
from haloledger.cosmos.concentration import concentration
from haloledger.engine.universe import Universe
from haloledger.haloes.masses import State
from haloledger.haloes.nfw_place import radius_r200c
from haloledger.haloes.satellites import occupation
from haloledger.haloes.table import Haloes


def put_hosts(
    haloes: Haloes,
    hosted: np.ndarray,
    state: State,
    universe: Universe,
    c_relation: str | float,
    cosmos: Cosmos,
    log_m200c: np.ndarray,
    east_kpc: np.ndarray,
    north_kpc: np.ndarray,
) -> None:
    """Write mass and centre of the host into the draws `hosted`, in place; all arrays (n, n_draws).

    P(M_host) ~ n(M) dN_sat(y | M); the centre lies off the galaxy as its satellites do: NFW, any direction.
    """
    index = np.flatnonzero(hosted.any(axis=1))
    if not index.size:
        return
    names = haloes.id[index]
    at = np.nonzero(hosted[index])
    row = index[at[0]]
    drawn = (row, at[1])
    y = haloes.value[row] + state.value_shift[drawn]
    mass = occupation(cosmos).host(y, state.z[drawn], haloes.value_err[row], state.score[drawn])
    c200c = concentration(c_relation, mass, state.z[drawn], cosmos) * 10 ** state.log_c_offset[drawn]
    share, turn, tilt = (universe.uniforms(f"host_{what}", names)[at] for what in ("radius", "turn", "tilt"))
    r200c_kpc = cosmos.r200c_kpc(mass, state.z[drawn])
    across_kpc = radius_r200c(share, c200c) * r200c_kpc * np.sqrt(1 - (2 * tilt - 1) ** 2)
    log_m200c[drawn] = mass
    east_kpc[drawn] = across_kpc * np.cos(2 * np.pi * turn)
    north_kpc[drawn] = across_kpc * np.sin(2 * np.pi * turn)
