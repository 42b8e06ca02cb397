"""Crop profiles in plain text, for `cropstress crops`."""

from __future__ import annotations

import textwrap

from cropstress.crops.catalogue import available_crops, load_crop
from cropstress.crops.profile import CropProfile, Value
from cropstress.crops.quantities import KINETIC_QUANTITIES, PROFILE_GROUPS

WIDTH = 100
_HEADINGS = {
    "heat": "Heat limits",
    "flowering": "Flowering",
    "stages": "Growth stages",
    "leaf": "Leaf",
    "canopy": "Canopy",
}
_INDENT = " " * 4


def describe_crops() -> list[str]:
    """Return one line for each shipped crop, with a heading.

    Returns
    -------
    list of str
        Name, pathway, heat onset, hot-day and flowering limit [degC], season length [d], label.
    """
    lines = [
        f"{'name':<13} {'path':<5} {'onset':>6} {'hot day':>8} {'flowering':>10} {'season':>7}  crop",
        f"{'':<13} {'':<5} {'degC':>6} {'degC':>8} {'degC':>10} {'d':>7}",
    ]
    for name in available_crops():
        crop = load_crop(name)
        onset, hot_day = crop.number("heat_onset"), crop.number("hot_day_limit")
        flowering = f"{crop.number('flowering_limit'):g}" if crop.flowering_window else "none"
        lines.append(
            f"{name:<13} {crop.pathway:<5} {onset:>6g} {hot_day:>8g} {flowering:>10} {sum(crop.days):>7}  "
            f"{crop.label} ({crop.latin})"
        )
    lines += ["", "`cropstress crops NAME` prints every value of one, with range, source and status."]
    return lines


def describe_crop(profile: CropProfile) -> list[str]:
    """Return everything a profile holds: each value with unit, range, source, status and meaning.

    Parameters
    ----------
    profile : CropProfile

    Returns
    -------
    list of str
        Lines, the sentences among them wrapped at `WIDTH` characters.
    """
    lines = [f"{profile.label} ({profile.latin}), {profile.pathway}, profile '{profile.name}'"]
    if profile.based_on:
        lines.append(f"Based on the profile '{profile.based_on}'.")
    if profile.changed:
        lines += _wrapped(f"Changed by you: {', '.join(profile.changed)}.", "")
    for remark in profile.remarks:
        lines += _wrapped(remark, "")
    for group, quantities in PROFILE_GROUPS.items():
        own = [name for name, quantity in quantities.items() if quantity.pathway in (None, profile.pathway)]
        lines += _group(_HEADINGS[group], {name: profile.values.get(name) for name in own})
    constants = {name: profile.kinetics.get(name) for name in KINETIC_QUANTITIES[profile.pathway]}
    lines += _group(f"Enzyme kinetics: {profile.kinetics_set}", constants)
    return lines


def _group(heading: str, values: dict[str, Value | None]) -> list[str]:
    lines = ["", heading, "-" * len(heading)]
    absent = [name for name, value in values.items() if value is None]
    for name, value in values.items():
        if value is not None:
            lines += _described(name, value)
    if absent:
        lines += _wrapped(f"Not in this profile: {', '.join(absent)}.", "")
    return lines


def _described(name: str, value: Value) -> list[str]:
    unit = "" if value.unit == "1" else f" {value.unit}"
    span = "fixed" if value.low == value.high else f"{value.low:g} to {value.high:g}"
    known = value.status if value.confidence is None else f"{value.status}, {value.confidence} confidence"
    return [
        f"{name} = {value.value:g}{unit}  ({span})  {known}",
        *_wrapped(value.meaning, _INDENT),
        *_wrapped(f"Source: {value.source}", _INDENT),
    ]


def _wrapped(text: str, indent: str) -> list[str]:
    return textwrap.wrap(text, WIDTH, initial_indent=indent, subsequent_indent=indent, break_on_hyphens=False)
