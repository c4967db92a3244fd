"""How far a model lets the gas of one halo differ from its mean. Declared here, drawn elsewhere."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np


@dataclass(frozen=True)
class Spread:
    """Spreads in dex, each for a log-normal factor of mean 1, so that the gas of all haloes together stays the model's.

    log_m200c           masses at which shared_dex and own_dex are given; one value means the same at every mass
    shared_dex, own_dex spread of the kept fraction that all haloes of a draw share, and from halo to halo
    b_over_r200c, shape_scatter_dex  scatter of one column against the mean of its impact parameter
    Between the given points all are linear, outside constant.
    """

    log_m200c: tuple[float, ...] = (12.0,)
    shared_dex: tuple[float, ...] = (0.0,)
    own_dex: tuple[float, ...] = (0.0,)
    b_over_r200c: tuple[float, ...] = (0.0,)
    shape_scatter_dex: tuple[float, ...] = (0.0,)

    @property
    def largest_shared(self) -> float:
        return max(self.shared_dex)

    @property
    def largest_own(self) -> float:
        return max(self.own_dex)

    def shape_scatter(self, b_over_r200c) -> np.ndarray:
        return np.interp(b_over_r200c, self.b_over_r200c, self.shape_scatter_dex)
