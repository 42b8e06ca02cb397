"""TOML files and checked models, with every fault told in words a user can act on."""

from __future__ import annotations

import re
import tomllib
from collections.abc import Callable, Iterable, Sequence
from pathlib import Path
from typing import Any

from pydantic import ValidationError

from cropstress.errors import Fault, InputError, fail, nearest

Location = tuple[str | int, ...]

_EXPECTED = {
    "string_type": "a text in quotes",
    "float_type": "a number",
    "int_type": "a whole number",
    "int_from_float": "a whole number",
    "bool_type": "true or false",
    "list_type": "a list in [ ]",
    "dict_type": "a table",
    "model_type": "a table",
    "model_attributes_type": "a table",
    "finite_number": "a finite number",
    "too_short": "at least one entry",
    "string_too_short": "a text that is not empty",
}
_BOUNDS = {
    "greater_than_equal": ("ge", "a number not below"),
    "less_than_equal": ("le", "a number not above"),
    "greater_than": ("gt", "a number above"),
}
_BACKSLASH = (
    'Write paths with forward slashes, on Windows too: "grids/tmax.nc"; put other text with backslashes in '
    "single quotes."
)


def read_toml(path: Path, shown: str) -> dict[str, Any]:
    """Read a TOML file.

    Parameters
    ----------
    path : Path
        The file.
    shown : str
        How messages name it.

    Returns
    -------
    dict
        As written.

    Raises
    ------
    InputError
        No such file, not readable, not UTF-8, or not TOML; says the line, and what to do about a backslash.
    """
    try:
        text = path.read_text(encoding="utf-8-sig")
    except FileNotFoundError:
        raise fail("there is no such file", shown, "Check the path and the name.") from None
    except UnicodeDecodeError as error:
        line = path.read_bytes()[: error.start].count(b"\n") + 1
        raise fail(f"line {line} is not UTF-8 text", shown, "Save the file as UTF-8 (plain text).") from None
    except OSError as error:
        reason = error.strerror or type(error).__name__
        raise fail(f"it cannot be read ({reason})", shown, "Give the path of a file you may read.") from None
    try:
        return tomllib.loads(text)
    except tomllib.TOMLDecodeError as error:
        raise InputError([_syntax_fault(error, text, shown)]) from None


def _syntax_fault(error: tomllib.TOMLDecodeError, text: str, shown: str) -> Fault:
    lines = text.splitlines()
    found = re.search(r"\(at line (\d+), column \d+\)", str(error))
    number = int(found.group(1)) if found else max(len(lines), 1)
    line = lines[number - 1].strip() if number <= len(lines) else ""
    reason = re.sub(r" \(at .*\)$", "", str(error))
    where = f"{shown}, line {number}"
    if re.search(r'"[^"]*\\', line):
        what = f"this is not TOML, for a backslash in double quotes is no plain character ({reason}): {line}"
        return Fault(what, where, _BACKSLASH)
    return Fault(f"this is not TOML ({reason}): {line}", where, "Check quotes, brackets and = of this line.")


def control_character_fault(text: str, place: str) -> Fault | None:
    r"""Return the fault of a path in which a backslash became a control character, as in "grids\new"."""
    if any(ord(character) < 32 for character in text):
        what = f"the path {text!r} holds a backslash that TOML read as a control character"
        return Fault(what, place, _BACKSLASH)
    return None


def faults_of(
    error: ValidationError,
    place: Callable[[Location], str],
    keys: Callable[[Location], Sequence[str]],
    known_elsewhere: Callable[[str], str | None] = lambda key: None,
) -> list[Fault]:
    """Turn what pydantic found into faults.

    Parameters
    ----------
    error : pydantic.ValidationError
    place : callable
        How messages name a location in the file.
    keys : callable
        The keys that are right in the table at a location.
    known_elsewhere : callable
        Name of the table in which a key is right, or None.

    Returns
    -------
    list of Fault
    """
    faults = []
    for found in error.errors(include_url=False, include_context=True):
        location = tuple(part for part in found["loc"] if not str(part).startswith(("#", "[key]")))
        kind = found["type"]
        if kind == "extra_forbidden":
            faults.append(
                unknown_key(str(location[-1]), place(location[:-1]), keys(location[:-1]), known_elsewhere)
            )
        elif kind == "missing":
            remedy = f"Add it. Keys here: {', '.join(keys(location[:-1]))}."
            faults.append(Fault(f"the key '{location[-1]}' is missing", place(location[:-1]), remedy))
        elif kind == "literal_error":
            faults.append(_wrong_choice(found["input"], found["ctx"]["expected"], place(location)))
        elif kind in _BOUNDS:
            key, words = _BOUNDS[kind]
            expected = f"{words} {found['ctx'][key]:g}"
            faults.append(wrong_type(found["input"], expected, place(location)))
        elif kind in _EXPECTED:
            faults.append(wrong_type(found["input"], _EXPECTED[kind], place(location)))
        else:
            what, _, remedy = found["msg"].removeprefix("Value error, ").partition("\n")
            shown = "" if kind == "value_error" else f" (found {_shown(found['input'])})"
            faults.append(Fault(what + shown, place(location), remedy or "Correct this value."))
    return faults


def unknown_key(
    key: str,
    where: str,
    right: Iterable[str],
    known_elsewhere: Callable[[str], str | None] = lambda key: None,
) -> Fault:
    """Return the fault of a key that is not known here, with the nearest right one."""
    names = list(right)
    close = nearest(key, names)
    other = known_elsewhere(key)
    if other:
        remedy = f"It belongs in {other}."
    elif close:
        remedy = f"Did you mean '{close}'?"
    else:
        remedy = f"Keys here: {', '.join(names)}."
    return Fault(f"unknown key '{key}'", where, remedy)


def wrong_type(value: object, expected: str, where: str) -> Fault:
    """Return the fault of a value of the wrong type."""
    return Fault(f"expected {expected}, found {_shown(value)}", where, f"Give {expected}.")


def _wrong_choice(value: object, expected: str, where: str) -> Fault:
    close = nearest(str(value), re.findall(r"'([^']*)'", expected))
    return Fault(
        f"expected {expected}, found {_shown(value)}",
        where,
        f"Did you mean '{close}'?" if close else "Choose one of them.",
    )


def _shown(value: object) -> str:
    if isinstance(value, bool):
        return str(value).lower()
    if isinstance(value, str):
        return f'the text "{value}"'
    if isinstance(value, dict):
        return "a table"
    if isinstance(value, list):
        return "a list" if value else "an empty list"
    return str(value)
