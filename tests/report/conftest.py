"""Small made-up results in the shape that `region` hands over; every number is invented."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
import pytest
import xarray as xr

from cropstress.season.measures import CAUSES, CELL_STATUS, MEASURES, SERIES, STAGES

TEN_DAY_STARTS = [
    np.datetime64(day, "ns")
    for day in ("2021-04-20", "2021-05-01", "2021-05-11", "2021-05-21", "2021-06-01", "2021-06-11")
]


def projected_axes(ny: int, nx: int, descending: bool) -> tuple[str, str, np.ndarray, np.ndarray, str]:
    """UTM zone 32 N in metres, 5 km cells."""
    y = 5_000_000.0 + 5000.0 * np.arange(ny)
    return "y", "x", y[::-1] if descending else y, 450_000.0 + 5000.0 * np.arange(nx), "EPSG:32632"


def degree_axes(ny: int, nx: int, descending: bool) -> tuple[str, str, np.ndarray, np.ndarray, str]:
    """Latitude and longitude, 0.05 degree cells."""
    y = 44.025 + 0.05 * np.arange(ny)
    return "lat", "lon", y[::-1] if descending else y, 8.025 + 0.05 * np.arange(nx), "EPSG:4326"


def heat_field(ny: int, nx: int) -> np.ndarray:
    """A hot middle and cool corners; 0 to 1."""
    y = np.linspace(-1.0, 1.0, ny) if ny > 1 else np.zeros(1)
    x = np.linspace(-1.0, 1.0, nx) if nx > 1 else np.zeros(1)
    return np.clip(
        1.15 * np.exp(-1.8 * ((y[:, None] - 0.1) ** 2 + (x[None, :] + 0.15) ** 2)) - 0.15, 0.0, 1.0
    )


def statuses(ny: int, nx: int) -> np.ndarray:
    """Sea in a corner, no crop in another, one cell each of the rest; small grids are all computed."""
    status = np.zeros((ny, nx), dtype=np.int8)
    if ny >= 5 and nx >= 5:
        rows, columns = np.mgrid[0:ny, 0:nx]
        status[rows / ny + columns / nx < 0.45] = CELL_STATUS["no_weather_data"]
        status[rows / ny + columns / nx > 1.6] = CELL_STATUS["no_crop"]
        status[ny // 2, -1] = CELL_STATUS["no_sowing_date"]
        status[ny // 2 + 1, -1] = CELL_STATUS["too_many_missing_days"]
    return status


def season_values(heat: np.ndarray) -> dict[str, np.ndarray]:
    """All measures of a season, in agreement with each other where it matters; (Y, X)."""
    parts = {"photorespiration": 3.0, "stomata": 1.5, "enzymes": 8.0 * heat - 1.0, "respiration": 1.2}
    causes = {f"lost_to_heat_by_{name}": weight * heat for name, weight in parts.items()}
    lost = sum(causes.values(), np.zeros_like(heat))
    assimilation = 80.0 - 30.0 * heat
    hot = np.floor(30.0 * heat)
    none = np.where(hot > 0, 1.0, np.nan)
    values: dict[str, np.ndarray] = dict.fromkeys(MEASURES, np.zeros_like(heat)) | causes
    share = lost / (assimilation + lost)
    leading = 1 + np.argmax(np.stack([causes[f"lost_to_heat_by_{name}"] for name in CAUSES]), axis=0)
    values |= {
        "assimilation": assimilation,
        "lost_to_heat": lost,
        "lost_to_heat_share": share,
        "leading_cause": np.where(share < 0.01, 0, leading),
        "lost_to_photorespiration": 0.3 * assimilation,
        "lost_to_photorespiration_share": np.full_like(heat, 0.3 / 1.3),
        "photorespired_co2": 0.2 * assimilation,
        "hot_days": hot,
        "hot_days_if_cooler": np.floor(0.6 * hot),
        "hot_days_if_warmer": np.ceil(1.5 * hot),
        "hot_days_flowering": np.floor(11.0 * heat),
        "hot_days_flowering_if_cooler": np.floor(7.0 * heat),
        "hot_days_flowering_if_warmer": np.floor(14.0 * heat),
        "hot_hours": 5.5 * hot,
        "degree_days_above_limit": 0.9 * hot,
        "longest_hot_spell": np.ceil(0.4 * hot),
        "longest_hot_spell_start": 150.0 * none,
        "first_hot_day": 140.0 * none,
        "last_hot_day": 166.0 * none,
        "hottest_day": np.full_like(heat, 160.0),
        "hottest_temperature": 31.0 + 10.0 * heat,
        "mean_vapour_pressure_deficit": 1.0 + heat,
        "sowing_day": np.full_like(heat, 110.0),
        "flowering_day": np.full_like(heat, 150.0),
        "maturity_day": np.full_like(heat, 171.0),
        "season_days": np.full_like(heat, 62.0),
        "growing_degree_days": 900.0 + 300.0 * heat,
    }
    return values


def make_result(
    ny: int = 12,
    nx: int = 16,
    *,
    projected: bool = False,
    descending: bool = False,
    seasons: tuple[int, ...] = (2021,),
    flowering: bool = True,
    **attributes: object,
) -> xr.Dataset:
    """Build a result as the contract of `region` describes it."""
    axes = projected_axes if projected else degree_axes
    y_name, x_name, y, x, crs = axes(ny, nx, descending)
    status = statuses(ny, nx)
    values = season_values(heat_field(ny, nx))
    dims = ("season", y_name, x_name)
    variables: dict[str, tuple[tuple[str, ...], np.ndarray]] = {}
    blank = np.where(status == 0, 1.0, np.nan)
    for name, field in values.items():
        if MEASURES[name].flowering and not flowering:
            field = np.full_like(field, np.nan)
        if name == "leading_cause":
            stored = np.where(status == 0, field, -1).astype(np.int8)
        else:
            stored = field * blank
        variables[name] = (dims, np.stack([stored] * len(seasons)))
    stage_parts = np.array([0.1, 0.3, 0.5, 0.1])
    step_parts = np.array([0.05, 0.1, 0.2, 0.25, 0.3, 0.1])
    for name in SERIES:
        whole = variables[name][1]
        for step, parts in (("stage", stage_parts), ("ten_days", step_parts)):
            split = whole[:, None] * parts[None, :, None, None]
            variables[f"{name}_by_{step}"] = (("season", step, y_name, x_name), split)
    variables["cell_status"] = ((y_name, x_name), status)
    year_shift = [np.timedelta64(365 * (season - 2021), "D") for season in seasons]
    coords: dict[str, object] = {
        "season": np.array(seasons, dtype=np.int64),
        "season_start": ("season", np.array([TEN_DAY_STARTS[0] + shift for shift in year_shift])),
        "season_end": (
            "season",
            np.array([np.datetime64("2021-06-20", "ns") + shift for shift in year_shift]),
        ),
        "stage": list(STAGES),
        "ten_days": np.arange(6),
        "ten_days_start": (
            ("season", "ten_days"),
            np.array([TEN_DAY_STARTS]) + np.array(year_shift)[:, None],
        ),
        y_name: y,
        x_name: x,
        "heat_onset": 33.0,
        "hot_day_limit": 35.0,
        "hot_leaf_limit": 38.0,
        "warm_night_limit": 20.0,
        "dry_air_limit": 2.0,
    }
    if flowering:
        coords["flowering_limit"] = 35.0
    result = xr.Dataset(variables, coords=coords).rio.write_crs(crs)
    if not projected:
        result[y_name].attrs = {"standard_name": "latitude", "units": "degrees_north"}
        result[x_name].attrs = {"standard_name": "longitude", "units": "degrees_east"}
    result.attrs = {
        "title": "Invented season",
        "crop": "maize",
        "label": "Maize",
        "profile": "maize",
        "pathway": "C4",
        "scenario": "observed",
        "co2": 421.0,
        "acclimation": "none",
        "water": "assumes enough soil water",
        "last_day_of_data": "2021-06-20",
        "credit": "invented for tests",
    } | attributes
    return result


@pytest.fixture
def result_maker() -> Callable[..., xr.Dataset]:
    """The builder of made-up results."""
    import rioxarray  # noqa: F401

    return make_result
