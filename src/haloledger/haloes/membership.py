"""Is a galaxy the centre of a halo of its own, in a halo that is listed, or in one that no list has?

Galaxies of the same sky place, redshift and stellar mass y come in three ways; their rates per area and redshift are

    central             phi_central(y, z) dV/dz (1 + companions)
    in a listed halo k  [dN(y | M_k) Sigma(R)] N(z_obs | z_k, sigma_v and errors) x (halo k is a halo)
    in an unlisted one  phi_satellite(y, z) dV/dz (1 - completeness)

and their shares are the probabilities. Listed haloes are groups, and galaxies: a heavier galaxy claims its neighbours,
as far as it is the centre of a halo itself. `companions` are the haloes beside k that are not in it. The completeness,
the share of hosts that the catalogue with the satellite holds too, is learnt from each catalogue.

Published member lists win, and a galaxy at a group's very centre and velocity is that group's. Galaxies with a listed
halo mass have no stellar mass to be counted by: with sharp redshifts they are inside a group or not, with others
galaxies follow matter (`odds_by_matter`).
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from haloledger.cosmos.background import Cosmos
from haloledger.cosmos.concentration import concentration
from haloledger.haloes.distances import MIN_Z, SPEED_OF_LIGHT_KMS, point_redshift
from haloledger.haloes.nfw_place import surface_per_r200c2
from haloledger.haloes.phase_space import Extent, Inside, inside, same_place
from haloledger.haloes.posterior import MASS_RELATION
from haloledger.haloes.satellites import numbers_of_nature, occupation
from haloledger.haloes.table import Haloes

SHARP_KMS = 300.0
HEAVIER_DEX = 0.7  # a galaxy heavier than a group by more is not its member, whatever the sky looks like
CERTAIN = 0.995  # above it a galaxy is a member in every draw
LEAST_UNLISTED = 0.003  # below it no host of that galaxy is drawn
ROUNDS = 12
MASS_SCORES = np.array([-1.7320508075688772, 0.0, 1.7320508075688772])  # Gauss-Hermite, for the mass of a host
MASS_WEIGHTS = np.array([1.0, 4.0, 1.0]) / 6.0
DEPTHS = np.linspace(-2.5, 2.5, 11)  # errors of a photometric redshift over which the field is averaged


@dataclass(frozen=True)
class Membership:
    """Probabilities, shape (n_galaxies,): a listed halo holds the galaxy; an unlisted one does."""

    listed: np.ndarray
    unlisted: np.ndarray
    hosted: np.ndarray  # part of `unlisted`: the galaxy is the heaviest satellite, with which the host comes in
    completeness: dict[int, float]  # catalogue -> share of hosts it holds
    satellites: np.ndarray  # listed galaxies that each galaxy is expected to hold
    share: np.ndarray  # completeness of its catalogue
    group: np.ndarray  # the group that most probably holds it, -1 where none does
    heavier: np.ndarray  # bool: at the centre of that group, and too heavy for it
    claimed: int  # galaxies that a heavier galaxy claims with more than a half


def memberships(
    galaxies: Haloes, sizes: list[Extent], groups: Haloes | None, group_sizes: list[Extent], group_rows, cosmos: Cosmos
) -> Membership:
    """How probably each galaxy is a member of a listed or an unlisted halo.

    sizes, group_sizes  extents at the masses with scores MASS_SCORES
    group_rows          every "label:id" of the listed groups, doubles and parts included
    """
    size = sizes[1]
    counted = (galaxies.mass_kind == "stellar") & np.isfinite(galaxies.value)
    central, satellite, first = _field(galaxies, counted, cosmos)
    fixed = np.zeros(len(galaxies))
    by_group, companions = np.zeros(len(galaxies)), np.zeros(len(galaxies))
    group, heavier = np.full(len(galaxies), -1), np.zeros(len(galaxies), dtype=bool)
    if groups is not None:
        fixed = _fixed(galaxies, size, groups, group_sizes[1], group_rows, counted, cosmos)
        around = inside(groups, group_sizes[-1], galaxies, size)
        found = _lighter(around, group_sizes[1], size, counted)
        rate = _rate(galaxies, groups, group_sizes, found, cosmos, with_central=True)
        np.add.at(by_group, found.j, rate)
        _strongest(group, found, rate)
        centred = _part(around, same_place(groups, group_sizes[1], galaxies, around))
        group[centred.j], fixed[centred.j] = centred.i, 1.0
        too_heavy = size.log_m200c[centred.j] > group_sizes[1].log_m200c[centred.i] + HEAVIER_DEX
        heavier[centred.j] = too_heavy
        _published_groups(group, galaxies, groups)
        np.maximum.at(companions, found.j, _companions(galaxies, groups, group_sizes[1], found, cosmos))
    pairs = _lighter(inside(galaxies, sizes[-1], galaxies, size), size, size, counted, strict=True)
    pairs = _part(pairs, counted[pairs.i] & (fixed[pairs.i] < 1) & (fixed[pairs.j] < 1))
    by_pair = _rate(galaxies, galaxies, sizes, pairs, cosmos, with_central=False)
    np.maximum.at(companions, pairs.j, _companions(galaxies, galaxies, size, pairs, cosmos))
    central = central * (1 + companions)
    share = first / np.maximum(satellite, 1e-300)
    return replace(
        _shares(galaxies, counted, fixed, central, satellite, share, by_group, pairs, by_pair),
        group=group,
        heavier=heavier & (group >= 0),
    )


def _strongest(group: np.ndarray, found: Inside, rate: np.ndarray) -> None:
    """Write the group with the highest rate of each galaxy into `group`, in place."""
    order = np.lexsort((-found.i, rate))  # the last assignment stays
    group[found.j[order]] = found.i[order]


def _published_groups(group: np.ndarray, galaxies: Haloes, groups: Haloes) -> None:
    """Write the groups that catalogues name into `group`, in place; a full name goes before a bare id."""
    place: dict[str, int] = {}
    for i, text in enumerate(groups.source_rows):
        for name in str(text).split(";"):
            place[name] = i
            place.setdefault(name.split(":", 1)[-1], i)
    for j in np.flatnonzero(galaxies.listed_group != "").tolist():
        group[j] = place.get(str(galaxies.listed_group[j]), group[j])


def _shares(
    galaxies: Haloes, counted, fixed, central, satellite, first, by_group, pairs: Inside, by_pair
) -> Membership:
    """The three rates as shares; a claim counts as far as the claimant is a centre, so they are found in rounds."""
    nature = numbers_of_nature()["completeness"]
    names, which = np.unique(galaxies.catalogue, return_inverse=True)
    complete = np.full(names.size, nature["mean"])
    own = np.where(counted, 1.0, 1.0 - fixed)
    by_galaxy, whole = np.zeros(len(galaxies)), np.ones(len(galaxies))
    for _ in range(ROUNDS):
        by_galaxy = np.zeros(len(galaxies))
        np.add.at(by_galaxy, pairs.j, own[pairs.i] * by_pair)
        lone = satellite * (1 - complete[which])
        whole = np.maximum(central + by_group + by_galaxy + lone, 1e-300)
        listed = np.where(fixed >= 1, 1.0, np.where(counted, (by_group + by_galaxy) / whole, fixed))
        unlisted = np.where(counted & (fixed < 1), lone / whole, 0.0)
        own = 1 - listed - unlisted
        held = np.bincount(which, np.where(counted, listed, 0.0), names.size)
        lost = np.bincount(which, unlisted, names.size)
        complete = (held + nature["mean"] * nature["weight"]) / (held + lost + nature["weight"])
    listed = np.where(listed > CERTAIN, 1.0, listed)
    unlisted = np.where((listed >= 1) | (unlisted < LEAST_UNLISTED), 0.0, unlisted)
    mostly = counted & (fixed < 1) & (listed > 0.5) & (by_galaxy > by_group)
    nobody = np.full(len(galaxies), -1)
    return Membership(
        listed=listed,
        satellites=_held(pairs, own[pairs.i] * by_pair / whole[pairs.j], len(galaxies)),
        share=complete[which],
        unlisted=unlisted,
        hosted=unlisted * first,
        completeness=dict(zip(names.tolist(), complete.tolist(), strict=True)),
        group=nobody,
        heavier=nobody >= 0,
        claimed=int(mostly.sum()),
    )


def _held(pairs: Inside, claims: np.ndarray, n: int) -> np.ndarray:
    held = np.zeros(n)
    np.add.at(held, pairs.i, claims)
    return held


def _field(galaxies: Haloes, counted: np.ndarray, cosmos: Cosmos) -> list[np.ndarray]:
    """Centrals, satellites and first satellites like each galaxy per steradian, redshift and dex of y."""
    listed = point_redshift(galaxies, cosmos)
    totals = [np.zeros(len(galaxies)) for _ in range(3)]
    for rows, steps in ((counted & ~galaxies.photometric, np.zeros(1)), (counted & galaxies.photometric, DEPTHS)):
        index = np.flatnonzero(rows)
        weight = np.exp(-0.5 * steps**2)
        for step, w in zip(steps, weight / weight.sum(), strict=True):
            z = np.maximum(listed[index] + step * galaxies.z_err[index], MIN_Z)
            y = galaxies.value[index] + _step(galaxies, index, z, listed[index], cosmos)
            volume = w * cosmos.volume_element(z)
            for total, number in zip(totals, occupation(cosmos).numbers(y, z, galaxies.value_err[index]), strict=True):
                total[index] += number * volume
    return totals


def _step(galaxies: Haloes, index, z, listed, cosmos: Cosmos) -> np.ndarray:
    """How the stellar mass moves where the redshift does."""
    moves = galaxies.photometric[index] & ~galaxies.err_holds_z[index]
    ratio = cosmos.luminosity_distance_mpc(z) / cosmos.luminosity_distance_mpc(listed)
    return np.where(moves, 2 * np.log10(ratio), 0.0)


def _part(found: Inside, keep) -> Inside:
    return Inside(found.i[keep], found.j[keep], found.radius[keep], found.depth[keep])


def _lighter(found: Inside, size: Extent, galaxy_size: Extent, counted, strict: bool = False) -> Inside:
    """Pairs whose galaxy j can be in halo i."""
    m_host, m_galaxy = size.log_m200c[found.i], galaxy_size.log_m200c[found.j]
    if strict:
        keep = (m_galaxy < m_host) | ((m_galaxy == m_host) & (found.j < found.i))
    else:
        keep = m_galaxy <= m_host + HEAVIER_DEX
    return _part(found, keep & counted[found.j])


def _rate(galaxies: Haloes, hosts: Haloes, sizes: list[Extent], found: Inside, cosmos: Cosmos, with_central: bool):
    """Members like galaxy j of halo i per steradian, redshift and dex of y, at its place; shape (n_pairs,)."""
    i, j, z = found.i, found.j, sizes[1].z[found.i]
    y = galaxies.value[j] + _step(galaxies, j, z, point_redshift(galaxies, cosmos)[j], cosmos)
    r_kpc = found.radius * (sizes[-1].r200c_kpc[i] + hosts.centre_err_kpc[i])
    rates = (
        w * _rate_at(galaxies, hosts, s, found, y, r_kpc, cosmos, with_central)
        for w, s in zip(MASS_WEIGHTS, sizes, strict=True)
    )
    return sum(rates)


def _rate_at(galaxies, hosts, size: Extent, found: Inside, y, r_kpc, cosmos: Cosmos, with_central: bool):
    i, j, z = found.i, found.j, size.z[found.i]
    central, satellites = occupation(cosmos).in_host(y, z, galaxies.value_err[j], size.log_m200c[i])
    c200c = concentration(MASS_RELATION, size.log_m200c[i], z, cosmos)
    reach_kpc = size.r200c_kpc[i] + hosts.centre_err_kpc[i]
    per_sr = (size.kpc_per_rad[i] / reach_kpc) ** 2
    spread = surface_per_r200c2(r_kpc / reach_kpc, c200c) * per_sr
    rate = satellites * spread
    if with_central:
        place = numbers_of_nature()["place"]
        off_kpc = np.hypot(hosts.centre_err_kpc[i], place["central_offset_r200c"] * size.r200c_kpc[i])
        near = np.exp(-0.5 * (r_kpc / off_kpc) ** 2) / (2 * np.pi * off_kpc**2) * size.kpc_per_rad[i] ** 2
        share = place["central_at_centre"]
        rate = rate + central * (share * near + (1 - share) * spread)
    return rate * _per_redshift(galaxies, hosts, size, found, size.sigma_v_kms[i])


def _companions(galaxies: Haloes, hosts: Haloes, size: Extent, found: Inside, cosmos: Cosmos) -> np.ndarray:
    """Mean overdensity of haloes that are near halo i but not in it, at the redshift of galaxy j."""
    p = numbers_of_nature()["neighbours"]
    per_mpc = 100 * cosmos.h * cosmos.e_of_z(size.z[found.i]) / SPEED_OF_LIGHT_KMS  # redshift per comoving Mpc
    return p["projected_mpc"] * per_mpc * _per_redshift(galaxies, hosts, size, found, p["velocity_kms"])


def _per_redshift(galaxies: Haloes, hosts: Haloes, size: Extent, found: Inside, velocity_kms) -> np.ndarray:
    i, j = found.i, found.j
    moving = velocity_kms * (1 + size.z[i]) / SPEED_OF_LIGHT_KMS
    s = np.sqrt(galaxies.z_err[j] ** 2 + hosts.z_err[i] ** 2 + moving**2)
    return np.exp(-0.5 * ((galaxies.z[j] - hosts.z[i]) / s) ** 2) / (np.sqrt(2 * np.pi) * s)


def _fixed(galaxies: Haloes, size: Extent, groups: Haloes, group_size: Extent, group_rows, counted, cosmos: Cosmos):
    """Probability that needs no count of galaxies: 1 for published members, by matter for rows without stellar mass."""
    found = inside(groups, group_size, galaxies, size)
    found = _lighter(found, group_size, size, ~counted)
    i, j = found.i, found.j
    scale = SPEED_OF_LIGHT_KMS / (1 + group_size.z[i])
    err_kms = np.hypot(galaxies.z_err[j], groups.z_err[i]) * scale
    sharp = (err_kms < np.maximum(group_size.sigma_v_kms[i], SHARP_KMS)) & ~galaxies.photometric[j]
    apart_kms = (galaxies.z[j] - groups.z[i]) * scale
    odds = np.zeros(len(galaxies))
    spread_kms = np.hypot(err_kms, group_size.sigma_v_kms[i])
    np.add.at(odds, j, odds_by_matter(apart_kms, spread_kms, found.radius, group_size, i, cosmos))
    p = odds / (1 + odds)
    p[j[sharp]] = 1.0
    p[published(galaxies, group_rows)] = 1.0
    return p


def published(galaxies: Haloes, group_rows) -> np.ndarray:
    """Galaxies that their catalogue puts in a listed group, with or without that table's label."""
    names = [*group_rows, *(row.split(":", 1)[-1] for row in group_rows)]
    return np.isin(galaxies.listed_group.astype(str), names) & (galaxies.listed_group != "")


def odds_by_matter(apart_kms, err_kms, radius, size: Extent, i, cosmos: Cosmos) -> np.ndarray:
    """p / (1 - p) = delta x 2 sqrt(r200c^2 - R^2) H(z) / c x N(z_obs | z_group): galaxies follow matter.

    The density inside a halo is delta = 200 rho_crit / rho_mean times the mean, along a chord of the sphere.
    """
    z = size.z[i]
    chord_kpc = 2 * size.r200c_kpc[i] * np.sqrt(np.maximum(1 - radius**2, 0.0))
    hubble_kms = 0.1 * cosmos.h * cosmos.e_of_z(z) * chord_kpc  # speed across the chord in the Hubble flow
    per_kms = np.exp(-0.5 * (apart_kms / err_kms) ** 2) / (np.sqrt(2 * np.pi) * err_kms)
    return 200 / cosmos.omega_m_z(z) * hubble_kms * per_kms
