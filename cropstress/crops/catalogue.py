"""Crop profiles by name or path, with changes."""

from __future__ import annotations

from collections.abc import Callable, Collection, Mapping
from os import PathLike, fspath
from typing import Any

from pydantic import ValidationError

from cropstress.crops.profile import CropProfile, Value, missing_faults, unknown_value, value_faults
from cropstress.crops.profile_files import (
    Entries,
    altered,
    find_kinetics,
    find_profile,
    names_in,
    no_source,
    place_of,
)
from cropstress.crops.quantities import KINETIC_QUANTITIES, Quantity, profile_quantities
from cropstress.crops.reading import Location, faults_of
from cropstress.errors import Fault, InputError


def available_crops() -> list[str]:
    """Return the names of the shipped crop profiles, in alphabetical order.

    >>> available_crops()[:3]
    ['barley', 'canola', 'common-bean']
    """
    return names_in("profiles")


def load_crop(
    name_or_path: str | PathLike[str],
    changes: Mapping[str, Mapping[str, Any]] | None = None,
    where: str | None = None,
) -> CropProfile:
    """Read a crop profile.

    Parameters
    ----------
    name_or_path : str or path
        Name of a shipped profile ("pearl-millet", also "pearl millet" or "Pearl_Millet"), or the path of a
        profile of your own (it ends in .toml or has a folder in it), which may start from another by
        ``based_on = "maize"`` and then lists only what differs.
    changes : mapping of str to mapping, optional
        Values to change, by name: ``{"heat_onset": {"value": 34, "source": "our trial 2020"}}``. `source` is
        needed; `low`, `high`, `status`, `confidence` and `meaning` may be given. Where the range is not
        given, the profile's stays, widened where it must be to hold the new value.
    where : str, optional
        How messages name the changes.

    Returns
    -------
    CropProfile

    Raises
    ------
    InputError
        Unknown crop (with the nearest), unreadable file, unknown, missing, sourceless or physically
        impossible values: all of them.

    Examples
    --------
    >>> load_crop("maize").number("hot_day_limit")
    35.0
    >>> load_crop("maize", {"hot_day_limit": {"value": 34, "source": "our trial 2020"}}).changed
    ('hot_day_limit',)
    """
    found = find_profile(fspath(name_or_path))
    kinetics = find_kinetics(found.file.kinetics_set, found.file.pathway, found.place)
    entries = {"values": dict(found.file.values), "kinetics": dict(kinetics.values)}
    quantities = {
        "values": profile_quantities(found.file.pathway),
        "kinetics": KINETIC_QUANTITIES[found.file.pathway],
    }
    places = {"values": found.place, "kinetics": f"kinetics {kinetics.name}"}
    changes_place = where or f"changes of crop {found.file.name}"
    changed, faults = _apply(changes or {}, entries, quantities, changes_place)

    built = {}
    for kind in ("values", "kinetics"):

        def place(name: str, kind: str = kind) -> str:
            return place_of(changes_place if name in changed else places[kind], (name,))

        built[kind], more = _built(entries[kind], quantities[kind], place)
        faults += [*more, *missing_faults(entries[kind], quantities[kind], places[kind])]
    if faults:
        raise InputError(faults)
    return CropProfile(
        name=found.file.name,
        label=found.file.label,
        latin=found.file.latin,
        pathway=found.file.pathway,
        kinetics_set=found.file.kinetics_set,
        remarks=found.file.remarks,
        based_on=found.file.based_on,
        values=built["values"],
        kinetics=built["kinetics"],
        changed=tuple(dict.fromkeys([*found.changed, *changed])),
    )


def _apply(
    changes: Mapping[str, object],
    entries: Mapping[str, Entries],
    quantities: Mapping[str, Mapping[str, Quantity]],
    where: str,
) -> tuple[list[str], list[Fault]]:
    """Lay the changes over the entries, in place; return the changed names, and what was wrong."""
    changed: list[str] = []
    faults: list[Fault] = []
    known = [*quantities["values"], *quantities["kinetics"]]
    for written, change in changes.items():
        name = written.removeprefix("values.").removeprefix("kinetics.")
        fault = _change_fault(name, change, known, where)
        if fault is not None:
            faults.append(fault)
        elif isinstance(change, Mapping):
            target = entries["values" if name in quantities["values"] else "kinetics"]
            target[name] = altered(target.get(name), change)
            changed.append(name)
    return changed, faults


def _change_fault(name: str, change: object, known: Collection[str], where: str) -> Fault | None:
    if name not in known:
        return unknown_value(name, known, where)
    if not isinstance(change, Mapping):
        remedy = f'Write {name} = {{ value = {change}, source = "..." }}.'
        return Fault("a change is a table with a value and its source", place_of(where, (name,)), remedy)
    source = change.get("source")
    if not isinstance(source, str) or not source.strip():
        return no_source(where, name)
    if "value" not in change:
        return Fault("the change has no value", place_of(where, (name,)), "Add value = NUMBER.")
    return None


def _built(
    entries: Entries, quantities: Mapping[str, Quantity], place: Callable[[str], str]
) -> tuple[dict[str, Value], list[Fault]]:
    """Turn entries into values; unit and meaning are the quantity's where an entry does not say otherwise."""
    built: dict[str, Value] = {}
    faults: list[Fault] = []
    for name, entry in entries.items():
        quantity = quantities.get(name)
        if quantity is None:
            faults.append(unknown_value(name, quantities, place(name)))
            continue
        try:
            built[name] = Value.model_validate({"unit": quantity.unit, "meaning": quantity.meaning} | entry)
        except ValidationError as error:
            faults += _value_shape_faults(error, place(name))
        else:
            faults += value_faults(built[name], quantity, place(name))
    return built, faults


def _value_shape_faults(error: ValidationError, place: str) -> list[Fault]:
    def named(location: Location) -> str:
        return place_of(place, location)

    return faults_of(error, named, lambda location: list(Value.model_fields))
