"""A cut-out of the sample grids, two crops with short seasons on it, and a way to compute them."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

import numpy as np
import pytest
import xarray as xr

import cropstress as cs
from cropstress.crops import CropProfile, load_crop
from cropstress.region import Entry, Options, co2_of, compute_results, make_entry, time_axis
from cropstress.region.plan import Plan, plan_blocks, plan_tiles

SAMPLE = Path(__file__).resolve().parents[2] / "sample_grids"
FILES = [
    SAMPLE / f"{name}.nc"
    for name in ("airtemperature_2021", "humidity_2021", "radiation_2021", "wind_2021", "elevation")
]

#: Seasons of 50 days, so that all stages and the flowering window lie in the cut-out; invented for tests.
SHORT = {"initial_days": 8, "development_days": 12, "mid_days": 20, "late_days": 10}
SHORT_SUMS = {
    "initial_thermal_sum": 110,
    "development_thermal_sum": 180,
    "mid_thermal_sum": 300,
    "late_thermal_sum": 150,
}


ShortCrop = Callable[..., CropProfile]


@pytest.fixture(scope="session")
def short_crop() -> ShortCrop:
    """Load a profile with a season of about 50 days, by days or by thermal time."""

    def load(name: str, stages: str = "days") -> CropProfile:
        lengths = SHORT_SUMS if stages == "thermal_time" else SHORT
        source = "invented for tests"
        return load_crop(name, {key: {"value": float(value), "source": source} for key, value in lengths.items()})

    return load


@pytest.fixture(scope="session")
def weather() -> xr.Dataset:
    """14 x 10 cells and 70 days with both heat waves, from the sea to the dry interior, in memory.

    Three days are missing in one cell, and one day of another needs mending.
    """
    whole = cs.open_weather(FILES)
    cut = whole.isel(lat=slice(3, 59, 4), lon=slice(0, None, 8), time=slice(61, 131)).load()
    assert cut["tmax"].shape == (70, 14, 10)
    cut["tmax"][20:23, 5, 6] = np.nan
    cut["tmin"][30, 6, 7] = cut["tmax"][30, 6, 7] + 0.1
    return cut


@pytest.fixture(scope="session")
def area(weather: xr.Dataset) -> np.ndarray:
    """A crop area that leaves out every third cell and says nothing of the sea."""
    rows, columns = np.indices(weather["tmax"].shape[1:])
    return np.where((rows + columns) % 3 == 0, 0.0, 0.4)


@pytest.fixture(scope="session")
def entries(weather: xr.Dataset, area: np.ndarray, short_crop: ShortCrop) -> list[Entry]:
    """Wheat (C3) with leaves used to the last 30 days, and maize (C4) that grows by thermal time."""
    rows, columns = np.indices(weather["tmax"].shape[1:])

    def sown(year: int) -> np.ndarray:
        return 153.0 + (rows + columns) % 5

    made = []
    for name, stages, acclimation in (("wheat", "days", True), ("maize", "thermal_time", False)):
        entry, faults = make_entry(
            name, name, short_crop(name, stages), sown, time_axis(weather), [2021],
            area=area, co2=co2_of(416.4), stages=stages, options=Options(acclimation=acclimation),
        )  # fmt: skip
        assert entry is not None and not faults
        made.append(entry)
    return made


Compute = Callable[..., list[xr.Dataset]]


@pytest.fixture(scope="session")
def computed(weather: xr.Dataset, entries: list[Entry]) -> Compute:
    """Compute both crops, cut up as asked."""

    def compute(
        tile: tuple[int, int] | None = None, block_days: int | None = None, threads: int = 1
    ) -> list[xr.Dataset]:
        days, rows, columns = weather["tmax"].shape
        tiles = plan_tiles(rows, columns, tile or (rows, columns))
        plan = Plan(plan_blocks(days, [], block_days or days), tiles)
        return compute_results(weather, entries, Options(), {}, plan=plan, threads=threads)[0]

    return compute


@pytest.fixture(scope="session")
def uncut(computed: Compute) -> list[xr.Dataset]:
    """Both crops on the whole map, all days at once, in one thread."""
    return computed()
