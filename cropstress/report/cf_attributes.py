"""The attributes of the NetCDF files, as CF-1.11 wants them."""

from __future__ import annotations

from collections.abc import Iterator
from typing import Any

import numpy as np
import xarray as xr

import cropstress.report.notes as travelling
from cropstress.report.grid import MapGrid
from cropstress.report.phrases import phrase
from cropstress.report.version import package_version
from cropstress.season.measures import CAUSES, MEASURES, Measure

CONVENTIONS = "CF-1.11"

ON_SCALE = "temperature: on_scale"
DIFFERENCE = "temperature: difference"

#: What each limit of a result is: standard name, unit, words.
_LIMITS: dict[str, tuple[str | None, str, str]] = {
    "heat_onset": ("air_temperature", "degC", "air temperature above which uptake counts as lost to heat"),
    "hot_day_limit": ("air_temperature", "degC", "limit of a hot day"),
    "flowering_limit": ("air_temperature", "degC", "limit of a hot day at flowering"),
    "warm_night_limit": ("air_temperature", "degC", "limit of a warm night"),
    "hot_leaf_limit": (None, "degC", "limit of a hot leaf"),
    "dry_air_limit": ("water_vapor_saturation_deficit_in_air", "kPa", "limit of a day of dry air"),
}

#: Thresholds that follow from a limit: air 1 K cooler against the limit is the air against limit + 1 K.
_DERIVED: dict[str, tuple[str, float, str]] = {
    "hot_day_limit_if_cooler": ("hot_day_limit", 1.0, "air_temperature"),
    "hot_day_limit_if_warmer": ("hot_day_limit", -1.0, "air_temperature"),
    "flowering_limit_if_cooler": ("flowering_limit", 1.0, "air_temperature"),
    "flowering_limit_if_warmer": ("flowering_limit", -1.0, "air_temperature"),
    "degree_day_threshold": ("hot_day_limit", 0.0, "air_temperature_threshold"),
}


def measure_attributes(measure: Measure, words: str, threshold_known: bool) -> dict[str, Any]:
    """Return the CF attributes of a measure.

    Parameters
    ----------
    measure : Measure
    words : str
        Its long name.
    threshold_known : bool
        Whether the file holds its threshold: a standard name that demands one must not stand without.
    """
    attributes: dict[str, Any] = {"long_name": words, "units": measure.unit}
    if measure.standard_name and (measure.threshold is None or threshold_known):
        attributes["standard_name"] = measure.standard_name
    if measure.cell_methods:
        attributes["cell_methods"] = measure.cell_methods
    if measure.unit == "degC":
        attributes["units_metadata"] = ON_SCALE
    if measure.unit == "K d":
        attributes["units_metadata"] = DIFFERENCE
    if measure.kind == "flag":
        attributes["flag_values"] = np.arange(len(CAUSES) + 1, dtype=np.int8)
        attributes["flag_meanings"] = " ".join(("none", *CAUSES))
        del attributes["units"]
    comment = _comment(measure)
    if comment:
        attributes["comment"] = comment
    return attributes


def label_of(measure: Measure) -> str | None:
    """Return the scalar coordinate of a measure: its threshold, or the onset for losses to heat."""
    if measure.threshold is None and (measure.name.startswith("lost_to_heat") or measure.kind == "flag"):
        return "heat_onset"
    return measure.threshold


def thresholds(result: xr.Dataset) -> dict[str, tuple[float, dict[str, Any]]]:
    """Return the limits of a result as scalar coordinates: name, value and attributes."""
    found: dict[str, tuple[float, dict[str, Any]]] = {}
    for name, (standard_name, unit, words) in _LIMITS.items():
        value = travelling.limit(result, name)
        if value is not None:
            found[name] = (value, _limit_attributes(standard_name, unit, words))
    for name, (base, difference, standard_name) in _DERIVED.items():
        if base in found:
            words = f"{_LIMITS[base][2]}, {difference:+.0f} K" if difference else _LIMITS[base][2]
            found[name] = (found[base][0] + difference, _limit_attributes(standard_name, "degC", words))
    return found


def _limit_attributes(standard_name: str | None, unit: str, words: str) -> dict[str, Any]:
    attributes: dict[str, Any] = {"long_name": words, "units": unit}
    if standard_name:
        attributes["standard_name"] = standard_name
    if unit == "degC":
        attributes["units_metadata"] = ON_SCALE
    return attributes


def measures_in(result: xr.Dataset) -> Iterator[tuple[str, Measure, str]]:
    """Yield each variable that holds a measure, with the measure and the variable's long name."""
    for name, measure in MEASURES.items():
        if name in result:
            yield name, measure, measure.long_name
        for ending, words in (("by_stage", "by growth stage"), ("by_ten_days", "by ten days")):
            if f"{name}_{ending}" in result:
                yield f"{name}_{ending}", measure, f"{measure.long_name}, {words}"


def _comment(measure: Measure) -> str | None:
    if measure.name.startswith("lost_to_photorespiration"):
        return phrase("files.never_added")
    if measure.kind == "day_of_year":
        return phrase("files.day_of_year")
    if measure.name == "mean_vapour_pressure_deficit":
        return phrase("files.daytime")
    if measure.threshold and measure.kind == "count":
        return phrase("files.counted_above")
    return None


def axis_attributes(grid: MapGrid, letter: str) -> dict[str, Any]:
    """Return the CF attributes of the axis Y or X of a grid."""
    if grid.in_degrees and not grid.geographic:
        name = "grid_latitude" if letter == "Y" else "grid_longitude"
        return {"standard_name": name, "units": "degrees"}
    if grid.geographic:
        name, unit = ("latitude", "degrees_north") if letter == "Y" else ("longitude", "degrees_east")
        return {"standard_name": name, "units": unit}
    if grid.crs is None:
        return {"long_name": phrase("words.rows") if letter == "Y" else phrase("words.columns")}
    unit = {1.0: "m", 1000.0: "km"}.get(grid.metres_in_unit, f"{grid.metres_in_unit} m")
    return {"standard_name": f"projection_{letter.lower()}_coordinate", "units": unit}


def place_attributes(name: str) -> dict[str, Any]:
    """Return the CF attributes of a coordinate of places by its name; none where it is neither."""
    if name.lower().startswith("lat"):
        return {"standard_name": "latitude", "units": "degrees_north"}
    if name.lower().startswith("lon"):
        return {"standard_name": "longitude", "units": "degrees_east"}
    return {}


def global_attributes(result: xr.Dataset, history: str) -> dict[str, Any]:
    """Return the CF attributes of the whole file."""
    version = package_version()
    found: dict[str, Any] = {
        "Conventions": CONVENTIONS,
        "title": str(result.attrs.get("title") or travelling.crop_label(result)),
        "institution": str(result.attrs.get("institution") or phrase("files.institution")),
        "source": phrase("files.source", version=version),
        "history": history,
        "references": phrase("files.references"),
        "comment": travelling.caution(result),
    }
    return found | {name: text for name, text in travelling.notes(result).items() if name != "title"}


def plain(attributes: Any) -> dict[str, Any]:
    """Attributes a NetCDF file can hold, without those that belong to an encoding."""
    encoding = {
        "_FillValue",
        "missing_value",
        "scale_factor",
        "add_offset",
        "grid_mapping",
        "coordinates",
        "dtype",
    }
    found: dict[str, Any] = {}
    for name, value in attributes.items():
        if name in encoding or value is None:
            continue
        numeric = isinstance(value, int | float | np.number | np.ndarray | list | tuple)
        found[str(name)] = value if numeric and not isinstance(value, bool) else str(value)
    return found
