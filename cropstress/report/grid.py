"""The grid of a result: its axes, cell edges, coordinate reference system and true lengths."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np
import pyproj
import xarray as xr

#: Cell size taken for a result of one single cell, which nothing tells: [degree] and [m].
ASSUMED_DEGREES = 0.1
ASSUMED_METRES = 1000.0

#: Largest departure of a coordinate from even spacing, as a share of the spacing.
EVEN_WITHIN = 0.05

#: North counts as up when no meridian leans more than this [degree].
NORTH_UP_WITHIN = 1.5

_Y_NAMES = {"latitude", "grid_latitude", "projection_y_coordinate"}
_X_NAMES = {"longitude", "grid_longitude", "projection_x_coordinate"}


@dataclass(frozen=True)
class MapGrid:
    """The axes of a map, as found in the files.

    Attributes
    ----------
    y_name, x_name : str
        Names of the two space dimensions.
    y, x : numpy.ndarray (Y,), (X,)
        Cell centres [unit of the coordinate reference system], in the order of the files.
    crs : pyproj.CRS or None
        None when the files say none and the axes are not in degrees.
    """

    y_name: str
    x_name: str
    y: np.ndarray
    x: np.ndarray
    crs: pyproj.CRS | None

    @property
    def geographic(self) -> bool:
        """Whether the axes are degrees of latitude and longitude."""
        return self.crs is not None and self.crs.is_geographic and not self.crs.is_derived

    @property
    def size_assumed(self) -> bool:
        """Whether the size of the cell is not known, because there is only one."""
        return self.y.size == 1 and self.x.size == 1

    @property
    def even(self) -> bool:
        """Whether the cells are evenly spaced along both axes."""
        return _even(self.y) and _even(self.x)

    @cached_property
    def steps(self) -> tuple[float, float]:
        """Cell size along Y and X, with its sign [unit of the axes]."""
        y_step, x_step = _mean_step(self.y), _mean_step(self.x)
        if y_step is None and x_step is None:
            assumed = ASSUMED_DEGREES if self.in_degrees else ASSUMED_METRES / self.metres_in_unit
            return assumed, assumed
        return (abs(x_step or 1.0) if y_step is None else y_step), (
            abs(y_step or 1.0) if x_step is None else x_step
        )

    @property
    def in_degrees(self) -> bool:
        """Whether the axes are in degrees, of the Earth's own or of a rotated pole."""
        return self.crs is not None and self.crs.is_geographic

    @property
    def metres_in_unit(self) -> float:
        """Metres in the linear unit of a projected system [m]; 1 where there is none."""
        if self.crs is None or self.in_degrees or not self.crs.axis_info:
            return 1.0
        return float(self.crs.axis_info[0].unit_conversion_factor)

    @property
    def y_edges(self) -> np.ndarray:
        """Edges of the cells along Y; (Y + 1,)."""
        edges = _edges(self.y, self.steps[0])
        return np.clip(edges, -90.0, 90.0) if self.geographic else edges

    @property
    def x_edges(self) -> np.ndarray:
        """Edges of the cells along X; (X + 1,)."""
        return _edges(self.x, self.steps[1])

    @property
    def centre(self) -> tuple[float, float]:
        """Middle of the map along Y and X [unit of the axes]."""
        y_edges, x_edges = self.y_edges, self.x_edges
        return 0.5 * float(y_edges[0] + y_edges[-1]), 0.5 * float(x_edges[0] + x_edges[-1])

    def latitude_longitude(self, y: float, x: float) -> tuple[float, float]:
        """Return latitude and longitude of a point of the map [degree]."""
        if self.crs is None:
            raise ValueError("a map without a coordinate reference system has no latitude")
        if self.geographic:
            return y, (x + 180.0) % 360.0 - 180.0
        longitude, latitude = self._to_degrees.transform(x, y)
        return float(latitude), float(longitude)

    @cached_property
    def _to_degrees(self) -> pyproj.Transformer:
        assert self.crs is not None
        # The geodetic system of a rotated pole is itself; the Earth's own is the one it comes from
        earth = (
            self.crs.source_crs if self.crs.is_geographic and self.crs.is_derived else self.crs.geodetic_crs
        )
        return pyproj.Transformer.from_crs(self.crs, earth, always_xy=True)

    def _bearing_and_length(self, y: float, x: float, y_step: float, x_step: float) -> tuple[float, float]:
        """Bearing [degree from north] and true length [m] of a short step from a point of the map."""
        assert self.crs is not None
        geod = self.crs.get_geod() or pyproj.Geod(ellps="WGS84")
        latitude, longitude = self.latitude_longitude(y, x)
        end_latitude, end_longitude = self.latitude_longitude(y + y_step, x + x_step)
        bearing, _, length = geod.inv(longitude, latitude, end_longitude, end_latitude)
        return float(bearing), float(length)

    def metres_per_unit_across(self, y: float | None = None) -> float | None:
        """Return the true length of one unit of X at a height of the map (its middle by default) [m].

        None where the coordinate reference system is not known. Measured along the ellipsoid, so it holds
        for degrees, for projected metres or kilometres and for projections that stretch.
        """
        if self.crs is None:
            return None
        middle, x = self.centre
        step = 0.1 * abs(self.steps[1])
        length = self._bearing_and_length(middle if y is None else y, x, 0.0, step)[1] / step
        return length if np.isfinite(length) and length > 0.0 else None

    @cached_property
    def north_is_up(self) -> bool:
        """Whether north is up all over the map."""
        if self.crs is None:
            return False
        if self.geographic:
            return True
        y_edges, x_edges = self.y_edges, self.x_edges
        step = 0.1 * abs(self.steps[0])
        for y in (y_edges[0], self.centre[0], y_edges[-1]):
            for x in (x_edges[0], self.centre[1], x_edges[-1]):
                bearing, length = self._bearing_and_length(float(y), float(x), step, 0.0)
                if not (np.isfinite(length) and abs(bearing) <= NORTH_UP_WITHIN):
                    return False
        return True


def _mean_step(centres: np.ndarray) -> float | None:
    return float(centres[-1] - centres[0]) / (centres.size - 1) if centres.size > 1 else None


def _even(centres: np.ndarray) -> bool:
    step = _mean_step(centres)
    if step is None:
        return True
    expected = centres[0] + step * np.arange(centres.size)
    return step != 0.0 and bool(np.all(np.abs(centres - expected) <= EVEN_WITHIN * abs(step)))


def _edges(centres: np.ndarray, step: float) -> np.ndarray:
    if centres.size == 1 or _even(centres):
        first = centres[0] - 0.5 * step
        return first + step * np.arange(centres.size + 1)
    between = 0.5 * (centres[:-1] + centres[1:])
    first, last = 2.0 * centres[0] - between[0], 2.0 * centres[-1] - between[-1]
    return np.concatenate([[first], between, [last]])


def _is_axis(coordinate: xr.DataArray, letter: str, standard_names: set[str]) -> bool:
    attributes = coordinate.attrs
    return attributes.get("axis") == letter or attributes.get("standard_name") in standard_names


def space_dimensions(result: xr.Dataset) -> tuple[str, str]:
    """Return the names of the Y and the X dimension of a result."""
    one = result["cell_status"] if "cell_status" in result else next(iter(result.data_vars.values()))
    candidates = [str(dim) for dim in one.dims if dim not in ("season", "stage", "ten_days")]
    first, second = candidates[-2:]
    if _is_axis(result[first], "X", _X_NAMES) or _is_axis(result[second], "Y", _Y_NAMES):
        return second, first
    return first, second


def grid_mapping_name(result: xr.Dataset) -> str | None:
    """Return the name of the variable that holds the coordinate reference system, or None."""
    for name, variable in result.variables.items():
        if {"crs_wkt", "spatial_ref", "grid_mapping_name"} & set(variable.attrs):
            return str(name)
    return None


def _crs(result: xr.Dataset, y_name: str, x_name: str) -> pyproj.CRS | None:
    mapping = grid_mapping_name(result)
    if mapping is not None:
        attributes = result[mapping].attrs
        text = attributes.get("crs_wkt") or attributes.get("spatial_ref")
        return pyproj.CRS.from_wkt(text) if text else pyproj.CRS.from_cf(attributes)
    units = str(result[y_name].attrs.get("units", "")), str(result[x_name].attrs.get("units", ""))
    if units[0].lower().startswith("degree") and units[1].lower().startswith("degree"):
        return pyproj.CRS.from_epsg(4326)
    return None


def map_grid(result: xr.Dataset) -> MapGrid:
    """Read the grid of a result.

    Parameters
    ----------
    result : xarray.Dataset
        A finished result, or any of its parts that keeps both space dimensions.

    Returns
    -------
    MapGrid
        Without a grid mapping, axes in degrees are taken as WGS 84, as `weather` does.
    """
    y_name, x_name = space_dimensions(result)
    y = np.asarray(result[y_name].values, dtype=np.float64)
    x = np.asarray(result[x_name].values, dtype=np.float64)
    return MapGrid(y_name, x_name, y, x, _crs(result, y_name, x_name))
