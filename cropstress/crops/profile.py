"""A crop profile and its values, checked for physical sense."""

from __future__ import annotations

from collections.abc import Collection, Iterable, Mapping
from typing import Annotated, Literal, get_args

from pydantic import BaseModel, ConfigDict, StringConstraints, model_validator

from cropstress.crops.quantities import KINETIC_QUANTITIES, Pathway, Quantity, profile_quantities
from cropstress.errors import Fault, InputError, fail, nearest

Status = Literal[
    "read",
    "read in abstract",
    "read in secondary source",
    "from memory",
    "common practice",
    "derived here",
    "chosen here",
    "given by user",
]
STATUSES: tuple[str, ...] = get_args(Status)
Text = Annotated[str, StringConstraints(strip_whitespace=True, min_length=1)]
STAGE_NAMES = ("initial", "development", "mid", "late")
LONGEST_SEASON_DAYS = 730


class Value(BaseModel):
    """One number with all that is known about it.

    Attributes
    ----------
    value : float
        In `unit`.
    unit : str
        CF unit string.
    low, high : float
        Range in which the true value is likely to lie, in `unit`; holds `value`.
    status : str
        How the number is known, one of `STATUSES`.
    confidence : {"high", "medium", "low"} or None
        None where the source speaks for itself.
    source : str
        Where it comes from.
    meaning : str
        One sentence: what it is, of air or leaf, a moment's, a day's maximum or mean.
    """

    model_config = ConfigDict(frozen=True, extra="forbid", strict=True, allow_inf_nan=False)

    value: float
    unit: Text
    low: float
    high: float
    status: Status
    confidence: Literal["high", "medium", "low"] | None = None
    source: Text
    meaning: Text


class CropProfile(BaseModel):
    """All values of one crop.

    Attributes
    ----------
    name : str
        The shipped profile's name, or that of a user's own.
    label : str
        Name for readers.
    latin : str
        Botanical name.
    pathway : {"C3", "C4"}
        Photosynthetic pathway.
    kinetics_set : str
        Name of the set in `kinetics`.
    remarks : tuple of str
        Cautions about the whole profile.
    values : dict of str to Value
        The crop's own values.
    kinetics : dict of str to Value
        Enzyme constants and their temperature responses, one whole set.
    based_on : str or None
        The profile a user's own starts from.
    changed : tuple of str
        Names of the values that differ from the shipped profile.

    Raises
    ------
    InputError
        With every value that is missing, unknown, or physically impossible.
    """

    model_config = ConfigDict(frozen=True, extra="forbid", strict=True)

    name: Text
    label: Text
    latin: Text
    pathway: Pathway
    kinetics_set: Text
    values: dict[str, Value]
    kinetics: dict[str, Value]
    remarks: tuple[str, ...] = ()
    based_on: str | None = None
    changed: tuple[str, ...] = ()

    @model_validator(mode="after")
    def _physically_possible(self) -> CropProfile:
        where = f"profile {self.name}"
        faults = [
            *set_faults(self.values, profile_quantities(self.pathway), where),
            *set_faults(self.kinetics, KINETIC_QUANTITIES[self.pathway], f"kinetics {self.kinetics_set}"),
        ]
        faults = faults or coherence_faults(self, where)
        if faults:
            raise InputError(faults)
        return self

    def number(self, name: str) -> float:
        """Return one value as a plain number, in the unit of `Value.unit`.

        Raises
        ------
        InputError
            The profile has no value of this name.
        """
        found = self.values.get(name) or self.kinetics.get(name)
        if found is None:
            close = nearest(name, [*self.values, *self.kinetics])
            raise fail(
                f"has no value named '{name}'",
                f"profile {self.name}",
                f"Did you mean '{close}'?" if close else f"`cropstress crops {self.name}` lists its values.",
            )
        return found.value

    @property
    def days(self) -> tuple[int, int, int, int]:
        """Lengths of the initial, development, mid and late stage [d]."""
        initial, development, mid, late = (int(self.number(f"{stage}_days")) for stage in STAGE_NAMES)
        return initial, development, mid, late

    @property
    def flowering_offset(self) -> int | None:
        """Days from the start of mid-season to flowering [d]; None for a crop without a flowering window."""
        offset = self.values.get("flowering_offset")
        return None if offset is None else int(offset.value)

    @property
    def flowering_window(self) -> tuple[int, int] | None:
        """First and last day of the flowering window, from flowering [d]; None where there is none."""
        if self.flowering_offset is None:
            return None
        return int(self.number("flowering_window_start")), int(self.number("flowering_window_end"))

    @property
    def thermal_sums(self) -> tuple[float, float, float, float] | None:
        """Growing degree days of the four stages [K d]; None where the profile has stage lengths only."""
        if "initial_thermal_sum" not in self.values:
            return None
        initial, development, mid, late = (self.number(f"{stage}_thermal_sum") for stage in STAGE_NAMES)
        return initial, development, mid, late


def set_faults(values: Mapping[str, Value], quantities: Mapping[str, Quantity], where: str) -> list[Fault]:
    """Return what is wrong with a set of values, each taken by itself, and which of them are missing."""
    faults: list[Fault] = []
    for name, value in values.items():
        quantity = quantities.get(name)
        place = f"{where}: {name}"
        if quantity is None:
            faults.append(unknown_value(name, quantities, where))
        else:
            faults += value_faults(value, quantity, place)
    return faults + missing_faults(values, quantities, where)


def unknown_value(name: str, known: Iterable[str], where: str) -> Fault:
    """Return the fault of a value name nothing here knows, with the nearest right one."""
    close = nearest(name, known)
    remedy = f"Did you mean '{close}'?" if close else f"Known names: {', '.join(known)}."
    return Fault(f"no value of a crop of this pathway is named '{name}'", where, remedy)


def value_faults(value: Value, quantity: Quantity, place: str) -> list[Fault]:
    """Return what is wrong with one value: its unit, its physical range, the order low, value, high."""
    if value.unit != quantity.unit:
        return [
            Fault(f"is given in '{value.unit}'", place, f"Give it in '{quantity.unit}': {quantity.meaning}")
        ]
    faults = []
    for kind, number in (("value", value.value), ("low", value.low), ("high", value.high)):
        told = kind != "value" and number == value.value  # a range widened to hold the value is at fault with it
        if not told and not quantity.lowest <= number <= quantity.highest:
            faults.append(
                Fault(
                    f"{kind} = {number:g} {value.unit} is outside the physical range "
                    f"{quantity.lowest:g} to {quantity.highest:g} {value.unit}",
                    place,
                    f"Check the number and its unit: {quantity.meaning}",
                )
            )
    if not value.low <= value.value <= value.high:
        faults.append(
            Fault(
                f"low {value.low:g}, value {value.value:g}, high {value.high:g} are not in this order",
                place,
                "Give a range that holds the value.",
            )
        )
    if quantity.whole and not value.value.is_integer():
        faults.append(Fault(f"value = {value.value:g} is not a whole number of days", place, "Round it."))
    return faults


def missing_faults(given: Collection[str], quantities: Mapping[str, Quantity], where: str) -> list[Fault]:
    """Return a fault for each value that must be there and is not."""
    started = {
        quantity.optional for name, quantity in quantities.items() if quantity.optional and name in given
    }
    return [
        Fault(
            f"the value '{name}' is missing",
            where,
            f"Give it, with its source [{quantity.unit}]: {quantity.meaning}"
            + (f" The {quantity.optional} must be given whole or not at all." if quantity.optional else ""),
        )
        for name, quantity in quantities.items()
        if name not in given and (quantity.optional is None or quantity.optional in started)
    ]


def coherence_faults(profile: CropProfile, where: str) -> list[Fault]:
    """Return what is wrong between values that are each possible by themselves."""
    faults: list[Fault] = []
    base, ceiling = profile.number("base_temperature"), profile.number("ceiling_temperature")
    if base >= ceiling:
        faults.append(
            Fault(
                f"base_temperature {base:g} degC is not below ceiling_temperature {ceiling:g} degC",
                where,
                "Growing degree days are counted between the two: lower the first or raise the second.",
            )
        )
    season = sum(profile.days)
    if season > LONGEST_SEASON_DAYS:
        faults.append(
            Fault(
                f"the four stages last {season} days together",
                where,
                f"A season may last up to {LONGEST_SEASON_DAYS} days: check the stage lengths.",
            )
        )
    if profile.flowering_offset is not None and profile.flowering_window is not None:
        flowering = profile.days[0] + profile.days[1] + profile.flowering_offset
        if not 0 <= flowering < season:
            faults.append(
                Fault(
                    f"flowering, {flowering} days after sowing, is outside the season of {season} days",
                    f"{where}: flowering_offset",
                    "Check it against the stage lengths: it is counted from the start of mid-season.",
                )
            )
        start, end = profile.flowering_window
        if start > end:
            faults.append(
                Fault(
                    f"the flowering window starts on day {start} and ends on day {end} from flowering",
                    where,
                    "Let flowering_window_start come before flowering_window_end.",
                )
            )
    return faults
