"""The budget of one sightline: every term as draws, and what is left."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from haloledger.cosmos.background import Cosmos
from haloledger.cosmos.mean_dm import mean_cosmic_dm
from haloledger.cosmos.scatter import relative_dm
from haloledger.engine.universe import Universe
from haloledger.reach.census import Census
from haloledger.reach.coverage import Reach
from haloledger.reach.diffuse import DiffuseWidth, diffuse_draws
from haloledger.sightlines.draws import Sightline

TERMS = (
    "dm_mw_disc",
    "dm_mw_halo",
    "dm_foreground",
    "dm_unlisted",
    "dm_diffuse",
    "dm_cosmic_mean_z",
    "dm_cosmic_with_foreground",
    "dm_at_source",
    "dm_host_obs",
    "dm_after_mw_foreground",
    "dm_after_all",
)
EXTRA_TERMS = ("dm_disc_crossing",)
"""Beside them: discs of foreground galaxies are neither cosmic gas nor halo gas."""
CIRCULAR = ("dm_host_obs", "dm_after_mw_foreground", "dm_after_all")
"""Not printed where the redshift itself was drawn from the observed DM: the host then depends on the redshift drawn."""


@dataclass(frozen=True)
class Ends:
    """Terms at the two ends of a sightline, draws (n_draws,) [pc cm-3], observer frame."""

    mw_disc: np.ndarray
    mw_halo: np.ndarray
    host_obs: np.ndarray


def budget(
    sightline: Sightline,
    ends: Ends,
    foreground: np.ndarray,
    at_source: np.ndarray,
    disc_crossing: np.ndarray,
    census: Census,
    census_factor: np.ndarray,
    width: DiffuseWidth,
    reach: Reach,
    universe: Universe,
    cosmos: Cosmos,
) -> dict[str, np.ndarray]:
    """All terms of TERMS and EXTRA_TERMS as draws (n_draws,) [pc cm-3].

    Gas is conserved in every draw: diffuse mean = mean cosmic - halo census x kept fraction of the draw.
    reach: bounds of the share of the average halo DM that the catalogues would have listed here. Where they differ it
    is drawn between them: the unlisted term then says what not knowing costs.
    """
    diffuse_score, cosmic_score = universe.normals("cosmic", [f"{sightline.burst}|diffuse", f"{sightline.burst}|total"])
    line, share = universe.uniforms("unlisted", [f"{sightline.burst}|line", f"{sightline.burst}|reach"])
    halo_mean = census.mean(sightline.z, census_factor)
    unlisted_share = 1 - reach.draws(share)
    if universe.fixed:
        unlisted = unlisted_share * halo_mean
    else:
        pick = np.minimum((line * len(census.sums)).astype(int), len(census.sums) - 1)
        typical = census.mean(sightline.z, np.ones_like(census_factor))
        unlisted = unlisted_share * census.lines(sightline.z, pick) * halo_mean / np.maximum(typical, 1e-12)
    diffuse = diffuse_draws(sightline.z, halo_mean, width, diffuse_score, cosmos)
    if universe.fixed:
        diffuse = np.maximum(mean_cosmic_dm(sightline.z, cosmos) - halo_mean, 0)
    total_scatter = 1.0 if universe.fixed else relative_dm(sightline.z, cosmic_score)
    after_mw = sightline.dm - ends.mw_disc - ends.mw_halo - foreground - disc_crossing
    cosmic = diffuse + foreground + unlisted
    return {
        "dm_mw_disc": ends.mw_disc,
        "dm_mw_halo": ends.mw_halo,
        "dm_foreground": foreground,
        "dm_unlisted": unlisted,
        "dm_diffuse": diffuse,
        "dm_cosmic_mean_z": mean_cosmic_dm(sightline.z, cosmos) * total_scatter,
        "dm_cosmic_with_foreground": cosmic,
        "dm_at_source": at_source,
        "dm_host_obs": ends.host_obs,
        "dm_after_mw_foreground": after_mw,
        "dm_after_all": after_mw - unlisted - diffuse - at_source - ends.host_obs,
        "dm_disc_crossing": disc_crossing,
    }
