"""What the satellites that a list shows beside a galaxy, or does not show, say of its halo's mass.

    P(M | y, z, N) ~ P(M | y, z) x exp(-mu) mu^N,   mu = completeness x number of satellites of M above the list's limit

A lone galaxy of a deep list is no random central: a heavy halo would have shown members. One with thirty is heavier
than its own light says. The limit, in stellar mass at the galaxy's distance, is read off the list in 324 cells of the
sky; lists too short for that say nothing. The neighbours of a galaxy with a photometric redshift are not known, unless
its list names members of groups: then a galaxy that is in none is lone.
"""

from __future__ import annotations

import numpy as np

from haloledger.cosmos.background import Cosmos
from haloledger.haloes.distances import SPEED_OF_LIGHT_KMS, point_luminosity_distance_mpc, point_redshift
from haloledger.haloes.posterior import U_NODES, inverse
from haloledger.haloes.redshifts import quantiles_on_grid
from haloledger.haloes.satellites import occupation
from haloledger.haloes.table import Haloes, change, rows

LEAST_ROWS = 100  # of a list, and of a cell, to read a limit off
LIMIT_QUANTILE = 0.05
SHARPEST_KMS = 1000.0  # redshift error above which the neighbours of a galaxy are not known
SAID = 3
FINE = np.linspace(-4.2, 4.2, 57)
BANDS = 18


def with_company(
    galaxies: Haloes, n_satellites: np.ndarray, share: np.ndarray, published: np.ndarray, cosmos: Cosmos
) -> Haloes:
    """Galaxies with the number of their satellites, the limit and completeness of their lists.

    published  galaxies that their list puts in a listed group (n,)
    """
    limit = _limits(galaxies, cosmos)
    sharp = (galaxies.z_err * SPEED_OF_LIGHT_KMS < SHARPEST_KMS) & ~galaxies.photometric
    with_members = np.isin(galaxies.catalogue, np.unique(galaxies.catalogue[published]))
    n_satellites = np.where(sharp, n_satellites, 0.0)
    told = (sharp | with_members) & np.isfinite(limit) & (galaxies.mass_kind == "stellar") & ~galaxies.posterior
    note = galaxies.note.copy()
    many = told & (n_satellites >= SAID)
    note[many] = [f"{n}; weighed with {k:.0f} satellites" for n, k in zip(note[many], n_satellites[many], strict=True)]
    return change(
        galaxies,
        note=note,
        n_satellites=np.where(told, n_satellites, np.nan),
        faintest=np.where(told, limit, np.nan),
        list_share=share,
    )


def score_in_company(haloes: Haloes, score: np.ndarray, relation: str, cosmos: Cosmos) -> np.ndarray:
    """Normal scores of P(M | y, z) that stand where `score` stands in P(M | y, z, N); shape (n, k)."""
    told = np.flatnonzero(np.isfinite(haloes.n_satellites))
    if not told.size:
        return score
    part = rows(haloes, told)
    z, err = point_redshift(part, cosmos)[:, None], part.value_err[:, None]
    mass = inverse(relation, cosmos).mass(part.value[:, None], z, err, FINE)
    mu = part.list_share[:, None] * occupation(cosmos).above(part.faintest[:, None], z, err, mass)
    ln_p = -0.5 * FINE**2 - mu + part.n_satellites[:, None] * np.log(np.maximum(mu, 1e-30))
    table = quantiles_on_grid(ln_p, np.broadcast_to(FINE, ln_p.shape))
    at = np.clip((score[told] - U_NODES[0]) / (U_NODES[1] - U_NODES[0]), 0, U_NODES.size - 1)
    low = np.minimum(at.astype(int), U_NODES.size - 2)
    w = at - low
    row = np.arange(told.size)[:, None]
    moved = score.copy()
    moved[told] = (1 - w) * table[row, low] + w * table[row, low + 1]
    return moved


def _limits(galaxies: Haloes, cosmos: Cosmos) -> np.ndarray:
    """Stellar mass that the list reaches at each galaxy: by flux, in its part of the sky, and by mass."""
    flow = 2 * np.log10(point_luminosity_distance_mpc(galaxies, cosmos))
    flux = galaxies.value - flow
    band = np.floor((np.sin(np.radians(galaxies.dec_deg)) + 1) * BANDS / 2)
    cell = band * BANDS + np.floor(galaxies.ra_deg / (360 / BANDS))
    limit = np.full(len(galaxies), np.nan)
    usable = (galaxies.mass_kind == "stellar") & np.isfinite(galaxies.value)
    for k in np.unique(galaxies.catalogue[usable]):
        of_list = np.flatnonzero(usable & (galaxies.catalogue == k))
        if of_list.size < LEAST_ROWS:
            continue
        whole = np.quantile(flux[of_list], LIMIT_QUANTILE)
        least = np.quantile(galaxies.value[of_list], 0.01)
        order = of_list[np.argsort(cell[of_list], kind="stable")]
        _, start = np.unique(cell[order], return_index=True)
        for part in np.split(order, start[1:]):
            faintest = np.quantile(flux[part], LIMIT_QUANTILE) if part.size >= LEAST_ROWS else whole
            limit[part] = np.maximum(faintest + flow[part], least)
    return limit
