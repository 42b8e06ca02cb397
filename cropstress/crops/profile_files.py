"""Profile and kinetics files as written: where they are, their tables, and how one is laid over another."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from functools import partial
from importlib.resources import files
from importlib.resources.abc import Traversable
from pathlib import Path
from typing import Annotated, Any, TypeVar

from pydantic import BaseModel, BeforeValidator, ConfigDict, ValidationError

from cropstress.crops.profile import Text
from cropstress.crops.quantities import Pathway
from cropstress.crops.reading import Location, faults_of, read_toml
from cropstress.errors import Fault, InputError, fail, nearest

GIVEN_BY_USER = "given by user"

Remarks = Annotated[
    tuple[Text, ...], BeforeValidator(lambda value: tuple(value) if isinstance(value, list) else value)
]
Entries = dict[str, dict[str, Any]]


class ProfileFile(BaseModel):
    """The tables of a profile file, its values not yet checked."""

    model_config = ConfigDict(extra="forbid", strict=True)

    name: Text
    label: Text
    latin: Text
    pathway: Pathway
    kinetics_set: Text
    remarks: Remarks = ()
    based_on: Text | None = None
    values: Entries


class KineticsFile(BaseModel):
    """The tables of a kinetics file, its values not yet checked."""

    model_config = ConfigDict(extra="forbid", strict=True)

    name: Text
    label: Text
    pathway: Pathway
    remarks: Remarks = ()
    values: Entries


Checked = TypeVar("Checked", ProfileFile, KineticsFile)


@dataclass(frozen=True)
class FoundProfile:
    """A profile file, laid over those it is based on.

    Attributes
    ----------
    file : ProfileFile
    place : str
        How messages name it.
    changed : tuple of str
        Names of the values that differ from the shipped profile it is based on.
    """

    file: ProfileFile
    place: str
    changed: tuple[str, ...]


def names_in(folder: str) -> list[str]:
    """Return the names of the shipped files in "profiles" or "kinetics"."""
    entries = _folder(folder).iterdir()
    return sorted(entry.name.removesuffix(".toml") for entry in entries if entry.name.endswith(".toml"))


def is_profile_path(name_or_path: str) -> bool:
    """Return whether this names a file and not a shipped profile."""
    return name_or_path.endswith(".toml") or "/" in name_or_path or "\\" in name_or_path


def find_profile(name_or_path: str) -> FoundProfile:
    """Find and read a profile by name or path, with what it is based on.

    Raises
    ------
    InputError
        Unknown crop, unreadable file, wrong keys, a changed value without a source.
    """
    raw, place, changed = _raw_profile(name_or_path, ())
    return FoundProfile(_checked(ProfileFile, raw, place), place, changed)


def find_kinetics(name: str, pathway: Pathway, place: str) -> KineticsFile:
    """Find and read the kinetics set a profile names.

    Raises
    ------
    InputError
        Unknown set, or one of the other pathway.
    """
    known = names_in("kinetics")
    if name not in known:
        close = nearest(name, known)
        remedy = f"Did you mean '{close}'?" if close else f"Known sets: {', '.join(known)}."
        raise fail(f"there is no kinetics set named '{name}'", f"{place}: kinetics_set", remedy)
    kinetics = _checked(KineticsFile, _shipped("kinetics", name), f"kinetics {name}")
    if kinetics.pathway != pathway:
        raise fail(
            f"the set '{name}' is for {kinetics.pathway} leaves, the crop is {pathway}",
            f"{place}: kinetics_set",
            "Choose the set of the crop's own pathway: sets are never mixed.",
        )
    return kinetics


def altered(before: Mapping[str, Any] | None, change: Mapping[str, Any]) -> dict[str, Any]:
    """Lay a change over a value.

    A new number drops the old confidence and takes the status "given by user". Where the change gives no
    range, the old one stays, widened where it must be to hold the new number.
    """
    value = change.get("value")
    if before is None:
        before = {"low": value, "high": value}
    after = dict(before)
    if value is not None:
        after.pop("confidence", None)
        after["status"] = GIVEN_BY_USER
        if all(_is_number(number) for number in (value, before.get("low"), before.get("high"))):
            after["low"], after["high"] = min(before["low"], value), max(before["high"], value)
    return after | dict(change)


def no_source(where: str, name: str) -> Fault:
    """Return the fault of a changed value without a source."""
    return Fault(
        "the changed value has no source", f"{where}: {name}", 'Say where it comes from: source = "...".'
    )


def place_of(place: str, location: Location) -> str:
    """Return how messages name a location in a file."""
    return f"{place}: {'.'.join(str(part) for part in location)}" if location else place


def _folder(name: str) -> Traversable:
    return files("cropstress.crops") / name


def _shipped(folder: str, name: str) -> dict[str, Any]:
    return read_toml(Path(str(_folder(folder) / f"{name}.toml")), f"{folder}/{name}.toml")


def _shipped_profile(text: str) -> tuple[dict[str, Any], str]:
    known = names_in("profiles")
    name = "-".join(text.lower().replace("_", " ").replace("-", " ").split())
    if name not in known:
        close = nearest(name, known)
        suggestion = f"Did you mean '{close}'? " if close else ""
        raise fail(
            f"there is no crop profile named '{text}'",
            "crop",
            f"{suggestion}Known crops: {', '.join(known)}; or give the path of a profile of your own.",
        )
    return _shipped("profiles", name), f"profile {name}"


def _raw_profile(text: str, seen: tuple[Path, ...]) -> tuple[dict[str, Any], str, tuple[str, ...]]:
    if not is_profile_path(text):
        return *_shipped_profile(text), ()
    path = Path(text)
    place = f"profile {path.name}"
    if path.resolve() in seen:
        raise fail("it is based on itself", place, "Let based_on name a shipped profile or another file.")
    own = read_toml(path, place)
    base_name = own.get("based_on")
    if not isinstance(base_name, str):
        return own, place, ()
    if is_profile_path(base_name):
        base_name = str(path.parent / base_name)
    base, _, changed_before = _raw_profile(base_name, (*seen, path.resolve()))
    own_values = own.get("values", {})
    if not _is_table_of_tables(own_values) or not _is_table_of_tables(base.get("values")):
        return base | own, place, ()
    sourceless = [name for name, change in own_values.items() if "value" in change and "source" not in change]
    if sourceless:
        raise InputError([no_source(place, name) for name in sourceless])
    values = base["values"] | {
        name: altered(base["values"].get(name), change) for name, change in own_values.items()
    }
    return base | own | {"values": values}, place, (*changed_before, *own_values)


def _is_table_of_tables(value: object) -> bool:
    return isinstance(value, dict) and all(isinstance(entry, dict) for entry in value.values())


def _is_number(value: object) -> bool:
    return isinstance(value, int | float) and not isinstance(value, bool)


def _checked(model: type[Checked], raw: dict[str, Any], place: str) -> Checked:
    def keys(location: Location) -> list[str]:
        return [] if location else list(model.model_fields)

    try:
        return model.model_validate(raw)
    except ValidationError as error:
        raise InputError(faults_of(error, partial(place_of, place), keys)) from None
