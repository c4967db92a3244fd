"""How the haloes near one sightline are crossed, draw by draw: geometry only, no gas yet."""

from __future__ import annotations

from dataclasses import dataclass, fields, replace
from functools import cached_property

import numpy as np

from haloledger.cosmos.background import Cosmos
from haloledger.cosmos.concentration import concentration
from haloledger.engine.universe import Universe
from haloledger.haloes.draws import draw_haloes
from haloledger.haloes.table import HaloDraws, Haloes
from haloledger.sightlines.draws import LIGHT_KMS, Sightline
from haloledger.sightlines.geometry import impact_parameters


@dataclass(frozen=True)
class Crossing:
    """Draws of the near haloes of one sightline; arrays (n_haloes, n_draws) unless a shape is given.

    index         rows of the halo list (n_haloes,)
    at_source     the burst sits in this halo in this draw
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
        return (self.at_source & self.own).any(axis=0)


def cross(
    sightline: Sightline,
    haloes: Haloes,
    index: np.ndarray,
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
    return Crossing(
        index=index,
        at_source=np.zeros(draws.own.shape, dtype=bool),
        own=draws.own,
        log_m200c=draws.log_m200c,
        z=draws.z,
        r200c_kpc=r200c_kpc,
        distance_kpc=draws.distance_kpc,
        impact_kpc=impact_kpc,
        behind_kpc=1e3 * _gap_mpc(sightline, haloes, index, draws.z, cosmos) / (1 + draws.z),
        ahead_kpc=ahead_kpc,
        c200c=_concentration(draws, relation, cosmos),
    )


def join(parts: list[Crossing]) -> Crossing:
    """The haloes of all parts, one after the other."""
    return Crossing(**{f.name: np.concatenate([getattr(p, f.name) for p in parts]) for f in fields(Crossing)})


def _gap_mpc(sightline: Sightline, haloes: Haloes, index: np.ndarray, z: np.ndarray, cosmos: Cosmos) -> np.ndarray:
    """Comoving distance of the burst behind each halo [Mpc], both redshifts in the halo's frame.

    A halo's distance may come from its redshift in the CMB frame; the burst's redshift, heliocentric, is moved by as
    much: they lie in one direction.
    """
    listed = haloes.z[index]
    shift = np.where(np.isfinite(listed), haloes.z_flow[index] - listed, 0.0)
    per_z = LIGHT_KMS / (100 * cosmos.h * cosmos.e_of_z(sightline.z))
    burst = cosmos.comoving_distance_mpc(sightline.z)[None, :] + per_z[None, :] * np.nan_to_num(shift)[:, None]
    return burst - cosmos.comoving_distance_mpc(z)


def _concentration(draws: HaloDraws, relation: str | float, cosmos: Cosmos) -> np.ndarray:
    median = concentration(relation, draws.log_m200c, draws.z, cosmos)
    # a relation that is a number holds for every halo, without scatter
    return median * 10**draws.log_c_offset if isinstance(relation, str) else median


def with_burst_inside(
    crossing: Crossing, odds: np.ndarray, sightline: Sightline, haloes: Haloes, universe: Universe
) -> Crossing:
    """The crossing with the burst inside one halo at most in each draw, by the odds of those that draw has.

    Its depth there is drawn from an NFW density along the line, out to two r200c: a velocity difference says nothing
    about the order along the line inside one halo.
    odds  (n_haloes, n_draws)
    """
    rows = np.flatnonzero((odds > 0).any(axis=1))
    if not rows.size:
        return crossing
    pick = universe.uniforms("inside", [sightline.burst])[0]
    weight = odds[rows] * crossing.own[rows]  # a satellite's place has no halo to sit in
    upper = np.cumsum(weight, axis=0)
    whole = 1 + upper[-1]
    inside = (pick < upper / whole) & (pick >= (upper - weight) / whole)
    names = [f"{sightline.burst}|{haloes.id[crossing.index[i]]}" for i in rows]
    at_source, behind_kpc = crossing.at_source.copy(), crossing.behind_kpc.copy()
    for row, here, uniform in zip(rows.tolist(), inside, universe.uniforms("depth", names), strict=True):
        at_source[row] = here
        behind_kpc[row] = np.where(
            here, _depth_r200c(crossing, row, uniform) * crossing.r200c_kpc[row], behind_kpc[row]
        )
    return replace(crossing, at_source=at_source, behind_kpc=behind_kpc)


def _depth_r200c(crossing: Crossing, row: int, uniform: np.ndarray) -> np.ndarray:
    """Depth of the burst behind the closest approach [r200c], (n_draws,), at the share `uniform` of the density."""
    depth = np.linspace(-2.0, 2.0, 161)
    radius = np.sqrt(crossing.impact_r200c[row][:, None] ** 2 + depth[None, :] ** 2 + 1e-4)
    density = _nfw(radius, crossing.c200c[row][:, None])
    share = np.zeros_like(density)
    share[:, 1:] = np.cumsum(density[:, 1:] + density[:, :-1], axis=1)
    share /= share[:, -1:]
    above = np.clip(np.argmax(share >= uniform[:, None], axis=1), 1, None)
    k = np.arange(len(uniform))
    low, high = share[k, above - 1], share[k, above]
    return depth[above - 1] + (uniform - low) / np.maximum(high - low, 1e-300) * (depth[1] - depth[0])


def _nfw(x, c200c) -> np.ndarray:
    y = c200c * x
    return 1 / (y * (1 + y) ** 2)
