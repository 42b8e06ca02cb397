"""Districts: which one each cell belongs to."""

from __future__ import annotations

from collections.abc import Hashable
from dataclasses import dataclass
from pathlib import Path

import geopandas
import numpy as np
import pyogrio
import pyproj
import shapely
import xarray as xr

from cropstress.errors import Fault, InputError, nearest
from cropstress.weather.grids import Grid
from cropstress.weather.location import grid_of, wrapped
from cropstress.weather.open import find_one_file, label_of

_CENTRES_AT_ONCE = 500_000  # keeps the index of cell centres small


@dataclass(frozen=True)
class Districts:
    """Districts on the weather grid.

    Attributes
    ----------
    codes : list of str
        Code of each district, text.
    names : list of str
        Name of each; the code where there is no name field.
    index : numpy.ndarray (Y, X) of int32
        Number of the district each cell centre lies in, -1 outside all.
    shapes : geopandas.GeoDataFrame
        Their outlines in the CRS of the grid, in the same order, with `code` and `name`.
    label : str
        How messages name the file.
    remarks : list of str
        What was mended or left out.
    """

    codes: list[str]
    names: list[str]
    index: np.ndarray
    shapes: geopandas.GeoDataFrame
    label: str
    remarks: list[str]

    def with_cells(self) -> list[int]:
        """Return the numbers of the districts that have cells on the grid."""
        return [int(number) for number in np.unique(self.index) if number >= 0]


def read_districts(
    path: str,
    layer: str | None,
    id_field: str | None,
    name_field: str | None,
    dataset: xr.Dataset,
    base: str | Path | None = None,
) -> Districts:
    """Read district outlines and find the district of every cell centre.

    Parameters
    ----------
    path : str
        A file of polygons in any format and CRS GDAL reads.
    layer : str or None
        The layer; may be left out where there is only one.
    id_field, name_field : str or None
        Fields with the code and the name. The code field may be left out where there is only one field.
    dataset : xarray.Dataset
        The canonical weather.
    base : str or Path, optional
        The folder a relative name starts from.

    Returns
    -------
    Districts
        Parts with the same code are one district. A centre on a shared border belongs to the first of the
        two.

    Raises
    ------
    InputError
        Missing or unreadable file, layer or field; no CRS; not polygons; no district on the grid.
    """
    table, code_field, shown_field, label = _opened(path, layer, id_field, name_field, base)
    table, remarks = _sound(table, code_field, label)
    grid = grid_of(dataset)
    codes = [_as_text(code) for code in table[code_field]]
    names = [_as_text(name) for name in table[shown_field]] if shown_field else codes
    number = {code: place for place, code in enumerate(dict.fromkeys(codes))}
    first = dict(reversed(list(zip(codes, names, strict=True))))
    index = _index(table, np.array([number[code] for code in codes]), grid)
    if (index < 0).all():
        extent = ", ".join(f"{each:.6g}" for each in table.to_crs(grid.crs).total_bounds)
        what = (
            f"no cell of the weather grid lies in a district: the districts reach over {extent}, "
            f"the grid is {grid.words()}"
        )
        raise InputError([Fault(what, label, "Check the CRS of the districts, or name the right file.")])
    if table[code_field].dtype.kind in "iuf":
        remarks.append(
            f"{label}: the codes in '{code_field}' are numbers; if they had leading zeros, these are lost"
        )
    shapes = geopandas.GeoDataFrame({"code": codes, "name": names}, geometry=table.geometry, crs=table.crs)
    shapes = shapes.dissolve(by="code", sort=False, as_index=False).to_crs(grid.crs)
    return Districts(list(number), [first[code] for code in number], index, shapes, label, remarks)


def read_district_codes(
    path: str, layer: str | None, id_field: str | None, name_field: str | None, base: str | Path | None = None
) -> tuple[list[str], str]:
    """Read the codes of districts, where there is no weather grid to lay them on, and how messages name the file.

    Parameters and faults are those of `read_districts`.
    """
    table, code_field, _, label = _opened(path, layer, id_field, name_field, base)
    table, _ = _sound(table, code_field, label)
    return list(dict.fromkeys(_as_text(code) for code in table[code_field])), label


def _opened(
    path: str, layer: str | None, id_field: str | None, name_field: str | None, base: str | Path | None
) -> tuple[geopandas.GeoDataFrame, str, str | None, str]:
    """Return the features of a file, the fields of codes and names, and how messages name the file."""
    folder = None if base is None else Path(base)
    found, faults = find_one_file(path, folder)
    if found is None:
        raise InputError(faults)
    label = label_of(found, folder)
    table = _read(found, layer, label)
    return table, *_fields(table, id_field, name_field, label), label


def _read(path: Path, layer: str | None, label: str) -> geopandas.GeoDataFrame:
    try:
        layers = [str(name) for name, _ in pyogrio.list_layers(path)]
        if layer is not None and layer not in layers:
            alike = nearest(layer, layers)
            remedy = f"Did you mean '{alike}'?" if alike else f"The file has: {', '.join(layers)}."
            raise InputError([Fault(f"there is no layer '{layer}'", label, remedy)])
        if layer is None and len(layers) > 1:
            what = f"the file has {len(layers)} layers: {', '.join(layers)}"
            raise InputError([Fault(what, label, 'Say which: [places] layer = "...".')])
        table = geopandas.read_file(path, layer=layer or layers[0])
    except (pyogrio.errors.DataSourceError, pyogrio.errors.DataLayerError, OSError, IndexError) as error:
        reason = str(error).partition(";")[0].rstrip(".").replace(str(path), label)
        what = f"the districts cannot be read ({reason})"
        remedy = "Give polygons as GeoPackage, GeoJSON or another format GDAL reads."
        raise InputError([Fault(what, label, remedy)]) from error
    if not isinstance(table, geopandas.GeoDataFrame) or table.empty:
        raise InputError(
            [Fault("there are no polygons in it", label, "Name a file or layer with district outlines.")]
        )
    if table.crs is None:
        remedy = "It is never guessed: write the districts with their CRS, for example as GeoPackage."
        raise InputError([Fault("the districts have no coordinate reference system", label, remedy)])
    return table


def _fields(
    table: geopandas.GeoDataFrame, id_field: str | None, name_field: str | None, label: str
) -> tuple[str, str | None]:
    """Return the fields of codes and names."""
    fields = [str(each) for each in table.columns if each != table.geometry.name]
    faults = []
    for key, field in (("id_field", id_field), ("name_field", name_field)):
        if field is not None and field not in fields:
            alike = nearest(field, fields)
            remedy = f"Did you mean '{alike}'?" if alike else f"The fields are {', '.join(fields)}."
            faults.append(Fault(f"there is no field '{field}' for [places] {key}", label, remedy))
    if id_field is None:
        if len(fields) != 1:
            what = f"which field holds the code of a district? There are {', '.join(fields) or 'none'}"
            faults.append(Fault(what, label, 'Say it: [places] id_field = "...".'))
        else:
            id_field = fields[0]
    if faults or id_field is None:
        raise InputError(faults)
    return id_field, name_field


def _sound(
    table: geopandas.GeoDataFrame, code_field: str, label: str
) -> tuple[geopandas.GeoDataFrame, list[str]]:
    """Return the districts that have a code and an outline, mended, and what was done."""
    remarks = []
    nameless = table[code_field].isna() | (table[code_field].astype(str).str.strip() == "")
    shapeless = table.geometry.isna() | table.geometry.is_empty
    for lacking, words in ((nameless, "code"), (shapeless, "outline")):
        if lacking.any():
            remarks.append(f"{label}: {int(lacking.sum())} features without {words} left out")
    table = table[~(nameless | shapeless)].copy()
    kinds = set(table.geometry.geom_type)
    if not kinds or not kinds <= {"Polygon", "MultiPolygon"}:
        what = f"districts are polygons, but there are {', '.join(sorted(kinds)) or 'none'}"
        raise InputError([Fault(what, label, "Name a file or layer with district outlines.")])
    invalid = ~table.geometry.is_valid
    if invalid.any():
        codes = [_as_text(code) for code in table.loc[invalid, code_field]]
        shown = ", ".join(codes[:10]) + (" ..." if len(codes) > 10 else "")
        remarks.append(f"{label}: {len(codes)} invalid outlines mended: {shown}")
        table.loc[invalid, table.geometry.name] = table.geometry[invalid].make_valid()
    return table, remarks


def _as_text(value: Hashable) -> str:
    """Return a code or name as text; a whole number stored as a float loses its point."""
    if isinstance(value, float | np.floating) and float(value).is_integer():
        return str(int(value))
    return str(value).strip()


def _index(table: geopandas.GeoDataFrame, numbers: np.ndarray, grid: Grid) -> np.ndarray:
    """Return the number of the district of every cell centre, -1 outside; (Y, X).

    The centres are brought to the CRS of the districts, in which their borders are straight from corner to
    corner.
    """
    rows, columns = np.meshgrid(grid.rows, grid.columns, indexing="ij")
    transformer = pyproj.Transformer.from_crs(grid.crs, table.crs, always_xy=True)
    x, y = (np.asarray(each).ravel() for each in transformer.transform(columns, rows))
    if table.crs.is_geographic:
        x = wrapped(x)
    index = np.full(x.size, len(numbers), dtype=np.int64)
    outlines = table.geometry.to_numpy()
    for start in range(0, x.size, _CENTRES_AT_ONCE):
        part = slice(start, start + _CENTRES_AT_ONCE)
        tree = shapely.STRtree(shapely.points(x[part], y[part]))
        outline, centre = tree.query(outlines, predicate="intersects")
        np.minimum.at(index[part], centre, outline)
    found = np.append(numbers, -1)[index]
    return found.reshape(rows.shape).astype(np.int32)
