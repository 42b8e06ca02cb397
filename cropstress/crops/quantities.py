"""What a profile and a kinetics set may hold: unit, physically possible range and meaning of each value."""

from __future__ import annotations

import tomllib
from dataclasses import dataclass
from importlib.resources import files
from typing import Any, Literal

Pathway = Literal["C3", "C4"]


@dataclass(frozen=True)
class Quantity:
    """One named value of a profile or a kinetics set.

    Attributes
    ----------
    unit : str
        CF unit string the value must be given in.
    lowest, highest : float
        Physically possible range, both ends included, in `unit`.
    meaning : str
        One sentence.
    pathway : {"C3", "C4"} or None
        The only pathway that has it; None for both.
    optional : str or None
        Name of the group of values that are given all together or not at all; None for a value no profile
        can do without.
    whole : bool
        True for a count of days.
    """

    unit: str
    lowest: float
    highest: float
    meaning: str
    pathway: Pathway | None = None
    optional: str | None = None
    whole: bool = False


def _quantities(table: dict[str, dict[str, Any]]) -> dict[str, Quantity]:
    return {name: Quantity(**entry) for name, entry in table.items()}


_TABLES = tomllib.loads((files("cropstress.crops") / "quantities.toml").read_text(encoding="utf-8"))

#: Values of a profile by group ("heat", "flowering", "stages", "leaf", "canopy") and name.
PROFILE_GROUPS = {group: _quantities(table) for group, table in _TABLES["profile"].items()}
_KINETICS = {group: _quantities(table) for group, table in _TABLES["kinetics"].items()}
#: Values of a kinetics set by pathway and name.
KINETIC_QUANTITIES: dict[Pathway, dict[str, Quantity]] = {
    "C3": _KINETICS["C3"] | _KINETICS["shared"],
    "C4": _KINETICS["C4"] | _KINETICS["shared"],
}


def profile_quantities(pathway: Pathway) -> dict[str, Quantity]:
    """Return the values a profile of this pathway may hold, by name."""
    return {
        name: quantity
        for group in PROFILE_GROUPS.values()
        for name, quantity in group.items()
        if quantity.pathway in (None, pathway)
    }
