"""Recognise the variables: by standard name, cell method and unit, or as the run file names them."""

from __future__ import annotations

import re
from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Any

import xarray as xr

from cropstress.errors import Fault, nearest
from cropstress.weather.open import OpenFile
from cropstress.weather.quantities import QUANTITIES, Quantity
from cropstress.weather.units import UnitError, conversion

#: What a run file writes for a variable's name so that it is left out.
LEFT_OUT = "none"


@dataclass(frozen=True)
class Override:
    """What the run file says of a variable because the files do not.

    Attributes
    ----------
    name : str or None
        Its name in the files; "none" leaves it out.
    unit : str or None
        Unit, instead of the file's.
    cell_method : str or None
        Cell method over time, where the file gives none; with a name also instead of the file's.
    height : float or None
        Height above the ground, instead of the file's [m].
    """

    name: str | None = None
    unit: str | None = None
    cell_method: str | None = None
    height: float | None = None


@dataclass(frozen=True)
class Match:
    """A variable that was found.

    Attributes
    ----------
    quantity : Quantity
        What it is.
    name : str
        Its name in the files.
    files : tuple of OpenFile
        The files that hold it.
    reason : str
        Why it was chosen.
    override : Override
        What the run file says of it.
    """

    quantity: Quantity
    name: str
    files: tuple[OpenFile, ...]
    reason: str
    override: Override


@dataclass
class Recognised:
    """What was found in the files.

    Attributes
    ----------
    matches : dict of str to Match
        By quantity.
    near : dict of str to list of str
        Variables that have the right standard name and still do not fit, and why, by quantity.
    left_out : set of str
        Quantities the run file leaves out.
    missing : list of Fault
        What is needed and was not found.
    faults : list of Fault
        Anything else that is wrong.
    remarks : list of str
    """

    matches: dict[str, Match] = field(default_factory=dict)
    near: dict[str, list[str]] = field(default_factory=dict)
    left_out: set[str] = field(default_factory=set)
    missing: list[Fault] = field(default_factory=list)
    faults: list[Fault] = field(default_factory=list)
    remarks: list[str] = field(default_factory=list)


def read_overrides(variables: Mapping[str, Any] | None) -> tuple[dict[str, Override], list[Fault]]:
    """Check what the run file says of the variables.

    Parameters
    ----------
    variables : mapping of str to mapping
        By quantity: `name`, `unit`, `cell_method`, `height`.

    Returns
    -------
    dict of str to Override
    list of Fault
        Unknown quantities or keys, cell methods and units that do not fit.
    """
    overrides: dict[str, Override] = {}
    faults: list[Fault] = []
    keys = tuple(Override.__dataclass_fields__)
    for name, said in (variables or {}).items():
        where = f"weather.variables.{name}"
        quantity = QUANTITIES.get(name)
        if quantity is None:
            alike = nearest(name, QUANTITIES)
            remedy = f"Did you mean '{alike}'?" if alike else f"Known are {', '.join(QUANTITIES)}."
            faults.append(Fault(f"there is no weather variable '{name}'", where, remedy))
            continue
        unknown = [key for key in said if key not in keys]
        faults += [Fault(f"unknown key '{key}'", where, f"Known are {', '.join(keys)}.") for key in unknown]
        override = Override(**{key: value for key, value in said.items() if key in keys})
        faults += _override_faults(quantity, override, where)
        overrides[name] = override
    return overrides, faults


def _override_faults(quantity: Quantity, override: Override, where: str) -> list[Fault]:
    faults = []
    method = override.cell_method
    if method is not None and method not in quantity.cell_methods:
        fits = " or ".join(quantity.cell_methods)
        alike = f"{quantity.name}_{method}"
        remedy = f"Call it '{alike}' instead." if alike in QUANTITIES else f"{quantity.meaning} needs {fits}."
        faults.append(Fault(f"the cell method '{method}' does not fit {quantity.meaning}", where, remedy))
    if override.unit is not None:
        try:
            conversion(override.unit, quantity)
        except UnitError as error:
            usual = " or ".join(f'"{each}"' for each in quantity.usual_units)
            faults.append(Fault(str(error), f"{where}.unit", f"For example unit = {usual}."))
    if override.height is not None and quantity.name != "wind":
        faults.append(Fault("a height is only used for wind", f"{where}.height", "Take the key out."))
    if override.name == LEFT_OUT and quantity.is_needed:
        faults.append(
            Fault(f"nothing can be computed without {quantity.meaning}", f"{where}.name", "Name it.")
        )
    return faults


def recognise(files: list[OpenFile], overrides: Mapping[str, Override]) -> Recognised:
    """Find every quantity in the files.

    Parameters
    ----------
    files : list of OpenFile
        The files.
    overrides : mapping of str to Override
        By quantity.

    Returns
    -------
    Recognised
        Two variables that fit a quantity equally well are a fault that names both. Nothing found is a fault
        only for what is needed.
    """
    found = Recognised()
    named = {
        override.name: key for key, override in overrides.items() if override.name not in (None, LEFT_OUT)
    }
    for key, quantity in QUANTITIES.items():
        override = overrides.get(key, Override())
        if override.name == LEFT_OUT:
            found.left_out.add(key)
            continue
        if override.name is not None:
            _find_named(files, quantity, override, found)
        else:
            _find_by_attributes(files, quantity, override, found, {name for name in named if name})
    return found


def _find_named(files: list[OpenFile], quantity: Quantity, override: Override, found: Recognised) -> None:
    name = str(override.name)
    where = f"weather.variables.{quantity.name}.name"
    holding = tuple(file for file in files if name in file.dataset.variables)
    if not holding:
        alike = nearest(name, {str(each) for file in files for each in file.dataset.variables})
        remedy = f"Did you mean '{alike}'?" if alike else f"The files hold: {contents(files)}."
        found.faults.append(Fault(f"no file holds a variable '{name}'", where, remedy))
        return
    for file in holding:
        variable = file.dataset.variables[name]
        if variable.dtype.kind not in "fiu" or variable.ndim < 2:
            dimensions = ", ".join(map(str, variable.dims)) or "none"
            what = f"it is no grid of numbers; its dimensions: {dimensions}"
            found.faults.append(Fault(what, f"{file.label}: {name}", "Name another variable."))
            return
        method = override.cell_method or cell_method(file.dataset, name)
        if method is not None and method not in quantity.cell_methods:
            what = f"its cell method over time is '{method}', which does not fit {quantity.meaning}"
            right = quantity.cell_methods[0]
            remedy = f'Name another variable, or, if the file is wrong, add cell_method = "{right}".'
            found.faults.append(Fault(what, f"{file.label}: {name}", remedy))
            return
    found.matches[quantity.name] = Match(quantity, name, holding, "named in the run file", override)


def _find_by_attributes(
    files: list[OpenFile], quantity: Quantity, override: Override, found: Recognised, named: set[str]
) -> None:
    by_standard_name: dict[str, list[tuple[OpenFile, str]]] = {}
    by_other_name: dict[str, list[tuple[OpenFile, str]]] = {}
    for file in files:
        for key, variable in file.dataset.variables.items():
            name = str(key)
            # what the run file names for one quantity is not taken for another
            if name in named or variable.ndim < 2 or variable.dtype.kind not in "fiu":
                continue
            standard_name = str(variable.attrs.get("standard_name", ""))
            method = cell_method(file.dataset, name) or override.cell_method
            if standard_name in quantity.standard_names:
                misfit = _misfit(quantity, method)
                if misfit:
                    found.near.setdefault(quantity.name, []).append(f"'{name}' in {file.label} ({misfit})")
                    continue
                words = f"standard name {standard_name}" + (f", cell method {method}" if method else "")
                by_standard_name.setdefault(name, []).append((file, words))
                continue
            other = _other_name(variable, quantity, method, override)
            if other:
                by_other_name.setdefault(name, []).append(
                    (file, f"its name in words, '{other}', and its unit")
                )
    chosen = by_standard_name or by_other_name
    if len(chosen) > 1:
        found.faults.append(_two_candidates(chosen, quantity))
    elif chosen:
        name, holding = next(iter(chosen.items()))
        reason = holding[0][1]
        match = Match(quantity, name, tuple(file for file, _ in holding), reason, override)
        found.matches[quantity.name] = match
        if not by_standard_name:
            label = holding[0][0].label
            found.remarks.append(
                f"{label}: '{name}' is taken as {quantity.meaning} by {reason}, not by a CF standard name"
            )
    elif quantity.is_needed:
        found.missing.append(not_found(files, quantity, found.near.get(quantity.name, [])))


def _misfit(quantity: Quantity, method: str | None) -> str:
    """Return why a cell method does not fit, or nothing."""
    if method is None:
        fits = quantity.cell_methods[0]
        return f"no cell method over time; '{fits}' is needed" if quantity.method_needed else ""
    return "" if method in quantity.cell_methods else f"cell method '{method}'"


def _other_name(variable: xr.Variable, quantity: Quantity, method: str | None, override: Override) -> str:
    """Return the clear name a variable is known by, where its unit and cell method agree; else nothing."""
    names = [str(variable.attrs.get(key, "")) for key in ("long_name", "standard_name")]
    fitting = [name for name in names if _in_words(name) in quantity.other_names]
    if not fitting or (method is not None and method not in quantity.cell_methods):
        return ""
    try:
        conversion(override.unit or str(variable.attrs.get("units", "")), quantity)
    except UnitError:
        return ""
    return fitting[0]


def _in_words(name: str) -> str:
    return " ".join(name.lower().replace("_", " ").split())


def _two_candidates(chosen: dict[str, list[tuple[OpenFile, str]]], quantity: Quantity) -> Fault:
    listed = "; ".join(
        f"'{name}' in {holding[0][0].label} ({holding[0][1]})" for name, holding in chosen.items()
    )
    names = " or ".join(f'"{name}"' for name in chosen)
    return Fault(
        f"{len(chosen)} variables fit {quantity.meaning} equally well: {listed}",
        f"weather.files: {quantity.name}",
        f"Say which: [weather.variables.{quantity.name}] name = {names}.",
    )


def not_found(files: list[OpenFile], quantity: Quantity, near: list[str]) -> Fault:
    """Return the fault that a quantity is not in the files: what was looked for, and what they hold."""
    what = f"no variable for {quantity.meaning} was found: looked for {looked_for(quantity)}"
    if near:
        what += f"; not taken: {', '.join(near)}"
    what += f"; the files hold: {contents(files)}"
    remedy = f'If one of these is it, say so: [weather.variables.{quantity.name}] name = "...".'
    return Fault(what, f"weather.files: {quantity.name}", remedy)


def no_elevation(recognised: Recognised, files: list[OpenFile]) -> list[Fault]:
    """Return the fault that the file named for elevation holds none: it is not silently left out."""
    match = recognised.matches.get("elevation")
    told = any(fault.where.endswith(("elevation", "elevation.name")) for fault in recognised.faults)
    if not files or told or (match is not None and files[0] in match.files):
        return []
    quantity = QUANTITIES["elevation"]
    what = f"this file has no {quantity.meaning}: looked for {looked_for(quantity)}; found {contents(files)}"
    remedy = 'If one of these is it, say so: [places] elevation = { file = "...", name = "..." }.'
    return [Fault(what, files[0].label, remedy)]


def looked_for(quantity: Quantity) -> str:
    """Return the standard names and cell methods a quantity is looked for by, in words."""
    names = " or ".join(f"'{name}'" for name in quantity.standard_names)
    method = f" with the cell method 'time: {quantity.cell_methods[0]}'" if quantity.method_needed else ""
    return f"the standard name {names}{method}"


def contents(files: list[OpenFile], most: int = 20) -> str:
    """Return which variables the files hold, in words; each once, with the first file that holds it."""
    held: dict[str, str] = {}
    first: dict[str, str] = {}
    for file in files:
        for name, variable in file.dataset.data_vars.items():
            known = (
                variable.attrs.get("standard_name") or variable.attrs.get("long_name") or "no standard name"
            )
            held.setdefault(str(name), f"{name} ({known})")
            first.setdefault(str(name), file.label)
    if not held:
        return "nothing"
    by_file: dict[str, list[str]] = {}
    for name in list(held)[:most]:
        by_file.setdefault(first[name], []).append(held[name])
    words = "; ".join(f"{label}: {', '.join(names)}" for label, names in by_file.items())
    return words + (f" and {len(held) - most} more" if len(held) > most else "")


def cell_method(dataset: xr.Dataset, name: str) -> str | None:
    """Return the cell method over time of a variable, or None where the file gives none.

    Of "time: maximum within days time: mean over days" it is the first.
    """
    variable = dataset.variables[name]
    text = str(variable.attrs.get("cell_methods", ""))
    for axes, method in re.findall(r"((?:[\w.]+:\s+)+)(\w+)", text):
        if _over_time(axes, variable.dims):
            return {"max": "maximum", "min": "minimum", "average": "mean"}.get(method, method)
    return None


def _over_time(axes: str, dimensions: tuple[Any, ...]) -> bool:
    names = [axis.rstrip(":") for axis in axes.split()]
    return "time" in names or (bool(dimensions) and str(dimensions[0]) in names and len(dimensions) > 2)
