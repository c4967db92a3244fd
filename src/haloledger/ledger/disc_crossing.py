"""Discs of foreground galaxies that the line crosses: their interstellar medium, kept apart from the halo gas."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from haloledger.cosmos.background import Cosmos
from haloledger.engine.universe import Universe
from haloledger.haloes.relations import load_relation
from haloledger.haloes.table import Haloes
from haloledger.ledger.crossing import Crossing
from haloledger.sightlines.disc import disc_column, gas_poor_share, reach_kpc
from haloledger.sightlines.draws import Sightline
from haloledger.sightlines.geometry import impact_parameters, separation_deg

RELATION = "moster2013"  # stellar mass of a galaxy of which only the halo mass is listed
SIGMAS = 5.0


@dataclass(frozen=True)
class Discs:
    """Discs on one sightline, draws (n_haloes, n_draws): DM in the observer's frame [pc cm-3], and the distance of the
    line from the galaxy [kpc], NaN where it is far. A halo's centre may lie elsewhere."""

    dm: np.ndarray
    impact_kpc: np.ndarray


def cross_discs(sightline: Sightline, haloes: Haloes, crossing: Crossing, universe: Universe, cosmos: Cosmos) -> Discs:
    """Discs crossed in front of the burst.

    A galaxy that has no halo of its own in a draw keeps its disc. With `universe.fixed`: the median column of a
    face-on disc, where the given position lies inside.
    """
    index = crossing.index
    radius = getattr(haloes, "optical_radius_kpc", np.full(len(haloes), np.nan))[index]
    reach = reach_kpc(radius)
    dm, impact = np.zeros(crossing.impact_kpc.shape), np.full(crossing.impact_kpc.shape, np.nan)
    rows = np.flatnonzero(_is_galaxy(haloes, index) & _could_meet(sightline, haloes, crossing, reach))
    if not rows.size:
        return Discs(dm, impact)
    nothing = np.zeros((rows.size, universe.n_draws))
    here = (haloes.ra_deg[index[rows]], haloes.dec_deg[index[rows]], crossing.distance_kpc[rows])
    impact[rows], ahead = impact_parameters(*here, nothing, nothing, sightline.directions)
    met = (impact[rows] < reach[rows, None]) & (crossing.behind_kpc[rows] > 0) & (ahead > 0)
    column = _columns(sightline.burst, haloes, crossing, rows, impact[rows], universe, cosmos)
    dm[rows] = np.where(met, column / (1 + crossing.z[rows]), 0.0)
    return Discs(dm, impact)


def disc_notes(haloes: Haloes, crossing: Crossing, discs: Discs) -> list[str]:
    """One sentence for a sightline whose line crosses discs; none otherwise."""
    crossed = np.flatnonzero((discs.dm > 0).any(axis=1))
    if not crossed.size:
        return []
    names = [
        f"{haloes.id[crossing.index[i]]} at {np.median(discs.impact_kpc[i]):.1f} kpc"
        f" ({(discs.dm[i] > 0).mean():.0%} of draws)"
        for i in crossed[np.argsort(-discs.dm[crossed].mean(axis=1), kind="stable")]
    ]
    how = "" if discs.dm.shape[1] > 1 else ", taken face-on"
    where = "its interstellar medium is dm_disc_crossing, apart from all haloes"
    return [f"disc crossing: {', '.join(names)}{how}; {where}"]


def _is_galaxy(haloes: Haloes, index: np.ndarray) -> np.ndarray:
    kind = haloes.kind[index]
    return (kind == "galaxy") | ((kind == "local") & np.isfinite(haloes.log_mstar[index]))


def _could_meet(sightline: Sightline, haloes: Haloes, crossing: Crossing, reach: np.ndarray) -> np.ndarray:
    h = crossing.index
    apart = separation_deg(haloes.ra_deg[h], haloes.dec_deg[h], sightline.ra_deg, sightline.dec_deg)
    least = np.radians(np.minimum(np.maximum(apart - SIGMAS * sightline.loc_arcsec / 3600, 0.0), 90.0))
    return np.sin(least) * crossing.distance_kpc.min(axis=1, initial=np.inf) < reach


def _columns(burst, haloes: Haloes, crossing: Crossing, rows, impact_kpc, universe: Universe, cosmos: Cosmos):
    """DM of the discs in their own frame; inclination and gas are the galaxy's, turn and scatter the line's."""
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
    return disc_column(impact_kpc, log_mstar, cos_i, turn, gas_poor, score)
