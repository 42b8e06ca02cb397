"""From the totals of the kernel to the measures that people read."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any

import numpy as np
import xarray as xr

from cropstress.region.calendar import TimeAxis
from cropstress.region.compute import TileState
from cropstress.region.entry import Entry, Options
from cropstress.season import layout as at
from cropstress.season.measures import CAUSES, CELL_STATUS, LEADING_CAUSE_MISSING, MEASURES, NO_STAGE, SERIES, STAGES

NO_LEADING_CAUSE = 0.01  # share lost below which no cause is named

_ROWS = {
    "hot_days_if_cooler": at.HOT_IF_COOLER,
    "hot_days_if_warmer": at.HOT_IF_WARMER,
    "hot_days_flowering": at.FLOWERING_HOT,
    "hot_days_flowering_if_cooler": at.FLOWERING_HOT_IF_COOLER,
    "hot_days_flowering_if_warmer": at.FLOWERING_HOT_IF_WARMER,
    "hot_leaf_days": at.HOT_LEAF_DAYS,
    "hot_hours": at.HOT_HOURS,
    "degree_days_above_limit": at.DEGREE_DAYS,
    "longest_hot_spell": at.LONGEST_SPELL,
    "hottest_temperature": at.HOTTEST_TEMPERATURE,
    "warm_nights": at.WARM_NIGHTS,
    "warm_nights_flowering": at.FLOWERING_WARM_NIGHTS,
    "dry_air_days": at.DRY_AIR_DAYS,
    "season_days": at.SEASON_DAYS,
    "growing_degree_days": at.GROWING_DEGREE_DAYS,
    "mended_days": at.MENDED,
}
_DATE_ROWS = {
    "longest_hot_spell_start": at.LONGEST_SPELL_START,
    "first_hot_day": at.FIRST_HOT,
    "last_hot_day": at.LAST_HOT,
    "hottest_day": at.HOTTEST_DAY,
    "sowing_day": at.SOWING,
    "flowering_day": at.FLOWERING,
    "maturity_day": at.MATURITY,
}
_SCALARS = ("heat_onset", "hot_day_limit", "hot_leaf_limit", "warm_night_limit", "dry_air_limit")


def gather(
    entry: Entry, tiles: Sequence[TileState], cells: int, observed: np.ndarray | None = None
) -> dict[str, np.ndarray]:
    """Put the tiles of an entry together: totals, by_stage and by_ten_days on all cells, seasons first.

    `observed` tells which cells have weather data on any day; all, where it is not known.
    """
    seasons = len(entry.years)
    whole = {
        "totals": np.full((seasons, at.TOTALS, cells), np.nan),
        "by_stage": np.full((seasons, 4, at.SERIES_COUNT, cells), np.nan),
        "by_ten_days": np.full((seasons, entry.steps, at.SERIES_COUNT, cells), np.nan),
    }
    for tile in tiles:
        for name, array in whole.items():
            array[..., tile.cells] = getattr(tile, name)[0]
    return whole | {"observed": np.ones(cells, dtype=bool) if observed is None else observed}


def make_result(
    entry: Entry,
    whole: Mapping[str, np.ndarray],
    weather: xr.Dataset,
    axis: TimeAxis,
    options: Options,
    gas: bool,
    attributes: Mapping[str, Any],
) -> xr.Dataset:
    """Make the result of one crop entry: every measure by season and cell.

    Returns
    -------
    xarray.Dataset
        (season, Y, X), with stage and ten_days for the sums; NaN where nothing was computed.
    """
    totals = whole["totals"]
    row_name, column_name = (str(name) for name in weather["tmax"].dims[1:])
    shape = (weather.sizes[row_name], weather.sizes[column_name])
    status = _status(entry, totals, options, whole["observed"])
    fields = _measures(entry, totals, axis, options, gas)
    blank = status > 0
    variables: dict[str, Any] = {}
    dims = ("season", row_name, column_name)
    for name in MEASURES:
        values = fields[name]
        if name == "leading_cause":
            values = np.where(blank, LEADING_CAUSE_MISSING, values).astype(np.int8)
        else:
            values = np.where(blank, np.nan, values)
        variables[name] = (dims, values.reshape(-1, *shape))
    for name in SERIES:
        place = SERIES.index(name)
        missing = MEASURES[name].gas_exchange and not gas
        for kind, step in (("by_stage", "stage"), ("by_ten_days", "ten_days")):
            values = np.where(blank[:, None] | missing, np.nan, whole[kind][:, :, place])
            variables[f"{name}_{kind}"] = (
                ("season", step, row_name, column_name), values.reshape(len(entry.years), -1, *shape),
            )  # fmt: skip
    variables["cell_status"] = (dims, status.astype(np.int8).reshape(-1, *shape))
    stage = np.where(blank, NO_STAGE, totals[:, at.LAST_STAGE])
    variables["last_stage"] = (dims, stage.astype(np.int8).reshape(-1, *shape))
    coords = _coordinates(entry, totals, axis, weather)
    result = xr.Dataset(variables, coords=coords)
    crop = entry.profile
    growth = crop.number("growth_temperature") if crop.pathway == "C3" else None
    result.attrs = {
        "crop": entry.name,
        "label": entry.label,
        "profile": crop.name,
        "pathway": crop.pathway,
        "scenario": "observed",
        "co2": float(entry.co2[-1]) if np.unique(entry.co2).size == 1 else ", ".join(
            f"{year}: {value:g}" for year, value in zip(entry.years, entry.co2, strict=True)
        ),
        "acclimation": "to the last 30 days" if options.acclimation and growth is not None else "none",
        "water": "assumes enough soil water",
        "last_day_of_data": axis.iso(axis.length - 1),
    } | dict(attributes)  # fmt: skip
    if growth is not None and not options.acclimation:
        result.attrs["growth_temperature"] = growth
    return result


def _status(entry: Entry, totals: np.ndarray, options: Options, observed: np.ndarray) -> np.ndarray:
    """Return why cells are blank, (seasons, cells); the sea is sea, whatever a map of crops says there."""
    season_days = totals[:, at.SEASON_DAYS]
    missing = totals[:, at.MISSING]
    status = np.zeros(season_days.shape, dtype=np.int64)
    with np.errstate(invalid="ignore"):
        status[missing > options.allowed_missing * season_days] = CELL_STATUS["too_many_missing_days"]
        status[missing >= season_days] = CELL_STATUS["no_weather_data"]
    status[np.isnan(season_days)] = CELL_STATUS["no_sowing_date"]
    status[:, ~entry.grown] = CELL_STATUS["no_crop"]
    status[:, ~observed] = CELL_STATUS["no_weather_data"]
    return status


def _measures(entry: Entry, totals: np.ndarray, axis: TimeAxis, options: Options, gas: bool) -> dict[str, np.ndarray]:
    """Return every measure on all cells, (seasons, cells)."""
    fields = {name: totals[:, SERIES.index(name)] for name in SERIES}
    fields |= {name: totals[:, row] for name, row in _ROWS.items()}
    for name, row in _DATE_ROWS.items():
        fields[name] = axis.day_of_year_of(np.nan_to_num(totals[:, row], nan=-1.0))
    spell = fields["longest_hot_spell"] > 0
    fields["longest_hot_spell_start"] = np.where(spell, fields["longest_hot_spell_start"], np.nan)
    assimilation, lost = fields["assimilation"], fields["lost_to_heat"]
    photorespiration = fields["lost_to_photorespiration"]
    fields["lost_to_heat_share"] = _share(lost, assimilation, options.least_potential)
    fields["lost_to_photorespiration_share"] = _share(photorespiration, assimilation, options.least_potential)
    parts = np.stack([fields[f"lost_to_heat_by_{cause}"] for cause in CAUSES])
    with np.errstate(invalid="ignore"):
        small = ~(fields["lost_to_heat_share"] >= NO_LEADING_CAUSE)
        unknown = np.isnan(fields["lost_to_heat_share"])
        leading = 1 + np.argmax(np.nan_to_num(parts), axis=0)
        fields["leading_cause"] = np.where(unknown, LEADING_CAUSE_MISSING, np.where(small, 0, leading))
        counted = totals[:, at.COUNTED_DAYS]
        fields["mean_vapour_pressure_deficit"] = np.where(
            counted > 0, totals[:, at.DEFICIT_SUM] / np.maximum(counted, 1.0), np.nan
        )
        fields["hottest_temperature"] = np.where(counted > 0, fields["hottest_temperature"], np.nan)
        first_of_window = totals[:, at.FLOWERING] + float(entry.season["window_start"][0])
        last_day = totals[:, at.SOWING] + totals[:, at.SEASON_DAYS] - 1
        reached = (totals[:, at.FLOWERING] >= 0) & (first_of_window <= last_day)
    for name, measure in MEASURES.items():
        if measure.flowering and name != "flowering_day":
            fields[name] = np.where(reached, fields[name], np.nan)
        if measure.gas_exchange and not gas:
            fields[name] = np.full(totals.shape[::2], np.nan if name != "leading_cause" else LEADING_CAUSE_MISSING)
    return fields


def _share(lost: np.ndarray, assimilation: np.ndarray, least: float) -> np.ndarray:
    """Return lost / (assimilation + lost), blank where the potential is not positive or below the least."""
    potential = assimilation + lost
    with np.errstate(invalid="ignore", divide="ignore"):
        return np.where((potential > 0.0) & (potential >= least), lost / potential, np.nan)


def _coordinates(entry: Entry, totals: np.ndarray, axis: TimeAxis, weather: xr.Dataset) -> dict[str, Any]:
    starts, ends = [], []
    for season in range(len(entry.years)):
        sown = entry.sowing[season] >= 0
        counted = sown & entry.grown if (sown & entry.grown).any() else sown
        start = int(entry.sowing[season][counted].min())
        last = totals[season, at.SOWING] + totals[season, at.SEASON_DAYS] - 1
        known = last[np.isfinite(last)]
        starts.append(axis.values[start])
        ends.append(axis.values[int(known.max()) if known.size else start])
    steps = [
        [axis.start_of_ten_days(int(first) + step) for step in range(entry.steps)] for first in entry.first_ten_days
    ]
    coords: dict[str, Any] = {
        "season": np.array(entry.years, dtype=np.int64),
        "season_start": ("season", np.array(starts)),
        "season_end": ("season", np.array(ends)),
        "stage": list(STAGES),
        "ten_days": np.arange(entry.steps),
        "ten_days_start": (("season", "ten_days"), np.array(steps)),
    }
    for name in _SCALARS:
        coords[name] = float(entry.season[name][0])
    if entry.season["flowers"][0]:
        coords["flowering_limit"] = float(entry.season["flowering_limit"][0])
    for key, coordinate in weather.coords.items():
        if "time" not in coordinate.dims and key not in coords:
            coords[str(key)] = coordinate.variable
    return coords
