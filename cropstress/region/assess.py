"""A season's losses over a map, as a lazy dataset."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from typing import Any

import dask
import dask.array
import numpy as np
import xarray as xr

from cropstress.crops import CropProfile, load_crop
from cropstress.errors import InputError
from cropstress.places import read_sowing
from cropstress.region.calendar import TimeAxis, time_axis
from cropstress.region.compute import Computed, compute, has_gas_exchange
from cropstress.region.entry import Entry, Options, co2_of, make_entry
from cropstress.region.plan import Plan, plan_blocks, plan_tiles
from cropstress.region.results import gather, make_result


def make_plan(weather: xr.Dataset, tile: tuple[int, int] | None = None, block_days: int | None = None) -> Plan:
    """Plan the blocks and tiles of a canonical weather dataset."""
    chunks = [variable.chunks[0] for variable in weather.data_vars.values() if variable.chunks and variable.ndim == 3]
    rows, columns = weather["tmax"].shape[1:]
    return Plan(plan_blocks(weather.sizes["time"], chunks, block_days), plan_tiles(rows, columns, tile))


def compute_results(
    weather: xr.Dataset,
    entries: Sequence[Entry],
    options: Options,
    attributes: Mapping[str, Any],
    *,
    plan: Plan | None = None,
    threads: int | None = None,
    progress: Callable[[float], None] | None = None,
) -> tuple[list[xr.Dataset], Computed]:
    """Compute the results of several crop entries in one pass over the weather."""
    axis = time_axis(weather)
    computed = compute(weather, entries, plan or make_plan(weather), axis, threads=threads, progress=progress)
    cells = int(np.prod(weather["tmax"].shape[1:]))
    gas = has_gas_exchange(weather)
    results = [
        make_result(
            entry,
            gather(entry, computed.tiles[entry.name], cells, computed.observed),
            weather,
            axis,
            options,
            gas,
            attributes,
        )
        for entry in entries
    ]
    return results, computed


def assess(
    weather: xr.Dataset,
    crop: CropProfile | str,
    sowing: str | Mapping[str, str],
    co2: float | Mapping[int, float] = 421.0,
    *,
    years: Sequence[int] | None = None,
    area: np.ndarray | None = None,
    stages: str = "days",
    options: Options | None = None,
    tile: tuple[int, int] | None = None,
    block_days: int | None = None,
    threads: int | None = None,
) -> xr.Dataset:
    """Assess what heat and photorespiration cost a crop on every cell.

    Parameters
    ----------
    weather : xarray.Dataset
        Canonical daily weather, as `open_weather` gives it.
    crop : CropProfile or str
        A profile or the name of one.
    sowing : str or mapping
        "25 April", "04-25", a grid or a table by district, as in a run file.
    co2 : float or mapping of int to float
        [umol mol-1], one number or one for each year of harvest.
    years : sequence of int, optional
        Years of harvest; by default all whose sowing lies within the data.
    area : numpy.ndarray (Y, X), optional
        Crop area; cells with none are not computed.
    stages : str
        "days" or "thermal_time".
    options : Options, optional
        Canopy, acclimation, least potential, allowed missing days.
    tile : tuple of int, optional
        Rows and columns of a tile. Results do not depend on it.
    block_days : int, optional
        Days of a block. Results do not depend on it.
    threads : int, optional

    Returns
    -------
    xarray.Dataset
        Lazy: asking for its values runs the season once for all measures.

    Raises
    ------
    InputError
        When no season lies within the data, a name is unknown, or faults in the data are systematic.
    """
    options = options or Options()
    profile = load_crop(crop) if isinstance(crop, str) else crop
    axis = time_axis(weather)
    sown = read_sowing(sowing, weather)
    entry, faults = make_entry(
        profile.name, profile.label, profile, sown.dates, axis, years,
        area=area, co2=co2_of(co2), stages=stages, options=options,
    )  # fmt: skip
    if entry is None:
        raise InputError(faults)
    plan = make_plan(weather, tile, block_days)
    outline = _outline(entry, weather, axis, options)

    def run() -> dict[str, np.ndarray]:
        results, _ = compute_results(weather, [entry], options, {}, plan=plan, threads=threads)
        found = {str(name): results[0][name].values for name in results[0].data_vars}
        found["season_end"] = results[0]["season_end"].values
        return found

    whole = dask.delayed(run, pure=False)()

    def later(name: str) -> dask.array.Array:
        return dask.array.from_delayed(whole[name], shape=outline[name].shape, dtype=outline[name].dtype)

    lazy = {str(name): outline[name].copy(data=later(str(name))) for name in outline.data_vars}
    return outline.assign(lazy).assign_coords(season_end=("season", later("season_end")))


def _outline(entry: Entry, weather: xr.Dataset, axis: TimeAxis, options: Options) -> xr.Dataset:
    """Return the result of a run in which no day was counted: its names, shapes and coordinates."""
    cells = int(np.prod(weather["tmax"].shape[1:]))
    return make_result(entry, gather(entry, [], cells), weather, axis, options, has_gas_exchange(weather), {})
