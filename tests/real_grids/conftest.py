"""Real open grids, where they are at hand: the folder named by CROPSTRESS_REAL_DATA."""

import os
from pathlib import Path

import pytest


@pytest.fixture(scope="session")
def real_grids() -> Path:
    """The folder `grids` of the real data."""
    named = os.environ.get("CROPSTRESS_REAL_DATA")
    if not named:
        pytest.skip("real grids are needed: set CROPSTRESS_REAL_DATA to their folder")
    return Path(named) / "grids"
