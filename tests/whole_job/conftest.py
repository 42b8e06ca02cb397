"""The sample run, once for all tests here."""

from __future__ import annotations

from pathlib import Path

import pytest
import xarray as xr

from cropstress.job import Outcome, run

ROOT = Path(__file__).parents[2]
RUN_FILE = ROOT / "configs" / "season.toml"


@pytest.fixture(scope="session")
def sample_run(tmp_path_factory: pytest.TempPathFactory) -> Outcome:
    """Return the outcome of `configs/season.toml`: its files, and the results before they were written."""
    return run(RUN_FILE, tmp_path_factory.mktemp("sample") / "season")


@pytest.fixture(scope="session")
def results(sample_run: Outcome) -> dict[str, xr.Dataset]:
    """Return the float64 results by crop."""
    return {str(result.attrs["crop"]): result for result in sample_run.results}


@pytest.fixture(scope="session")
def sample_weather() -> xr.Dataset:
    """Return the plain air temperatures of the sample grids, opened without the package."""
    return xr.open_dataset(ROOT / "sample_grids" / "airtemperature_2021.nc").load()
