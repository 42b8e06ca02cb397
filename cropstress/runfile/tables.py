"""The tables of a run file: their keys, types and defaults."""

from __future__ import annotations

import datetime
import re
from typing import Annotated, Any, Literal

from pydantic import (
    AfterValidator,
    BaseModel,
    BeforeValidator,
    ConfigDict,
    Discriminator,
    Field,
    StringConstraints,
    Tag,
    model_validator,
)

from cropstress.errors import nearest

#: Annual mean at Mauna Loa in 2023, NOAA Global Monitoring Laboratory [umol mol-1]; from memory, sure.
CARBON_DIOXIDE = 421.0


def _as_list(value: object) -> object:
    return value if isinstance(value, list) else [value]


def _date_as_text(value: object) -> object:
    return value.isoformat()[:10] if isinstance(value, datetime.date) else value


def _iso_date(value: object) -> object:
    text = _date_as_text(value)
    # Not a datetime.date: calendars of 360 days have a 30 February.
    if isinstance(text, str) and not re.fullmatch(r"\d{4}-(0[1-9]|1[0-2])-(0[1-9]|[12]\d|3[01])", text):
        raise ValueError(f'"{text}" is not a date\nWrite it as YYYY-MM-DD.')
    return text


def _file_name(text: str) -> str:
    if not re.fullmatch(r"[A-Za-z0-9][A-Za-z0-9_-]*", text):
        raise ValueError(
            f'"{text}" cannot be part of a file name\n'
            "Use letters a to z, digits, - and _, starting with a letter or digit; `label` may hold any text."
        )
    return text


def _year(text: str) -> str:
    if not re.fullmatch(r"\d{4}", text):
        raise ValueError(f'"{text}" is not a year\nWrite years with four digits: "2020" = 414.2.')
    return text


def _form(**by_key: str) -> Discriminator:
    """Tell the forms of a key apart: a text, or a table known by one of its keys, also when misspelt."""

    def form(value: object) -> str:
        if isinstance(value, dict):
            keys = (key for word in value for key in (nearest(str(word), by_key),) if key)
            return by_key[next(keys, next(iter(by_key)))]
        return f"#{type(value).__name__}" if isinstance(value, BaseModel) else "#text"

    return Discriminator(form)


def _plain(value: BaseModel | str | None) -> str | dict[str, str] | None:
    return dict(value.model_dump(exclude_none=True)) if isinstance(value, BaseModel) else value


Text = Annotated[str, StringConstraints(strip_whitespace=True, min_length=1)]
Share = Annotated[float, Field(ge=0.0, le=1.0)]
Concentration = Annotated[float, Field(ge=50.0, le=5000.0)]
Spec = str | dict[str, str]


class Table(BaseModel):
    """A table of the run file: no other keys, no other types."""

    model_config = ConfigDict(extra="forbid", strict=True, frozen=True, allow_inf_nan=False)


class Seasons(Table):
    """Which seasons; a season carries the year of its harvest."""

    years: Annotated[
        list[Annotated[int, Field(ge=1, le=9999)]], BeforeValidator(_as_list), Field(min_length=1)
    ]
    through: Annotated[str, BeforeValidator(_iso_date)] | None = None
    allowed_missing: Share = 0.1

    @model_validator(mode="after")
    def _each_year_once(self) -> Seasons:
        doubled = [year for year in self.years if self.years.count(year) > 1]
        if doubled:
            raise ValueError(f"the year {doubled[0]} is listed twice\nList each year once.")
        return self


class Variable(Table):
    """What the files do not say of one variable."""

    name: Text | None = None
    unit: Text | None = None
    cell_method: Literal["maximum", "minimum", "mean", "sum", "point"] | None = None
    height: Annotated[float, Field(gt=0.0, le=500.0)] | None = None


class Weather(Table):
    """The daily grids."""

    files: Annotated[list[Text], BeforeValidator(_as_list), Field(min_length=1)]
    credit: Text | None = None
    variables: dict[str, Variable] = {}

    def variable_specs(self) -> dict[str, dict[str, Any]]:
        """Return what is said of each variable, as plain tables."""
        return {name: variable.model_dump(exclude_none=True) for name, variable in self.variables.items()}


class Air(Table):
    """The air's carbon dioxide [umol mol-1]: one number, or one for each year."""

    co2: Annotated[
        Annotated[Concentration, Tag("#number")]
        | Annotated[dict[Annotated[str, AfterValidator(_year)], Concentration], Tag("#years")],
        Discriminator(lambda value: "#years" if isinstance(value, dict) else "#number"),
    ] = CARBON_DIOXIDE


class Grid(Table):
    """A grid in a file."""

    file: Text
    name: Text | None = None


class AreaGrid(Table):
    """A grid of crop area, a share of the cell or hectares."""

    file: Text
    name: Text | None = None
    unit: Text | None = None


class SowingGrid(Table):
    """Sowing day of year from a grid."""

    grid: Text
    name: Text | None = None


class SowingTable(Table):
    """Sowing date by district, from a table."""

    table: Text
    code: Text = "code"
    date: Text = "date"


class Places(Table):
    """What does not change in time."""

    districts: Text | None = None
    layer: Text | None = None
    id_field: Text | None = None
    name_field: Text | None = None
    elevation: (
        Annotated[Annotated[Text, Tag("#text")] | Annotated[Grid, Tag("#Grid")], _form(file="#Grid")] | None
    ) = None

    def elevation_spec(self) -> Spec | None:
        """Return where the elevation is, as a text or a plain table."""
        return _plain(self.elevation)


class Change(Table):
    """A value of the profile that is different here."""

    value: float
    source: Text
    low: float | None = None
    high: float | None = None
    status: Text | None = None
    confidence: Text | None = None
    meaning: Text | None = None


class CropEntry(Table):
    """One crop entry: a crop, variety, sowing or management of its own."""

    name: Annotated[Text, AfterValidator(_file_name)]
    label: Text | None = None
    profile: Text
    sowing: Annotated[
        Annotated[Text, BeforeValidator(_date_as_text), Tag("#text")]
        | Annotated[SowingGrid, Tag("#SowingGrid")]
        | Annotated[SowingTable, Tag("#SowingTable")],
        _form(grid="#SowingGrid", table="#SowingTable"),
    ]
    area: (
        Annotated[
            Annotated[Text, Tag("#text")] | Annotated[AreaGrid, Tag("#AreaGrid")], _form(file="#AreaGrid")
        ]
        | None
    ) = None
    stages: Literal["days", "thermal_time"] = "days"
    changes: dict[str, Change] = {}

    @model_validator(mode="before")
    @classmethod
    def _profile_of_its_name(cls, raw: Any) -> Any:
        return {"profile": raw["name"]} | raw if isinstance(raw, dict) and "name" in raw else raw

    def sowing_spec(self) -> Spec:
        """Return the sowing as a text or a plain table."""
        return _plain(self.sowing) or ""

    def area_spec(self) -> Spec | None:
        """Return where the crop area is, as a text or a plain table; None for everywhere."""
        return _plain(self.area)


class Model(Table):
    """Choices of the science.

    `least_potential` [mol m-2]: below it, shares of the potential assimilation are left blank.
    """

    canopy: Literal["sunlit_shaded", "leaf"] = "sunlit_shaded"
    acclimation: bool = False
    least_potential: Annotated[float, Field(ge=0.0, le=1000.0)] = 1.0


class Maps(Table):
    """Measures to draw beside the usual four."""

    measures: list[Text] = []


class Output(Table):
    """Where the results go; by default a folder in `results` named like the run file."""

    folder: Text | None = None


class Compute(Table):
    """How the computer is used; it never changes a result."""

    threads: Annotated[int, Field(ge=1, le=1024)] | None = None
