"""One small sky for all tests of the rehearsal."""

import numpy as np
import pytest

from haloledger.rehearse.sky.simulate import Truth, simulate
from haloledger.rehearse.survey import Survey, look

SMALL = Truth(lines=120, cells=64, cell_mpc=6.0)


@pytest.fixture(scope="session")
def small():
    """What the sky of these tests is made of."""
    return SMALL


@pytest.fixture(scope="session")
def sky(planck):
    return simulate(SMALL, 5, planck)


@pytest.fixture(scope="session")
def seen(sky, planck):
    return look(sky, Survey(), planck, np.random.default_rng(5))
