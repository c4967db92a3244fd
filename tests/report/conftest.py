"""Invented ledgers for the tests of tables, screen and figures."""

import pytest
from synthetic import ledgers as make


@pytest.fixture
def ledgers():
    """Two bursts, two models."""
    return make()
