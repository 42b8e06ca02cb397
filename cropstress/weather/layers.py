"""Layers: a recognised variable as one lazy (time, row, column) array in its canonical unit."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, replace
from typing import Any

import dask.array
import numpy as np
import xarray as xr

from cropstress.errors import Fault, count_of
from cropstress.weather.grids import Grid, compare, difference, horizontal_dimensions, read_grid
from cropstress.weather.humidity import HEIGHT_OF_WIND, wind_factor
from cropstress.weather.open import OpenFile
from cropstress.weather.quantities import Quantity
from cropstress.weather.recognise import Match, cell_method
from cropstress.weather.times import (
    Days,
    joined_faults,
    read_days,
    same_calendar,
    scalar_time_name,
    time_name,
)
from cropstress.weather.units import Conversion, UnitError, conversion, to_unit

# FAO-56 Eq. 47 is for wind over short grass; Table 2.9 gives 1 to 10 m. Wider limits, chosen here.
LOWEST_WIND_HEIGHT, HIGHEST_WIND_HEIGHT = 0.5, 100.0  # m


@dataclass(frozen=True)
class Layer:
    """One quantity, lazy.

    Attributes
    ----------
    match : Match
        The variable it comes from.
    data : dask.array.Array (time, Y, X), or (Y, X) for what does not change in time
        In the canonical unit.
    days : Days or None
        Its days; None for what does not change in time.
    grid : Grid
        Its cells.
    unit : str
        Unit in the files, or as the run file says.
    conversion : str
        What is done to it, in words.
    remarks : tuple of str
        What was assumed.
    """

    match: Match
    data: Any
    days: Days | None
    grid: Grid
    unit: str
    conversion: str
    remarks: tuple[str, ...] = ()

    @property
    def quantity(self) -> Quantity:
        """What it is."""
        return self.match.quantity

    @property
    def where(self) -> str:
        """How messages name it."""
        return f"{labels_words([file.label for file in self.match.files])}: {self.match.name}"


def labels_words(labels: list[str]) -> str:
    """Return the first label and how many more there are."""
    return labels[0] + (f" and {count_of(len(labels) - 1, 'more file')}" if len(labels) > 1 else "")


def make_layer(match: Match) -> tuple[Layer | None, list[Fault]]:
    """Turn a recognised variable into a layer: orient, convert, put its files one after another in time.

    Parameters
    ----------
    match : Match
        The variable and its files.

    Returns
    -------
    Layer or None
    list of Fault
        Dimensions, units, heights, times or grids that are wrong, of all its files.
    """
    pieces: list[Layer] = []
    faults: list[Fault] = []
    for file in match.files:
        piece, piece_faults = _piece(match, file)
        faults += piece_faults
        if piece is not None:
            pieces.append(piece)
    if faults or not pieces:
        return None, faults
    if not match.quantity.is_timed:
        return _single(match, pieces)
    return _joined(match, pieces)


def _piece(match: Match, file: OpenFile) -> tuple[Layer | None, list[Fault]]:
    """Turn a variable of one file into a layer."""
    dataset, name, where = file.dataset, match.name, f"{file.label}: {match.name}"
    oriented, days, faults = _oriented(dataset, name, match.quantity, where)
    unit, found, unit_faults = _conversion(match, dataset, where)
    faults += unit_faults
    factor, words, height_faults, remarks = _to_two_metres(match, dataset, where)
    faults += height_faults
    if oriented is None:
        return None, faults
    row, column = (str(each) for each in oriented.dims[-2:])
    grid, grid_faults = read_grid(dataset, name, row, column, file.label)
    faults += grid_faults
    if faults or found is None or grid is None:
        return None, faults
    data = found.apply(oriented.data)
    if factor != 1.0:
        data = data.astype(np.float64) * factor
    said = cell_method(dataset, name) or match.override.cell_method or match.override.name
    if said is None and match.quantity.is_timed and not match.quantity.method_needed:
        kind = "sum" if found.is_sum else match.quantity.cell_methods[0]
        remarks = (*remarks, f"{where}: no cell method over time is given; taken as each day's {kind}")
    one = replace(match, files=(file,))
    return Layer(one, data, days, grid, unit, f"{found.words}{words}", (*grid.remarks, *remarks)), []


def _oriented(
    dataset: xr.Dataset, name: str, quantity: Quantity, where: str
) -> tuple[Any, Days | None, list[Fault]]:
    """Return a variable with its dimensions in the order (time, row, column), and its days."""
    variable = dataset[name]
    dimensions = tuple(str(each) for each in variable.dims)
    horizontal = horizontal_dimensions(dataset, dimensions)
    if horizontal is None:
        what = f"rows and columns cannot be told from its dimensions ({', '.join(dimensions)})"
        remedy = 'Give the coordinates of the grid axis = "Y" and axis = "X", or CF standard names and units.'
        return None, None, [Fault(what, where, remedy)]
    time = time_name(dataset, dimensions)
    along = str(dataset.variables[time].dims[0]) if time else None
    alone = scalar_time_name(dataset) if time is None and quantity.is_timed else None
    if quantity.is_timed and time is None and alone is None:
        what = f"there is no time coordinate that can be read along its dimensions ({', '.join(dimensions)})"
        return (
            None,
            None,
            [Fault(what, where, 'Give the time coordinate CF units, like "days since 2021-01-01".')],
        )
    if not quantity.is_timed and along is not None and dataset.sizes[along] > 1:
        return (
            None,
            None,
            [Fault(f"{quantity.meaning} should not change in time", where, "Keep one time step.")],
        )
    kept = [*([along] if along and quantity.is_timed else []), *horizontal]
    other = [each for each in dimensions if each not in kept]
    too_many = [each for each in other if dataset.sizes[each] > 1]
    if too_many:
        what = f"it has more dimensions than time, rows and columns: {', '.join(too_many)}"
        return (
            None,
            None,
            [Fault(what, where, "Choose one level or member and write it to a file of its own.")],
        )
    flat = variable.isel(dict.fromkeys(other, 0)).transpose(*kept)
    if not quantity.is_timed:
        return flat, None, []
    days, faults = read_days(dataset, str(time or alone), f"{where.split(':')[0]}: {time or alone}")
    return (flat if time else flat.expand_dims("time")), days, faults


def _conversion(match: Match, dataset: xr.Dataset, where: str) -> tuple[str, Conversion | None, list[Fault]]:
    """Return the unit of a variable and how to convert it."""
    quantity = match.quantity
    key = f"[weather.variables.{quantity.name}]"
    unit = match.override.unit or str(dataset[match.name].attrs.get("units", "")).strip()
    example = " or ".join(f'"{each}"' for each in quantity.usual_units)
    if not unit:
        return (
            "",
            None,
            [Fault("it has no unit", where, f"Say it in the run file: {key} unit = {example}.")],
        )
    try:
        found = conversion(unit, quantity)
    except UnitError as error:
        remedy = f"If the file is wrong, say the right unit in the run file: {key} unit = {example}."
        return unit, None, [Fault(str(error), where, remedy)]
    method = match.override.cell_method or cell_method(dataset, match.name)
    if (method == "sum" and not found.is_sum) or (method in ("mean", "point") and found.is_sum):
        kind = "a sum" if found.is_sum else "a mean or a rate"
        what = (
            f"the unit '{unit}' is that of {kind} over the day, but the cell method over time is '{method}'"
        )
        remedy = (
            f'Say which is right: {key} unit = "..." or cell_method = "{"sum" if found.is_sum else "mean"}".'
        )
        return unit, None, [Fault(what, where, remedy)]
    return unit, found, []


def _to_two_metres(
    match: Match, dataset: xr.Dataset, where: str
) -> tuple[float, str, list[Fault], tuple[str, ...]]:
    """Return the factor that brings wind to 2 m and its words; 1 for anything else."""
    if match.quantity.name != "wind":
        return 1.0, "", [], ()
    height = match.override.height if match.override.height is not None else _height(dataset, match.name)
    key = "[weather.variables.wind]"
    if height is None:
        remedy = (
            f"Say it in the run file: {key} height = 10.0 (metres above the ground; 10 is usual), or leave "
            f'the wind out with {key} name = "none".'
        )
        return 1.0, "", [Fault("the height of the wind above the ground is not given", where, remedy)], ()
    if not LOWEST_WIND_HEIGHT <= height <= HIGHEST_WIND_HEIGHT:
        what = f"wind at {height:g} m cannot be brought to 2 m"
        limits = f"{LOWEST_WIND_HEIGHT:g} to {HIGHEST_WIND_HEIGHT:g} m"
        remedy = f"FAO-56 Eq. 47 is used from {limits}: name another wind."
        return 1.0, "", [Fault(what, where, remedy)], ()
    factor = wind_factor(height)
    words = "" if height == HEIGHT_OF_WIND else f", from {height:g} m to 2 m × {factor:.4g} (FAO-56 Eq. 47)"
    return factor, words, [], ()


def _height(dataset: xr.Dataset, name: str) -> float | None:
    """Return the height above the ground that a variable's scalar coordinate tells [m]."""
    for coordinate in dataset[name].coords.values():
        if coordinate.size == 1 and coordinate.attrs.get("standard_name") == "height":
            try:
                found = to_unit(str(coordinate.attrs.get("units", "")), "m")
            except UnitError:
                return None
            return float(found.apply(np.asarray(coordinate.values, dtype=np.float64)).reshape(-1)[0])
    return None


def _single(match: Match, pieces: list[Layer]) -> tuple[Layer | None, list[Fault]]:
    if len(pieces) > 1:
        labels = " and ".join(file.label for file in match.files)
        remedy = "Take one of the files out of [weather] files."
        what = f"'{match.name}', {match.quantity.meaning}, is in {labels}"
        return None, [Fault(what, f"weather.files: {match.quantity.name}", remedy)]
    return pieces[0], []


def _joined(match: Match, pieces: list[Layer]) -> tuple[Layer | None, list[Fault]]:
    """Put the pieces of several files one after another in time."""
    pieces = sorted(pieces, key=lambda piece: piece.days.first if piece.days else 0)
    first = pieces[0]
    laid: list[Layer] = []
    faults: list[Fault] = []
    for piece in pieces:
        other, other_faults = on_grid(piece, first.grid)
        faults += other_faults
        laid += [other] if other is not None else []
    faults += calendar_faults(pieces)
    if faults:
        return None, faults
    axes = list(_axes(pieces))
    days = Days(np.concatenate([axis.numbers for axis in axes]), axes[0].calendar)
    labels = [piece.match.files[0].label for piece in pieces]
    # the variables of the same files share their times: one fault, not one for each
    faults = joined_faults(days, labels, [len(axis.numbers) for axis in axes], f"{labels_words(labels)}: time")
    if faults:
        return None, faults
    if len(laid) == 1:
        return laid[0], []
    data = dask.array.concatenate([piece.data for piece in laid], axis=0)
    units, words = (
        " / ".join(dict.fromkeys(getattr(each, key) for each in laid)) for key in ("unit", "conversion")
    )
    ordered = replace(match, files=tuple(piece.match.files[0] for piece in pieces))
    return Layer(ordered, data, days, first.grid, units, words, _shared_remarks(laid)), []


def _axes(layers: list[Layer]) -> Iterator[Days]:
    return (layer.days for layer in layers if layer.days is not None)


def _shared_remarks(pieces: list[Layer]) -> tuple[str, ...]:
    """Return each remark once, also where it was made for several files."""
    seen: dict[str, str] = {}
    for piece in pieces:
        for remark in piece.remarks:
            seen.setdefault(remark.partition(": ")[2] or remark, remark)
    return tuple(seen.values())


def calendar_faults(layers: list[Layer]) -> list[Fault]:
    """Return a fault for each layer whose calendar is not that of the first, naming both files."""
    timed = [layer for layer in layers if layer.days is not None]
    faults = []
    for layer in timed[1:]:
        one, other = (each.days.calendar for each in (timed[0], layer) if each.days is not None)
        if not same_calendar(one, other):
            what = f"the calendar is '{other}', but that of {timed[0].where} is '{one}'"
            faults.append(
                Fault(what, layer.where, "Bring all files to one calendar; days are not moved here.")
            )
    return faults


def on_grid(layer: Layer, grid: Grid) -> tuple[Layer | None, list[Fault]]:
    """Lay a layer on another grid, which must have the same cells; rows or columns may run the other way."""
    slices = compare(grid, layer.grid)
    if slices is None:
        return None, [difference(grid, layer.grid, layer.where)]
    rows, columns = slices
    if slices == (slice(None), slice(None)):
        return replace(layer, grid=grid), []
    turned = " and ".join(
        name for name, each in ((grid.row, rows), (grid.column, columns)) if each != slice(None)
    )
    remark = f"{layer.where}: {turned} in the opposite order of {grid.label}; turned round"
    data = layer.data[..., rows, columns]
    return replace(layer, data=data, grid=grid, remarks=(*layer.remarks, remark)), []


def on_days(layer: Layer, first: int, last: int) -> Layer:
    """Cut or stretch a layer to all days from a first to a last one; missing days become NaN.

    The chunks stay those of the files: a gap inside a chunk is filled in the chunk.

    Parameters
    ----------
    layer : Layer
        One with days that rise.
    first, last : int
        Days since 1970-01-01, both included [d].

    Returns
    -------
    Layer
    """
    assert layer.days is not None
    numbers = layer.days.numbers
    begin, end = int(np.searchsorted(numbers, first)), int(np.searchsorted(numbers, last, side="right"))
    data, kept = layer.data[begin:end], numbers[begin:end]
    if len(kept) != last - first + 1:
        data = _spread(data, kept - first, last - first + 1)
    return replace(layer, data=data, days=Days(np.arange(first, last + 1), layer.days.calendar))


def _spread(data: Any, rows: np.ndarray, length: int) -> Any:
    """Spread the time steps of a dask array over a longer axis, NaN between them, chunk by chunk."""
    ends = np.cumsum(data.chunks[0])
    starts = ends - data.chunks[0]
    # each chunk reaches to the first row of the next one; the first starts at 0 and the last ends at the end
    borders = [0, *(int(rows[start]) for start in starts[1:]), length]
    blocks = []
    for number, (start, end) in enumerate(zip(starts, ends, strict=True)):
        low, high = borders[number], borders[number + 1]
        block = data.blocks[number]
        sizes = ((high - low,), *block.chunks[1:])
        where = rows[start:end] - low
        kind = np.result_type(block.dtype, np.float32)
        blocks.append(block.map_blocks(_fill, where, high - low, kind, dtype=kind, chunks=sizes))
    return dask.array.concatenate(blocks, axis=0)


def _fill(block: np.ndarray, rows: np.ndarray, length: int, kind: np.dtype) -> np.ndarray:
    filled = np.full((length, *block.shape[1:]), np.nan, dtype=kind)
    filled[rows] = block
    return filled
