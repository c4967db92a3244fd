"""The same kept fraction in every halo."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from haloledger.gas.kept.base import KeptLaw, fraction_fault


@dataclass(frozen=True, kw_only=True)
class Constant(KeptLaw):
    """kept = value, dimensionless."""

    law = "constant"
    kept: float

    def value(self, log_m200c, z, c200c, cosmos) -> np.ndarray:
        return np.asarray(self.kept)

    def check(self) -> str | None:
        return fraction_fault("kept", self.kept)
