"""Errors a user can act on: what is wrong, where, and what to do."""

from __future__ import annotations

import difflib
from collections.abc import Iterable
from dataclasses import dataclass


@dataclass(frozen=True)
class Fault:
    """One thing that is wrong with the run file, the grids or a profile.

    Attributes
    ----------
    what : str
        What is wrong, with the offending value.
    where : str
        File, variable, place or key.
    remedy : str
        What to do about it.
    """

    what: str
    where: str
    remedy: str

    def __str__(self) -> str:
        return f"{self.where}: {self.what}\n    {self.remedy}"


class CropstressError(Exception):
    """Base of every error this package raises on purpose."""


class InputError(CropstressError):
    """The run file, a profile or the grids are at fault.

    Parameters
    ----------
    faults : iterable of Fault
        All faults that were found, never only the first.
    """

    def __init__(self, faults: Iterable[Fault]) -> None:
        self.faults = list(faults)
        super().__init__(self.faults)

    def __str__(self) -> str:
        count = len(self.faults)
        heading = "1 fault found" if count == 1 else f"{count} faults found"
        return heading + ":\n" + "\n".join(f"  {number}. {fault}" for number, fault in enumerate(self.faults, 1))


def fail(what: str, where: str, remedy: str) -> InputError:
    """Make an error with a single fault, to be raised by the caller."""
    return InputError([Fault(what, where, remedy)])


def nearest(word: str, choices: Iterable[str]) -> str | None:
    """Return the choice most like a misspelt word, or None when nothing is close.

    >>> nearest("maze", ["maize", "rice"])
    'maize'
    """
    known = {choice.lower(): choice for choice in choices}
    found = difflib.get_close_matches(word.lower(), list(known), n=1, cutoff=0.6)
    return known[found[0]] if found else None
