"""How the haloes near one sightline are crossed, draw by draw: geometry only, no gas yet."""

from __future__ import annotations

from dataclasses import dataclass, fields
from functools import cached_property

import numpy as np

from haloledger.cosmos.background import Cosmos
from haloledger.cosmos.concentration import concentration
from haloledger.engine.universe import Universe
from haloledger.haloes.draws import draw_haloes
from haloledger.haloes.table import HaloDraws, Haloes
from haloledger.sightlines.draws import Sightline
from haloledger.sightlines.geometry import impact_parameters

FAR = 1e9  # kpc: a depth beyond every boundary


@dataclass(frozen=True)
class Crossing:
    """Draws of the near haloes of one sightline; arrays (n_haloes, n_draws) unless a shape is given.

    index         rows of the halo list (n_haloes,)
    at_source     the burst sits in this halo (n_haloes,)
    own           the row has a halo of its own in this draw
    behind_kpc    proper distance of the burst behind the closest approach; negative: the burst is in front of it
    ahead_kpc     proper distance from us to the closest approach
    c200c         concentration, for the gas model's relation
    """

    index: np.ndarray
    at_source: np.ndarray
    own: np.ndarray
    log_m200c: np.ndarray
    z: np.ndarray
    r200c_kpc: np.ndarray
    distance_kpc: np.ndarray
    impact_kpc: np.ndarray
    behind_kpc: np.ndarray
    ahead_kpc: np.ndarray

    c200c: np.ndarray

    @cached_property
    def impact_r200c(self) -> np.ndarray:
        """Impact parameter over r200c."""
        return self.impact_kpc / self.r200c_kpc

    def rows(self, index) -> Crossing:
        """The haloes at the places `index` of this crossing."""
        return Crossing(**{f.name: getattr(self, f.name)[index] for f in fields(self)})

    @property
    def halo_modelled(self) -> np.ndarray:
        """Draws (n_draws,) in which a listed halo holds the burst: the host's own halo is that one."""
        return (self.at_source[:, None] & self.own).any(axis=0)


def cross(
    sightline: Sightline,
    haloes: Haloes,
    index: np.ndarray,
    at_source: np.ndarray,
    relation: str | float,
    universe: Universe,
    cosmos: Cosmos,
) -> Crossing:
    """Draw the haloes `index` and their geometry with the sightline.

    relation  the gas model's concentration, with which masses of other definitions are brought to M200c
    """
    draws = draw_haloes(haloes, index, universe, relation, cosmos)
    impact_kpc, ahead_kpc = impact_parameters(
        haloes.ra_deg[index],
        haloes.dec_deg[index],
        draws.distance_kpc,
        draws.centre_east_kpc,
        draws.centre_north_kpc,
        sightline.directions,
    )
    r200c_kpc = cosmos.r200c_kpc(draws.log_m200c, draws.z)
    gap_mpc = cosmos.comoving_distance_mpc(sightline.z)[None, :] - cosmos.comoving_distance_mpc(draws.z)
    crossing = Crossing(
        index=index,
        at_source=at_source,
        own=draws.own,
        log_m200c=draws.log_m200c,
        z=draws.z,
        r200c_kpc=r200c_kpc,
        distance_kpc=draws.distance_kpc,
        impact_kpc=impact_kpc,
        behind_kpc=1e3 * gap_mpc / (1 + draws.z),
        ahead_kpc=ahead_kpc,
        c200c=_concentration(draws, relation, cosmos),
    )
    if at_source.any():
        _place_burst_inside(crossing, sightline, haloes, universe)
    return crossing


def _concentration(draws: HaloDraws, relation: str | float, cosmos: Cosmos) -> np.ndarray:
    median = concentration(relation, draws.log_m200c, draws.z, cosmos)
    # a relation that is a number holds for every halo, without scatter
    return median * 10**draws.log_c_offset if isinstance(relation, str) else median


def _place_burst_inside(crossing: Crossing, sightline: Sightline, haloes: Haloes, universe: Universe) -> None:
    """Depth of the burst in a halo it sits in: drawn from an NFW density along the line, out to two r200c.

    A velocity difference says nothing about the order along the line inside one halo.
    """
    rows = np.flatnonzero(crossing.at_source)
    names = [f"{sightline.burst}|{haloes.id[crossing.index[i]]}" for i in rows]
    wanted = universe.uniforms("depth", names)
    depth = np.linspace(-2.0, 2.0, 161)
    for row, uniform in zip(rows, wanted, strict=True):
        radius = np.sqrt(crossing.impact_r200c[row][:, None] ** 2 + depth[None, :] ** 2 + 1e-4)
        density = _nfw(radius, crossing.c200c[row][:, None])
        share = np.zeros_like(density)
        share[:, 1:] = np.cumsum(density[:, 1:] + density[:, :-1], axis=1)
        share /= share[:, -1:]
        above = np.clip(np.argmax(share >= uniform[:, None], axis=1), 1, None)
        k = np.arange(len(uniform))
        low, high = share[k, above - 1], share[k, above]
        part = (uniform - low) / np.maximum(high - low, 1e-300)
        place = depth[above - 1] + part * (depth[1] - depth[0])
        crossing.behind_kpc[row] = place * crossing.r200c_kpc[row]


def _nfw(x, c200c) -> np.ndarray:
    y = c200c * x
    return 1 / (y * (1 + y) ** 2)
