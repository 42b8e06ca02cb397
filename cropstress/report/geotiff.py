"""One measure of one season as a GeoTIFF: north up, with nodata, reference system and notes as tags."""

from __future__ import annotations

from collections.abc import Mapping
from pathlib import Path

import numpy as np
import rasterio
import rasterio.enums
import rasterio.errors
import xarray as xr
from rasterio.transform import Affine

from cropstress.errors import InputError, fail
from cropstress.report import notes as travelling
from cropstress.report.classes import classes_for, known_measure
from cropstress.report.grid import MapGrid, map_grid
from cropstress.report.netcdf import as_stored
from cropstress.report.phrases import number, phrase, title_of
from cropstress.report.writing import written_aside
from cropstress.season.measures import CAUSES, Measure

#: Types and nodata values that every map program reads; flags are bytes.
DTYPE = {"float32": "float32", "int16": "int16", "int8": "uint8"}
NODATA = {"float32": -9999.0, "int16": -9999, "int8": 255}

#: Side of a tile of the file [cell]; smaller maps are written in strips.
TILE = 256


def write_geotiff(
    result: xr.Dataset, measure: str, season: int, path: Path | str, notes: Mapping[str, str] | None = None
) -> None:
    """Write one measure of one season as a GeoTIFF.

    Parameters
    ----------
    result : xarray.Dataset
        A finished result.
    measure : str
        Name of the measure.
    season : int
        Year of harvest.
    path : path
        Its final name.
    notes : mapping of str, optional
        Further tags, beside the assumptions, limits, credit and caution of the result.

    Raises
    ------
    InputError
        When the grid has no place on the Earth or uneven cells, or the file cannot be written.
    """
    known = known_measure(measure)
    grid = map_grid(result)
    reference = _reference_system(grid, Path(path))
    values, transform = _north_up(result, known, season, grid)
    profile = {
        "driver": "GTiff",
        "height": grid.y.size,
        "width": grid.x.size,
        "count": 1,
        "dtype": DTYPE[known.dtype],
        "nodata": NODATA[known.dtype],
        "crs": reference,
        "transform": transform,
        "compress": "deflate",
        # The predictor of floating point is 3, of whole numbers 2
        "predictor": 3 if known.dtype == "float32" else 2,
    }
    if min(values.shape) >= TILE:
        profile |= {"tiled": True, "blockxsize": TILE, "blockysize": TILE}
    with written_aside(path) as aside, rasterio.open(aside, "w", **profile) as file:
        file.write(values, 1)
        file.update_tags(**_tags(result, known, season, grid), **(notes or {}))
        file.update_tags(1, units=known.unit, long_name=known.long_name)
        file.set_band_description(1, measure)
        if known.kind == "flag":
            file.write_colormap(1, _colour_table(measure))


def georeferenced(result: xr.Dataset) -> str | None:
    """Return why a result cannot be a GeoTIFF, or None when it can.

    Parameters
    ----------
    result : xarray.Dataset
        A finished result.
    """
    try:
        _reference_system(map_grid(result), Path())
    except InputError as error:
        return error.faults[0].what
    return None


def _reference_system(grid: MapGrid, path: Path) -> rasterio.CRS:
    remedy = "The NetCDF file in grids/ holds the same numbers."
    if grid.crs is None:
        raise fail(phrase("folder.no_crs"), path.name, remedy)
    if not grid.even:
        raise fail(phrase("folder.uneven"), path.name, remedy)
    if grid.in_degrees and not grid.geographic:
        raise fail(phrase("folder.rotated"), path.name, remedy)
    try:
        return rasterio.CRS.from_wkt(grid.crs.to_wkt())
    except rasterio.errors.CRSError as error:
        raise fail(phrase("folder.foreign_crs", name=grid.crs.name), path.name, remedy) from error


def _north_up(result: xr.Dataset, measure: Measure, season: int, grid: MapGrid) -> tuple[np.ndarray, Affine]:
    field = result[measure.name].sel(season=season).transpose(grid.y_name, grid.x_name).values
    y_step, x_step = grid.steps
    field = field[:: -1 if y_step > 0 else 1, :: -1 if x_step < 0 else 1]
    if measure.kind == "flag":
        field = np.where(field < 0, np.nan, field)
    stored = as_stored(field, DTYPE[measure.dtype], NODATA[measure.dtype])
    top, left = max(grid.y_edges[0], grid.y_edges[-1]), min(grid.x_edges[0], grid.x_edges[-1])
    return stored, Affine(abs(x_step), 0.0, left, 0.0, -abs(y_step), top)


def _tags(result: xr.Dataset, measure: Measure, season: int, grid: MapGrid) -> dict[str, str]:
    tags = travelling.notes(result) | {"measure": measure.name, "unit": measure.unit, "season": str(season)}
    tags["description"] = f"{travelling.crop_label(result)}: {title_of(measure)}"
    if measure.kind == "flag":
        tags["flag_meanings"] = ", ".join(f"{flag} {name}" for flag, name in enumerate(("none", *CAUSES)))
    if grid.size_assumed:
        tags["cell_size"] = phrase("assumptions.cell_size", value=number(abs(grid.steps[0])))
    return tags


def _colour_table(measure: str) -> dict[int, tuple[int, int, int, int]]:
    table = {}
    for flag, colour in enumerate(classes_for(measure).colours):
        red, green, blue = (int(colour[start : start + 2], 16) for start in (1, 3, 5))
        table[flag] = (red, green, blue, 255)
    return table
