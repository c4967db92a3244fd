"""Fixtures shared by all tests."""

from pathlib import Path

import pytest

SHARED = Path(__file__).parents[2] / "shared" / "data"


@pytest.fixture(scope="session")
def shared_data() -> Path:
    """Folder with the published catalogues; tests that need it are skipped where it is absent."""
    if not SHARED.is_dir():
        pytest.skip("the folder of published catalogues is not beside this checkout")
    return SHARED


@pytest.fixture(scope="session")
def planck():
    """The default cosmology."""
    from haloledger.cosmos.background import cosmology

    return cosmology("Planck18")
