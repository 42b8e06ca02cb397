"""Look at a few days of every layer, whether the values are what their names and units say.

Only sampled days are read, those in one chunk of time together. What is judged here is what would make a
whole run worthless: wrong units, swapped variables, empty files. Small faults of single cells are left to
`mend`.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Mapping
from dataclasses import dataclass, field

import dask
import numpy as np

from cropstress.errors import Fault, count_of
from cropstress.weather.extraterrestrial import extraterrestrial_radiation
from cropstress.weather.humidity import mean_saturation_vapour_pressure
from cropstress.weather.layers import Layer
from cropstress.weather.mend import LARGEST_CROSSING, LARGEST_EXCESS, NEAR_ZERO, SYSTEMATIC_SHARE
from cropstress.weather.quantities import QUANTITIES

SAMPLED_DAYS = 4
MORE_DAYS = 12  # looked at where the first ones hold nothing at all
FEW = 2  # values; so many are never called systematic, however small the sample

# Signs of a wrong unit; chosen here, far from any weather.
WARMEST_MEDIAN, COLDEST_MEDIAN = 100.0, -100.0  # degC: kelvin called Celsius, Celsius called kelvin
FARTHEST_MEDIAN = 400.0  # degC: beyond it, neither explains the values
HIGHEST_FRACTION = 1.5  # %: relative humidity that never exceeds it is a fraction
HIGHEST_PERCENT = 1000.0  # %: relative humidity above it is percent called a fraction
LEAST_CLEARNESS = 0.01  # 1; share of the radiation at the top of the air that even overcast days exceed
LEAST_SATURATION = 0.005  # 1; share of the saturation pressure that even deserts exceed
LEAST_TOP_OF_AIR = 5.0  # MJ m-2 d-1; below it, in the polar night, radiation is not judged for being small

Sample = dict[str, np.ndarray]


@dataclass
class Tally:
    """What the sampled days of one check came to.

    Attributes
    ----------
    bad, all : int
        Values that fail, and values looked at.
    worst : float
        How far beyond the limit the worst one is.
    words : str
        The worst one in words.
    """

    bad: int = 0
    all: int = 0
    worst: float = -np.inf
    words: str = ""

    def add(self, excess: np.ndarray, describe: Callable[[tuple[int, int]], str]) -> None:
        """Count what is above 0."""
        there = np.isfinite(excess)
        self.all += int(there.sum())
        beyond = there & (excess > 0.0)
        if beyond.any():
            self.bad += int(beyond.sum())
            row, column = np.unravel_index(int(np.argmax(np.where(beyond, excess, -np.inf))), excess.shape)
            at = (int(row), int(column))
            if excess[at] > self.worst:
                self.worst, self.words = float(excess[at]), describe(at)

    def is_more_than(self, share: float) -> bool:
        """Tell whether more than a share of the values fail, and more than a few."""
        return self.bad > max(share * self.all, FEW)

    @property
    def share(self) -> str:
        """The share that fails, in words."""
        return f"{self.bad} of {self.all} values looked at"


@dataclass
class Inspection:
    """What the sampled days show.

    Attributes
    ----------
    ranges : dict of str to (float, float)
        Lowest and highest value of each layer in the sample [canonical unit].
    faults : list of Fault
    """

    ranges: dict[str, tuple[float, float]] = field(default_factory=dict)
    faults: list[Fault] = field(default_factory=list)


def inspect(
    layers: Mapping[str, Layer],
    latitude: np.ndarray | None,
    humidity: Callable[[Sample], np.ndarray] | None,
    days_of_year: np.ndarray,
) -> Inspection:
    """Look at a few days of every layer.

    Parameters
    ----------
    layers : mapping of str to Layer
        By quantity; those in time share one axis and one grid.
    latitude : numpy.ndarray (Y, X) or None
        Latitude of the cells [degree]; None where it is not known.
    humidity : callable or None
        Computes the vapour pressure [kPa] from one day's values; None where there is no humidity.
    days_of_year : numpy.ndarray (time,)
        Day of the year of every time step [d].

    Returns
    -------
    Inspection
    """
    look = _Look(layers, latitude, humidity, days_of_year)
    timed = [layer for layer in layers.values() if layer.days is not None]
    if timed:
        count = int(timed[0].data.shape[0])
        look.read(_spread_out(count, SAMPLED_DAYS))
        if look.empty():
            look.read(sorted(set(_spread_out(count, MORE_DAYS)) - set(look.seen)))
    for layer in layers.values():
        if layer.days is None:
            look.static(layer)
    return look.judged()


def _spread_out(count: int, wanted: int) -> list[int]:
    return sorted({round(step) for step in np.linspace(0, count - 1, min(wanted, count))})


def _by_chunk(steps: list[int], layer: Layer) -> list[list[int]]:
    """Group steps by the chunk of time they lie in: a chunk is read whole, so it should be read once."""
    ends = np.cumsum(layer.data.chunks[0])
    chunks = np.searchsorted(ends, steps, side="right")
    return [
        [step for step, at in zip(steps, chunks, strict=True) if at == chunk] for chunk in np.unique(chunks)
    ]


class _Look:
    """The sampled days, as they come."""

    def __init__(
        self,
        layers: Mapping[str, Layer],
        latitude: np.ndarray | None,
        humidity: Callable[[Sample], np.ndarray] | None,
        days_of_year: np.ndarray,
    ) -> None:
        self.layers = layers
        self.latitude = latitude
        self.humidity = humidity
        self.days_of_year = days_of_year
        self.seen: list[int] = []
        self.tallies: dict[tuple[str, str], Tally] = {}
        self.values: dict[str, list[tuple[float, float, float]]] = {name: [] for name in layers}

    def read(self, steps: Iterable[int]) -> None:
        """Read some days, those in one chunk of time together, and check them."""
        timed = {name: layer for name, layer in self.layers.items() if layer.days is not None}
        for together in _by_chunk(list(steps), next(iter(timed.values()))):
            read = dask.compute(*(layer.data[together] for layer in timed.values()))
            for place, step in enumerate(together):
                self.seen.append(step)
                sample = {
                    name: each[place].astype(np.float64) for name, each in zip(timed, read, strict=True)
                }
                for name, values in sample.items():
                    self._note(name, values)
                with np.errstate(invalid="ignore", over="ignore", divide="ignore"):
                    self._check(sample, step)

    def static(self, layer: Layer) -> None:
        """Read and check a layer that does not change in time."""
        values = np.asarray(layer.data.compute(), dtype=np.float64)
        self._note(layer.quantity.name, values)
        self._range(layer.quantity.name, values, None)

    def empty(self) -> list[str]:
        """Return the layers without a single value so far."""
        return [
            name for name, values in self.values.items() if not values and self.layers[name].days is not None
        ]

    def _note(self, name: str, values: np.ndarray) -> None:
        finite = values[np.isfinite(values)]
        if finite.size:
            self.values[name].append((float(finite.min()), float(np.median(finite)), float(finite.max())))

    def _tally(self, check: str, name: str, excess: np.ndarray, step: int | None, shown: Sample) -> None:
        """Count the values of one layer that fail one check; `shown` is what the worst example tells."""
        layer = self.layers[name]
        day = (
            "" if step is None or layer.days is None else f" on {layer.days.words(layer.days.numbers[step])}"
        )

        def describe(at: tuple[int, int]) -> str:
            values = ", ".join(f"{each} {array[at]:.5g} {_unit_of(each, layer)}" for each, array in shown.items())
            grid = layer.grid
            return (
                f"{values}{day} at {grid.row} {grid.rows[at[0]]:.6g}, {grid.column} {grid.columns[at[1]]:.6g}"
            )

        self.tallies.setdefault((check, name), Tally()).add(excess, describe)

    def _range(self, name: str, values: np.ndarray, step: int | None) -> None:
        quantity = self.layers[name].quantity
        excess = np.maximum(quantity.low - values, values - quantity.high)
        self._tally("range", name, excess, step, {name: values})

    def _check(self, sample: Sample, step: int) -> None:
        for name, values in sample.items():
            self._range(name, values, step)
        if "relative_humidity_maximum" in sample and "relative_humidity_minimum" in sample:
            high, low = sample["relative_humidity_maximum"], sample["relative_humidity_minimum"]
            shown = {"relative_humidity_maximum": high, "relative_humidity_minimum": low}
            self._tally("swapped", "relative_humidity_maximum", low - high, step, shown)
        if "radiation" in sample:
            radiation = sample["radiation"]
            self._tally("negative", "radiation", -NEAR_ZERO - radiation, step, {"radiation": radiation})
            if self.latitude is not None:
                self._check_radiation(radiation, self.latitude, step)
        if "tmax" in sample and "tmin" in sample:
            tmax, tmin = sample["tmax"], sample["tmin"]
            self._tally("swapped", "tmax", tmin - tmax - LARGEST_CROSSING, step, {"tmax": tmax, "tmin": tmin})
            if self.humidity is not None:
                self._check_humidity(sample, step)

    def _check_radiation(self, radiation: np.ndarray, latitude: np.ndarray, step: int) -> None:
        top = np.broadcast_to(extraterrestrial_radiation(self.days_of_year[step], latitude), radiation.shape)
        shown = {"radiation": radiation, "at the top of the air": top}
        above = radiation - np.maximum((1.0 + LARGEST_EXCESS) * top, top + NEAR_ZERO)
        self._tally("above the top of the air", "radiation", above, step, shown)
        small = np.where(top > LEAST_TOP_OF_AIR, LEAST_CLEARNESS * top - radiation, np.nan)
        self._tally("too small", "radiation", small, step, shown)

    def _check_humidity(self, sample: Sample, step: int) -> None:
        assert self.humidity is not None
        name = next(name for name in sample if name in _HUMIDITY_NAMES)
        pressure = self.humidity(sample)
        saturation = mean_saturation_vapour_pressure(sample["tmax"], sample["tmin"])
        shown = {name: sample[name], "tmax": sample["tmax"], "tmin": sample["tmin"]}
        self._tally("above saturation", name, pressure - (1.0 + LARGEST_EXCESS) * saturation, step, shown)
        self._tally("too small", name, LEAST_SATURATION * saturation - pressure, step, shown)

    def judged(self) -> Inspection:
        """Return ranges and faults; a layer that fails one check is not judged by the later ones."""
        inspection = Inspection()
        broken: set[str] = set()
        for name, layer in self.layers.items():
            values = self.values[name]
            if not values:
                days = "" if layer.days is None else f" on the {count_of(len(self.seen), 'day')} looked at"
                what = f"all values are missing{days}"
                remedy = "Check the file and its fill value: the variable holds nothing."
                inspection.faults.append(Fault(what, layer.where, remedy))
                broken.add(name)
                continue
            inspection.ranges[name] = (min(low for low, _, _ in values), max(high for _, _, high in values))
            fault = self._unit_fault(
                layer, inspection.ranges[name], float(np.median([each for _, each, _ in values]))
            )
            if fault is not None:
                inspection.faults.append(fault)
                broken.add(name)
        for (check, name), tally in self.tallies.items():
            limit = 0.5 if check == "too small" else SYSTEMATIC_SHARE  # single dark or dry places are real
            if name not in broken and tally.is_more_than(limit) and not self._rests_on_broken(check, broken):
                inspection.faults.append(_fault(check, self.layers[name], tally))
                broken.add(name)
        return inspection

    @staticmethod
    def _rests_on_broken(check: str, broken: set[str]) -> bool:
        """Tell whether a check compares with temperatures that are themselves wrong."""
        return check in ("swapped", "above saturation", "too small") and bool(broken & {"tmax", "tmin"})

    def _unit_fault(self, layer: Layer, span: tuple[float, float], median: float) -> Fault | None:
        """Return the fault that values are those of another unit than is said."""
        name, unit = layer.quantity.name, layer.quantity.forms[0].unit
        found = ""
        if unit == "degC" and WARMEST_MEDIAN < median < FARTHEST_MEDIAN:
            found = "K"
        elif unit == "degC" and -FARTHEST_MEDIAN < median < COLDEST_MEDIAN:
            found = "degC"
        elif unit == "percent" and 0.0 < span[1] <= HIGHEST_FRACTION:
            found = "1"
        elif unit == "percent" and median > HIGHEST_PERCENT:
            found = "%"
        if not found:
            return None
        kind = {"K": "kelvin", "degC": "degrees Celsius", "1": "a fraction", "%": "percent"}[found]
        what = (
            f"the unit is said to be '{layer.unit}', but the values look like {kind}: read so they would be "
            f"{span[0]:.4g} to {span[1]:.4g} {layer.quantity.unit}"
        )
        remedy = f'If so, say it in the run file: [weather.variables.{name}] unit = "{found}".'
        return Fault(what, layer.where, remedy)


_HUMIDITY_NAMES = (
    "vapour_pressure", "dew_point", "specific_humidity", "relative_humidity_maximum", "relative_humidity",
    "vapour_pressure_deficit",
)  # fmt: skip


def _unit_of(name: str, layer: Layer) -> str:
    return QUANTITIES[name].unit if name in QUANTITIES else layer.quantity.unit


def _fault(check: str, layer: Layer, tally: Tally) -> Fault:
    """Return the fault of a check that failed too often."""
    quantity = layer.quantity
    name, unit = quantity.name, f"(unit {layer.conversion})"
    say_unit = f'[weather.variables.{name}] unit = "..."'
    example = f"for example {tally.words}"
    if check == "swapped":
        low = "tmin" if name == "tmax" else "relative_humidity_minimum"
        what = f"{name} is below {low} in {tally.share}, {example}"
        remedy = (
            f"If they are swapped, name each and its cell method: [weather.variables.{name}] name = ..., "
            f'cell_method = "maximum" and [weather.variables.{low}] name = ..., cell_method = "minimum"; '
            "else mend the files."
        )
    elif check == "negative":
        what = f"radiation is negative in {tally.share}, {example}"
        remedy = "Name the downward radiation, not a net or an upward one, or mend the files."
    elif check == "above the top of the air":
        what = f"more radiation than reaches the top of the air in {tally.share} {unit}, {example}"
        remedy = (
            f"The unit or the cell method is wrong, or the days are shifted: check them; the run file may say "
            f"{say_unit}."
        )
    elif check == "above saturation":
        what = f"humidity is above saturation by more than 5 % in {tally.share} {unit}, {example}"
        remedy = f"The unit or the variable is wrong: check them; the run file may say {say_unit}."
    elif check == "too small":
        what = f"{quantity.meaning} is too small to be true in {tally.share} {unit}, {example}"
        remedy = f"The unit or the variable is wrong: check them; the run file may say {say_unit}."
    else:
        limits = f"{quantity.low:g} to {quantity.high:g} {quantity.unit}"
        what = f"values outside the possible {limits} in {tally.share} {unit}, {example}"
        remedy = f"The unit or the fill value is wrong: check them; the run file may say {say_unit}."
    return Fault(what, layer.where, remedy)
