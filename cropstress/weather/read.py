"""From files to the canonical dataset: the order of the steps, and all faults in one list."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field, replace
from pathlib import Path
from typing import Any

import numpy as np
import xarray as xr

from cropstress.errors import Fault, InputError
from cropstress.weather.canonical import ORDER, credit, empty_dataset, variable
from cropstress.weather.damage import READING, damage_faults
from cropstress.weather.humidity import WORDS, pressure_from_elevation, vapour_pressure
from cropstress.weather.inspect import inspect
from cropstress.weather.layers import Layer, calendar_faults, make_layer, on_days, on_grid
from cropstress.weather.location import cell_latitude_longitude
from cropstress.weather.open import Names, OpenFile, find_files, find_one_file, open_files
from cropstress.weather.quantities import HUMIDITY, HUMIDITY_WAYS, QUANTITIES
from cropstress.weather.recognise import (
    Override,
    Recognised,
    looked_for,
    no_elevation,
    read_overrides,
    recognise,
)
from cropstress.weather.times import gap_words

#: What cannot be computed without each; with tmax and tmin alone the counts of hot days and nights still can.
_NEEDS_LIGHT_AND_HUMIDITY = (
    "assimilation, both losses and their causes, leaf temperatures and hot-leaf days, dry-air days and the mean "
    "vapour pressure deficit"
)


@dataclass(frozen=True)
class FoundVariable:
    """What one canonical variable was made of.

    Attributes
    ----------
    canonical : str
        Its name in the canonical dataset.
    quantity : str
        What the files hold: the same, or the kind of humidity it was computed from.
    files : tuple of str
        Labels of the files, in the order of time.
    name : str
        Its name in the files.
    reason : str
        Why it was chosen.
    unit : str
        Unit in the files, or as the run file says.
    conversion : str
        What was done to it, in words.
    sample_range : (float, float)
        Lowest and highest value on the days looked at [canonical unit of the quantity].
    calendar : str
        Calendar of the files; empty for what does not change in time.
    step : str
        Step of the files; empty for what does not change in time.
    """

    canonical: str
    quantity: str
    files: tuple[str, ...]
    name: str
    reason: str
    unit: str
    conversion: str
    sample_range: tuple[float, float]
    calendar: str
    step: str


@dataclass(frozen=True)
class Weather:
    """Daily weather, checked.

    Attributes
    ----------
    dataset : xarray.Dataset
        The canonical dataset, lazy: see `open_weather`.
    found : list of FoundVariable
        What each variable was made of.
    remarks : list of str
        What was assumed, chosen or left out.
    not_computed : list of str
        What cannot be computed from these files, and why.
    paths : tuple of Path
        The files that are used.
    """

    dataset: xr.Dataset
    found: list[FoundVariable]
    remarks: list[str]
    not_computed: list[str]
    paths: tuple[Path, ...]


@dataclass
class _Work:
    """What is known so far."""

    layers: dict[str, Layer] = field(default_factory=dict)
    faults: list[Fault] = field(default_factory=list)
    remarks: list[str] = field(default_factory=list)
    not_computed: list[str] = field(default_factory=list)
    way: tuple[str, ...] | None = None


def open_weather(files: Names, variables: Mapping[str, Any] | None = None) -> xr.Dataset:
    """Open daily weather grids as the canonical dataset.

    Parameters
    ----------
    files : str, path or iterable of them
        NetCDF files or patterns; each variable may be in any number of files, one after another in time.
    variables : mapping of str to mapping, optional
        What the files do not say: by quantity, `name`, `unit`, `cell_method`, `height`.

    Returns
    -------
    xarray.Dataset
        Lazy, on the files' own chunks, with the dimensions time, rows and columns (names, order and
        coordinates of the files) and the CRS as `spatial_ref`: `tmax`, `tmin` [degC] and, where there,
        `vapour_pressure` [kPa], `radiation` [MJ m-2 d-1], `wind` [m s-1, at 2 m], `pressure` [kPa], `rain`
        [mm d-1], all (time, Y, X), and `elevation` [m] (Y, X). Every day of the period is there; missing ones
        are NaN.

    Raises
    ------
    InputError
        With everything that is wrong with any file.
    """
    return read_weather(files, variables).dataset


def read_weather(
    files: Names,
    variables: Mapping[str, Any] | None = None,
    base: str | Path | None = None,
    elevation: Mapping[str, str] | str | None = None,
) -> Weather:
    """Open daily weather grids, with an account of what was found.

    Parameters
    ----------
    files : str, path or iterable of them
        NetCDF files or patterns.
    variables : mapping of str to mapping, optional
        By quantity: `name`, `unit`, `cell_method`, `height`.
    base : str or Path, optional
        The folder relative names start from; the current one by default.
    elevation : str or mapping, optional
        A file of elevation, or its `file` and `name`, where it is not among the files.

    Returns
    -------
    Weather

    Raises
    ------
    InputError
        With everything that is wrong with any file.
    """
    folder = None if base is None else Path(base)
    work = _Work()
    overrides, faults = read_overrides(variables)
    work.faults += faults
    paths, faults = find_files(files, folder)
    work.faults += faults
    files_missing = bool(faults)
    elevation_path = None
    if elevation is not None:
        said = {"file": elevation} if isinstance(elevation, str) else dict(elevation)
        elevation_path, faults = find_one_file(said["file"], folder)
        work.faults += faults
        paths += [elevation_path] if elevation_path is not None and elevation_path not in paths else []
        if "name" in said:
            overrides["elevation"] = replace(overrides.get("elevation", Override()), name=said["name"])
    opened, faults = open_files(paths, folder)
    work.faults += faults
    if not opened:
        raise InputError(work.faults)
    recognised = recognise(opened, overrides)
    # what may be in a file that could not be found or opened is not called missing
    work.faults += recognised.faults + ([] if files_missing or faults else recognised.missing)
    work.remarks += recognised.remarks
    work.faults += no_elevation(recognised, [file for file in opened if file.path == elevation_path])
    _make_layers(recognised, overrides, work)
    _lay_together(work)
    dataset, found = _build(work, recognised)
    if work.faults or dataset is None:
        raise InputError(_each_once(work.faults))
    used = {file.path: file for layer in work.layers.values() for file in layer.match.files}
    dataset.attrs |= credit(used.values())
    dataset.set_close(_Closing(opened))
    remarks = list(dict.fromkeys(work.remarks))
    return Weather(dataset, found, remarks, work.not_computed, tuple(used))


class _Closing:
    """Closes the files of a dataset."""

    def __init__(self, files: list[OpenFile]) -> None:
        self.files = files

    def __call__(self) -> None:
        for file in self.files:
            file.dataset.close()


def _each_once(faults: list[Fault]) -> list[Fault]:
    return list(dict.fromkeys(faults))


def _make_layers(recognised: Recognised, overrides: Mapping[str, Override], work: _Work) -> None:
    """Turn what was recognised into layers, of humidity only what the best way needs."""
    work.way = _way_to_humidity(recognised, overrides, work)
    unused = set(HUMIDITY) - set(work.way or ())
    for name, match in recognised.matches.items():
        if name in unused:
            continue
        layer, faults = make_layer(match)
        if faults and match.quantity.is_spare and name not in overrides:
            work.remarks += [f"{fault.where}: left out ({fault.what})" for fault in faults]
            continue
        work.faults += faults
        if layer is not None:
            work.layers[name] = layer
            work.remarks += layer.remarks


def _way_to_humidity(
    recognised: Recognised, overrides: Mapping[str, Override], work: _Work
) -> tuple[str, ...] | None:
    """Choose from what the vapour pressure is computed; what the run file names goes first."""
    there = [name for name in HUMIDITY if name in recognised.matches]
    named = [name for name in there if name in overrides]
    chosen = next((way for way in HUMIDITY_WAYS if set(way) <= set(named)), None)
    chosen = chosen or next((way for way in HUMIDITY_WAYS if set(way) <= set(there)), None)
    if chosen is not None:
        others = [f"'{recognised.matches[name].name}' ({name})" for name in there if name not in chosen]
        if others:
            taken = " and ".join(f"'{recognised.matches[name].name}'" for name in chosen)
            work.remarks.append(f"humidity is taken from {taken}; not used: {', '.join(others)}")
    return chosen


def _lay_together(work: _Work) -> None:
    """Bring all layers to one grid, one calendar and one run of days without gaps."""
    if not work.layers:
        return
    order = sorted(work.layers.values(), key=lambda layer: layer.days is None)
    grid = order[0].grid
    for name, layer in list(work.layers.items()):
        laid, faults = on_grid(layer, grid)
        work.faults += faults
        if laid is None:
            del work.layers[name]
            continue
        work.remarks += laid.remarks[len(layer.remarks) :]
        work.layers[name] = laid
    timed = [layer for layer in work.layers.values() if layer.days is not None]
    faults = calendar_faults(timed)
    work.faults += faults
    if timed and not faults:
        _lay_on_days(timed, work)


def _lay_on_days(timed: list[Layer], work: _Work) -> None:
    axes = {layer.quantity.name: layer.days for layer in timed if layer.days is not None}
    first, last = max(days.first for days in axes.values()), min(days.last for days in axes.values())
    if first > last:
        periods = "; ".join(f"{work.layers[name].where} {days.period()}" for name, days in axes.items())
        remedy = "Name files of the same period."
        work.faults.append(Fault(f"the variables have no day in common: {periods}", "weather.files", remedy))
        for name in axes:
            del work.layers[name]
        return
    for name, days in axes.items():
        layer = work.layers[name]
        gaps = gap_words(days)
        if gaps:
            work.remarks.append(f"{layer.where}: {gaps}; counted as missing, not filled")
        if (days.first, days.last) != (first, last):
            used = f"{days.words(first)} to {days.words(last)}"
            work.remarks.append(
                f"{layer.where}: holds {days.period()}; used is what all variables have, {used}"
            )
        work.layers[name] = on_days(layer, first, last)


def _build(work: _Work, recognised: Recognised) -> tuple[xr.Dataset | None, list[FoundVariable]]:
    """Put the layers together, look at a few days, and make the canonical dataset."""
    timed = [layer for layer in work.layers.values() if layer.days is not None]
    if not timed or calendar_faults(timed):
        return None, []
    grid, days = timed[0].grid, timed[0].days
    assert days is not None
    frame = empty_dataset(grid, days)
    latitude, _ = cell_latitude_longitude(frame)
    way = _usable_way(work)
    constant = _constant_pressure(way, work.layers)
    humidity = None if way is None else lambda sample: vapour_pressure(way, {**constant, **sample})
    try:
        inspection = inspect(work.layers, latitude, humidity, frame["time"].dt.dayofyear.values)
    except READING:
        layers = work.layers.values()
        damage = damage_faults((file, layer.match.name) for layer in layers for file in layer.match.files)
        if not damage:
            raise
        work.faults += damage
        return None, []
    work.faults += inspection.faults
    if work.faults:
        return None, []
    _note_not_computed(work, recognised)
    lazy = {name: layer.data for name, layer in work.layers.items()}
    arrays = {name: data for name, data in lazy.items() if name not in HUMIDITY}
    if way is not None:
        arrays["vapour_pressure"] = vapour_pressure(way, {**constant, **lazy})
    dataset = frame.assign({name: variable(name, array, grid) for name, array in arrays.items()})
    dataset = dataset[[name for name in ORDER if name in arrays]]
    return dataset, _found(work, inspection.ranges)


def _usable_way(work: _Work) -> tuple[str, ...] | None:
    """Return the way to the vapour pressure where all it needs is there."""
    way = work.way
    if way is None or not {*way, "tmax", "tmin"} <= set(work.layers):
        return None
    if way == ("specific_humidity",) and not {"pressure", "elevation"} & set(work.layers):
        what = "vapour pressure cannot be computed from specific humidity without air pressure or elevation"
        remedy = "Add a file of surface air pressure or of elevation (standard name surface_altitude)."
        work.faults.append(Fault(what, work.layers["specific_humidity"].where, remedy))
        return None
    return way


def _constant_pressure(way: tuple[str, ...] | None, layers: Mapping[str, Layer]) -> dict[str, np.ndarray]:
    """Return the pressure at the elevation (FAO-56 Eq. 7) where the way needs one and the files give none."""
    if way != ("specific_humidity",) or "pressure" in layers:
        return {}
    return {"pressure": pressure_from_elevation(layers["elevation"].data.compute())}


def _note_not_computed(work: _Work, recognised: Recognised) -> None:
    """Say what cannot be computed, what was looked for and what was found instead."""
    if "radiation" not in work.layers:
        looked = looked_for(QUANTITIES["radiation"])
        near = _near_words(recognised, ("radiation",))
        work.not_computed.append(f"{_NEEDS_LIGHT_AND_HUMIDITY}: no radiation was found; looked for {looked}{near}")
    if work.way is None:
        names = dict.fromkeys(name for each in HUMIDITY for name in QUANTITIES[each].standard_names)
        looked = f"the standard names {', '.join(names)}"
        near = _near_words(recognised, HUMIDITY)
        work.not_computed.append(f"{_NEEDS_LIGHT_AND_HUMIDITY}: no humidity was found; looked for {looked}{near}")


def _near_words(recognised: Recognised, names: tuple[str, ...]) -> str:
    near = dict.fromkeys(each for name in names for each in recognised.near.get(name, []))
    left_out = [name for name in names if name in recognised.left_out]
    words = f"; not taken: {', '.join(near)}" if near else ""
    return words + (f"; left out by the run file: {', '.join(left_out)}" if left_out else "")


def _found(work: _Work, ranges: Mapping[str, tuple[float, float]]) -> list[FoundVariable]:
    found = []
    for name, layer in work.layers.items():
        canonical = "vapour_pressure" if name in HUMIDITY else name
        conversion = layer.conversion
        if name in HUMIDITY and name != "vapour_pressure" and work.way is not None:
            conversion = f"{conversion}; then {WORDS[work.way]}"
        found.append(
            FoundVariable(
                canonical,
                name,
                tuple(file.label for file in layer.match.files),
                layer.match.name,
                layer.match.reason,
                layer.unit,
                conversion,
                ranges[name],
                "" if layer.days is None else layer.days.calendar,
                "" if layer.days is None else "1 day",
            )
        )
    return sorted(found, key=lambda each: ORDER.index(each.canonical))
