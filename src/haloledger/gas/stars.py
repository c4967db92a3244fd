"""The share of a halo's baryons that is in stars: what the gas cannot have."""

from __future__ import annotations

import numpy as np

from haloledger.cosmos.background import Cosmos

SOURCE = (
    "centrals below 1e13: Moster, Naab & White 2013 (MNRAS 428, 3121), table 1, z = 0; groups and clusters above: "
    "HSC-XXL stars as compiled in Grandis et al. 2024, table 1 (0.021 of M500c at 1e14, slope -0.20)"
)
# Moster, Naab & White 2013, table 1, z = 0
LOG_M1, NORM, BETA, GAMMA = 11.590, 0.0351, 1.376, 0.608
# Grandis et al. 2024, table 1, HSC-XXL
GROUP_SHARE, GROUP_PIVOT_LOG_M500C, GROUP_SLOPE = 0.021, 14.0, -0.20
# the change from one to the other: ours
HANDOVER_LOG_M200C, HANDOVER_WIDTH_DEX = 13.0, 0.15
LOG_M500C_OVER_M200C = -0.14  # NFW of c200c = 5; the slope of -0.20 makes the rest of no account


def star_share(log_m200c, cosmos: Cosmos) -> np.ndarray:
    """M_star / (f_b M) of a halo today: its central galaxy at low mass, all its galaxies in groups and clusters.

    log_m200c  log10 Msun, any shape; redshift is left out, the fits being for z < 1
    """
    log_m = np.asarray(log_m200c, dtype=float)
    m = 10.0 ** (log_m - LOG_M1)
    central = 2 * NORM / (m**-BETA + m**GAMMA)
    group = GROUP_SHARE * 10.0 ** (GROUP_SLOPE * (log_m + LOG_M500C_OVER_M200C - GROUP_PIVOT_LOG_M500C))
    weight = 1 / (1 + np.exp(-(log_m - HANDOVER_LOG_M200C) / HANDOVER_WIDTH_DEX))
    return ((1 - weight) * central + weight * group) / cosmos.baryon_share
