"""A run file as written, laid over the run files it is the same as; where its paths are."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path, PurePosixPath, PureWindowsPath
from typing import Any

from cropstress.crops.profile_files import is_profile_path
from cropstress.crops.reading import Location, control_character_fault, read_toml
from cropstress.errors import Fault, fail

Raw = dict[str, Any]
PathChange = Callable[[str, Location], str]

EVERY = "*"
_PATH_ROUTES: tuple[tuple[str, ...], ...] = (
    ("same_as",),
    ("weather", "files"),
    ("places", "districts"),
    ("places", "elevation"),
    ("places", "elevation", "file"),
    ("crops", EVERY, "profile"),
    ("crops", EVERY, "sowing", "grid"),
    ("crops", EVERY, "sowing", "table"),
    ("crops", EVERY, "area"),
    ("crops", EVERY, "area", "file"),
    ("output", "folder"),
)


@dataclass(frozen=True)
class Layer:
    """One run file of a chain.

    Attributes
    ----------
    shown : str
        How messages name the file.
    raw : dict
        As written, but with paths relative to the first file of the chain.
    """

    shown: str
    raw: Raw


def read_layers(path: Path) -> list[Layer]:
    """Read a run file and those it is the same as, itself first.

    Raises
    ------
    InputError
        A file is missing or not TOML, or the chain leads back to itself.
    """
    layers: list[Layer] = []
    seen: list[Path] = []
    towards = ""  # folder of the current file, as written from the first one
    current = path
    while True:
        shown = path.name if not layers else str(PurePosixPath(towards, current.name))
        if current.resolve() in seen:
            raise fail("it is the same as itself", f"{shown}: same_as", "Let one of the files stand alone.")
        seen.append(current.resolve())
        raw = read_toml(current, shown)
        layers.append(Layer(shown, changed_paths(raw, _moved(towards))))
        base = raw.get("same_as")
        if not isinstance(base, str) or control_character_fault(base, shown):
            return layers
        towards = str(PurePosixPath(towards, base).parent)
        current = current.parent / base


def merged(layers: list[Layer]) -> Raw:
    """Lay each file over the one it is the same as.

    Tables are merged key by key; a crop entry replaces the one of its name as a whole. The folder of the
    results is each file's own.
    """
    result: Raw = {}
    for layer in reversed(layers):
        result = _laid_over(_without_folder(result), layer.raw)
    return result


def changed_paths(raw: Raw, change: PathChange) -> Raw:
    """Return a copy of a run file with every path in it changed; what is not well formed is left alone."""
    for route in _PATH_ROUTES:
        raw = _changed(raw, route, (), change)
    return raw


def path_faults(raw: Raw, place: Callable[[Location], str]) -> dict[Location, Fault]:
    """Return a fault for each path that a backslash in double quotes has spoilt, by its location."""
    faults: dict[Location, Fault] = {}

    def note(text: str, location: Location) -> str:
        fault = control_character_fault(text, place(location))
        if fault is not None:
            faults[location] = fault
        return text

    changed_paths(raw, note)
    return faults


def without_machine(text: str, location: Location) -> str:
    """Return a path as written; of an absolute one only its last name."""
    if is_absolute(text):
        return PureWindowsPath(text).name or PurePosixPath(text).name
    return text


def is_absolute(text: str) -> bool:
    """Return whether a path is absolute on any system."""
    return PurePosixPath(text).is_absolute() or bool(PureWindowsPath(text).anchor)


def _moved(towards: str) -> PathChange:
    def move(text: str, location: Location) -> str:
        return text if not towards or is_absolute(text) else str(PurePosixPath(towards, text))

    return move


def _changed(value: Any, route: tuple[str, ...], location: Location, change: PathChange) -> Any:
    if not route:
        if isinstance(value, list):
            return [_changed(item, (), (*location, number), change) for number, item in enumerate(value)]
        is_path = isinstance(value, str) and (location[-1] != "profile" or is_profile_path(value))
        return change(value, location) if is_path else value
    step, rest = route[0], route[1:]
    if step == EVERY and isinstance(value, list):
        return [_changed(item, rest, (*location, number), change) for number, item in enumerate(value)]
    if isinstance(value, dict) and step in value:
        return value | {step: _changed(value[step], rest, (*location, step), change)}
    return value


def _without_folder(raw: Raw) -> Raw:
    output = raw.get("output")
    if not isinstance(output, dict):
        return raw
    return raw | {"output": {key: value for key, value in output.items() if key != "folder"}}


def _laid_over(base: Any, own: Any, key: str = "") -> Any:
    if isinstance(base, dict) and isinstance(own, dict):
        return base | {name: _laid_over(base.get(name), value, name) for name, value in own.items()}
    if key == "crops" and isinstance(base, list) and isinstance(own, list):
        return _merged_crops(base, own)
    return own


def _merged_crops(base: list[Any], own: list[Any]) -> list[Any]:
    remaining = list(own)
    merged_entries = []
    for entry in base:
        name = entry.get("name") if isinstance(entry, dict) else None
        same = [
            new for new in remaining if isinstance(new, dict) and name is not None and new.get("name") == name
        ]
        merged_entries.append(same[0] if same else entry)
        if same:
            remaining.remove(same[0])
    return merged_entries + remaining
