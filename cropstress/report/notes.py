"""The notes that travel with every map and every file: assumptions, last day of data, credit, caution."""

from __future__ import annotations

from typing import Any

import numpy as np
import xarray as xr

from cropstress.report.phrases import number, phrase, printed_date

#: Scalar coordinates of a result that hold the crop's limits.
LIMIT_COORDINATES = (
    "heat_onset",
    "hot_day_limit",
    "flowering_limit",
    "hot_leaf_limit",
    "warm_night_limit",
    "dry_air_limit",
)

#: Attributes of a result that travel with its files.
TEXT_ATTRIBUTES = (
    "title",
    "crop",
    "label",
    "profile",
    "pathway",
    "scenario",
    "co2",
    "acclimation",
    "growth_temperature",
    "water",
    "last_day_of_data",
    "credit",
    "not_computed",
)


def limit(result: xr.Dataset, name: str) -> float | None:
    """Return a limit of the crop, or None where the crop has none."""
    if name not in result.coords or result[name].ndim:
        return None
    value = float(result[name].values)
    return value if np.isfinite(value) else None


def attribute(result: xr.Dataset, name: str) -> Any:
    """Return an attribute of the result; None where it is missing, empty or not a number."""
    value = result.attrs.get(name)
    if value is None or (isinstance(value, float) and not np.isfinite(value)) or np.size(value) == 0:
        return None
    return value if str(value).strip() else None


def as_text(value: Any) -> str:
    """Return an attribute as text: lists joined, numbers as people write them."""
    if isinstance(value, bool | np.bool_):
        return phrase("words.yes") if value else phrase("words.no")
    if isinstance(value, int | float | np.number):
        return number(float(value), 4)
    if isinstance(value, dict):
        return ", ".join(f"{key}: {as_text(part)}" for key, part in value.items())
    if isinstance(value, list | tuple | np.ndarray):
        return "; ".join(as_text(part) for part in value)
    return str(value)


def crop_label(result: xr.Dataset) -> str:
    """Return how the crop entry is called in print."""
    return str(attribute(result, "label") or attribute(result, "crop") or "")


def scenario_words(result: xr.Dataset) -> str:
    """Return the scenario in words."""
    scenario = str(attribute(result, "scenario") or "observed")
    if scenario == "observed":
        return phrase("words.scenario_observed")
    return phrase("words.scenario", scenario=scenario)


def caution(result: xr.Dataset) -> str:
    """Return the caution line in full."""
    return str(attribute(result, "caution") or phrase("caution.full"))


def carbon_dioxide(result: xr.Dataset) -> str | None:
    """Return the carbon dioxide of the air, in words."""
    value = attribute(result, "co2")
    if value is None:
        return None
    key = "assumptions.co2" if isinstance(value, int | float | np.number) else "assumptions.co2_text"
    return phrase(key, value=as_text(value))


def assumptions(result: xr.Dataset, more_limits: tuple[str, ...] = ()) -> str:
    """Return the assumptions in one line.

    Parameters
    ----------
    result : xarray.Dataset
        A finished result.
    more_limits : tuple of str
        Limits to name beside the hot-day limit, the limit at flowering and the onset.
    """
    parts: list[str] = []
    for name in ("hot_day_limit", "flowering_limit", *more_limits, "heat_onset"):
        value = limit(result, name)
        if value is not None:
            parts.append(phrase(f"assumptions.{name}", value=number(value)))
    parts.append(carbon_dioxide(result) or "")
    for name in ("acclimation", "growth_temperature"):
        value = attribute(result, name)
        if value is not None:
            parts.append(phrase(f"assumptions.{name}", value=as_text(value)))
    water = attribute(result, "water")
    parts.append(as_text(water) if water else phrase("assumptions.water_default"))
    last_day = attribute(result, "last_day_of_data")
    if last_day is not None:
        parts.append(phrase("assumptions.last_day_of_data", value=_printed(last_day)))
    line = "; ".join(part for part in parts if part)
    return line[:1].upper() + line[1:] + "."


def _printed(day: Any) -> str:
    """A day as printed; texts other than ISO dates are kept as they are."""
    if not isinstance(day, str):
        return printed_date(day)
    try:
        return printed_date(np.datetime64(day[:10], "D"))
    except ValueError:
        return day


def notes(result: xr.Dataset) -> dict[str, str]:
    """Return everything a file must say when it travels alone, by name.

    Parameters
    ----------
    result : xarray.Dataset
        A finished result.

    Returns
    -------
    dict of str
        Attributes, limits with their unit, the assumptions in one line and the caution line.
    """
    found = {
        name: as_text(attribute(result, name))
        for name in TEXT_ATTRIBUTES
        if attribute(result, name) is not None
    }
    for name in LIMIT_COORDINATES:
        value = limit(result, name)
        if value is not None:
            found[name] = f"{number(value)} {'kPa' if name == 'dry_air_limit' else 'degC'}"
    found.setdefault("water", phrase("assumptions.water_default"))
    found["assumptions"] = assumptions(result)
    found["caution"] = caution(result)
    return found
