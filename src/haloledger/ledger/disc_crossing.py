"""Discs of foreground galaxies that the line crosses: their interstellar medium, kept apart from the halo gas."""

from __future__ import annotations

import numpy as np

from haloledger.cosmos.background import Cosmos
from haloledger.engine.universe import Universe
from haloledger.haloes.relations import load_relation
from haloledger.haloes.table import Haloes
from haloledger.ledger.crossing import Crossing
from haloledger.sightlines.disc import disc_column, gas_poor_share, reach_kpc

RELATION = "moster2013"  # stellar mass of a galaxy of which only the halo mass is listed


def disc_dm(burst: str, haloes: Haloes, crossing: Crossing, universe: Universe, cosmos: Cosmos) -> np.ndarray:
    """Observer-frame DM draws [pc cm-3] of the discs crossed in front of the burst, (n_haloes, n_draws).

    A galaxy that has no halo of its own in a draw keeps its disc. With `universe.fixed`: the median column of a
    face-on disc.
    """
    radius = getattr(haloes, "optical_radius_kpc", np.full(len(haloes), np.nan))[crossing.index]
    met = (crossing.impact_kpc < reach_kpc(radius)[:, None]) & (crossing.behind_kpc > 0) & (crossing.ahead_kpc > 0)
    met &= _is_galaxy(haloes, crossing.index)[:, None]
    dm = np.zeros(crossing.impact_kpc.shape)
    rows = np.flatnonzero(met.any(axis=1))
    if rows.size:
        dm[rows] = _columns(burst, haloes, crossing, rows, universe, cosmos) / (1 + crossing.z[rows])
    return np.where(met, dm, 0.0)


def _is_galaxy(haloes: Haloes, index: np.ndarray) -> np.ndarray:
    kind = haloes.kind[index]
    return (kind == "galaxy") | ((kind == "local") & np.isfinite(haloes.log_mstar[index]))


def _columns(burst, haloes: Haloes, crossing: Crossing, rows, universe: Universe, cosmos: Cosmos) -> np.ndarray:
    ids = haloes.id[crossing.index[rows]]
    listed = haloes.log_mstar[crossing.index[rows], None]
    from_halo = load_relation(RELATION).mean(crossing.log_m200c[rows], crossing.z[rows], cosmos)
    log_mstar = np.where(np.isfinite(listed), listed, from_halo)
    here = [f"{burst}|{name}" for name in ids]
    cos_i, turn = universe.uniforms("disc inclination", ids), 2 * np.pi * universe.uniforms("disc turn", here)
    gas_poor = universe.uniforms("disc gas", ids) < gas_poor_share(log_mstar)
    if universe.fixed:
        cos_i, turn, gas_poor = np.ones_like(cos_i), np.zeros_like(turn), gas_poor_share(log_mstar) > 0.5
    score = universe.normals("disc column", here)
    return disc_column(crossing.impact_kpc[rows], log_mstar, cos_i, turn, gas_poor, score)


def disc_notes(haloes: Haloes, crossing: Crossing, disc: np.ndarray) -> list[str]:
    """One sentence for a sightline whose line crosses discs; none otherwise."""
    crossed = np.flatnonzero((disc > 0).any(axis=1))
    if not crossed.size:
        return []
    names = [
        f"{haloes.id[crossing.index[i]]} at {np.median(crossing.impact_kpc[i]):.1f} kpc"
        f" ({(disc[i] > 0).mean():.0%} of draws)"
        for i in crossed[np.argsort(-disc[crossed].mean(axis=1), kind="stable")]
    ]
    return [
        f"disc crossing: {', '.join(names)}; its interstellar medium is dm_disc_crossing, in no halo or cosmic term"
    ]
