"""Conversion of units, with the unit registry of cf-xarray (pint with CF spellings)."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
import pint
from cf_xarray.units import units as registry

from cropstress.weather.quantities import Quantity

#: Spellings seen in files that the registry does not read, or reads wrongly.
SPELLINGS = {
    "degrees_c": "degC",
    "degrees c": "degC",
    "degree c": "degC",
    "deg c": "degC",
    "deg_c": "degC",
    "degrees celsius": "degC",
    "degree celsius": "degC",
    "degrees_celsius": "degC",
    "degrees kelvin": "K",
    "degk": "K",
    "unitless": "1",
    "fraction": "1",
}
_FAR = 2.0**20  # far from 0, so that a conversion's slope is exact to rounding


class UnitError(ValueError):
    """A unit that cannot be read or that does not fit."""


@dataclass(frozen=True)
class Conversion:
    """A linear conversion: value × factor + offset.

    Attributes
    ----------
    factor, offset : float
        In the target unit.
    is_sum : bool
        True where the value is a sum over the day.
    words : str
        What is done, for people.
    """

    factor: float
    offset: float
    is_sum: bool
    words: str

    def apply(self, values: Any) -> Any:
        """Convert an array (NumPy or dask), as float64; one that needs no conversion stays as it is."""
        if self.factor == 1.0 and self.offset == 0.0:
            return values
        return values.astype(np.float64) * self.factor + self.offset


def read_unit(text: str) -> pint.Unit:
    """Read a unit.

    Raises
    ------
    UnitError
        If the registry does not know it.
    """
    spelling = SPELLINGS.get(text.strip().lower(), text.strip())
    try:
        return registry.Unit(spelling)
    except Exception as error:  # the parser raises many kinds, down to failed assertions
        raise UnitError(f"the unit '{text}' cannot be read") from error


def linear(source: pint.Unit, target: pint.Unit) -> tuple[float, float]:
    """Return factor and offset that turn values in one unit into another of the same kind.

    Raises
    ------
    UnitError
        If they are not of the same kind.
    """
    try:
        offset = float(registry.Quantity(0.0, source).to(target).magnitude)
        far = float(registry.Quantity(_FAR, source).to(target).magnitude)
    except pint.errors.PintError as error:
        raise UnitError(f"'{source}' is not a unit like '{target}'") from error
    # Fifteen digits: what pint adds by rounding (0.08639999999999999) is not part of any unit.
    return float(f"{(far - offset) / _FAR:.15g}"), float(f"{offset:.15g}")


def conversion(text: str, quantity: Quantity) -> Conversion:
    """Find how to convert a unit to the canonical one of a quantity.

    Parameters
    ----------
    text : str
        Unit as a file or the run file gives it.
    quantity : Quantity
        What it measures.

    Returns
    -------
    Conversion

    Raises
    ------
    UnitError
        If the unit cannot be read or does not fit the quantity.
    """
    source = read_unit(text)
    for form in quantity.forms:
        target = registry.Unit(form.unit)
        if source.dimensionality == target.dimensionality:
            factor, offset = linear(source, target)
            return Conversion(
                factor, offset, form.is_sum, _words(text, quantity.unit, factor, offset, form.is_sum)
            )
    fits = " or ".join(quantity.usual_units)
    raise UnitError(f"the unit '{text}' does not fit {quantity.meaning}, which comes in units like {fits}")


def to_unit(text: str, target: str) -> Conversion:
    """Find how to convert one unit to another of the same kind; raises UnitError if there is no way."""
    factor, offset = linear(read_unit(text), read_unit(target))
    return Conversion(factor, offset, False, _words(text, target, factor, offset, False))


def _words(source: str, target: str, factor: float, offset: float, is_sum: bool) -> str:
    steps = ([f"× {factor:g}"] if factor != 1.0 else []) + ([f"{offset:+g}"] if offset else [])
    kind = "day's sum in " if is_sum else ""
    return f"{kind}{source} to {target}: {' '.join(steps)}" if steps else f"{kind}{source}: as it is"
