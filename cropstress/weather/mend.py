"""Small faults in the data: mended or masked, always counted; a systematic one is a fault of the run.

The rules, by kind:

- temperature_impossible: tmax or tmin outside -90 to 60 degC is masked.
- tmin_above_tmax: by up to 0.5 K, both are set to their mean; by more, masked.
- radiation_below_zero: from -0.1 to 0 MJ m-2 d-1 it is set to 0; below, masked.
- radiation_just_above_top_of_air: by up to 0.1 MJ m-2 d-1 (twilight) it is set to what reaches the
  top of the air.
- radiation_above_top_of_air: by up to 5 % it is set to that; beyond, masked.
- vapour_pressure_below_zero: masked.
- vapour_pressure_above_saturation: by up to 5 % above the mean saturation of tmax and tmin (FAO-56 Eq. 12)
  it is set to that; beyond, masked.
- wind_below_zero: masked.
- pressure_impossible: outside 30 to 110 kPa it is masked.
- rain_below_zero: from -0.1 to 0 mm d-1 it is set to 0; below, masked.

Each is counted by cell and day; counts carry the ending `_mended` or `_masked`. A day masked or missing in
any one variable is missing in all of them: nothing is computed from half a day. The limits are chosen here,
of the size of rounding and interpolation errors.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np

from cropstress.errors import Fault, count_of
from cropstress.weather.humidity import mean_saturation_vapour_pressure
from cropstress.weather.quantities import (
    HIGHEST_PRESSURE,
    HIGHEST_TEMPERATURE,
    LOWEST_PRESSURE,
    LOWEST_TEMPERATURE,
    QUANTITIES,
)

LARGEST_CROSSING = 0.5  # K; tmin above tmax by more is no rounding
NEAR_ZERO = 0.1  # MJ m-2 d-1 (1.2 W m-2: a night offset of a sensor, twilight) or mm d-1
LARGEST_EXCESS = 0.05  # 1; of radiation above the top of the air, of vapour pressure above saturation
ROUNDING = 1e-6  # 1; vapour pressure this close to saturation is at it: float32 holds 6e-8
SYSTEMATIC_SHARE = 0.01  # 1; of the cell-days
FEW = 5  # cell-days; so many are never called systematic, however small the grid
#: Kinds that change nothing of weight however often they come.
HARMLESS = ("radiation_below_zero_mended", "radiation_just_above_top_of_air_mended", "rain_below_zero_mended")

_WORDS = {
    "temperature_impossible": f"temperatures outside {LOWEST_TEMPERATURE:g} to {HIGHEST_TEMPERATURE:g} degC",
    "tmin_above_tmax": "the day's lowest temperature above its highest",
    "radiation_below_zero": "radiation below zero",
    "radiation_just_above_top_of_air": "radiation just above that at the top of the air",
    "radiation_above_top_of_air": "more radiation than reaches the top of the air",
    "vapour_pressure_below_zero": "vapour pressure below zero",
    "vapour_pressure_above_saturation": "vapour pressure above saturation (relative humidity above 100 %)",
    "wind_below_zero": "wind speed below zero",
    "pressure_impossible": f"air pressure outside {LOWEST_PRESSURE:g} to {HIGHEST_PRESSURE:g} kPa",
    "rain_below_zero": "rain below zero",
}


#: The variables each kind is about.
VARIABLES_OF = {
    "temperature_impossible": "tmax, tmin",
    "tmin_above_tmax": "tmax, tmin",
    "radiation_below_zero": "radiation",
    "radiation_just_above_top_of_air": "radiation",
    "radiation_above_top_of_air": "radiation",
    "vapour_pressure_below_zero": "vapour_pressure",
    "vapour_pressure_above_saturation": "vapour_pressure",
    "wind_below_zero": "wind",
    "pressure_impossible": "pressure",
    "rain_below_zero": "rain",
}


@dataclass(frozen=True)
class Worst:
    """The worst value of a kind.

    Attributes
    ----------
    excess : float
        How far beyond the limit.
    index : tuple of int
        Time step, row and column in the block.
    words : str
        The values, in words.
    """

    excess: float
    index: tuple[int, int, int]
    words: str


@dataclass(frozen=True)
class MendedBlock:
    """A block of days after mending.

    Attributes
    ----------
    arrays : dict of str to numpy.ndarray (time, Y, X) of float64
        The variables; a missing day is NaN in all of them.
    mended : numpy.ndarray (time, Y, X) of uint8
        1 where a value was changed and kept.
    counts : dict of str to int
        Cell-days by kind, only those that came up.
    worst : dict of str to Worst
        The worst value of each of these kinds.
    """

    arrays: dict[str, np.ndarray]
    mended: np.ndarray
    counts: dict[str, int]
    worst: dict[str, Worst]


class _Mending:
    """A block being mended."""

    def __init__(self, block: Mapping[str, np.ndarray]) -> None:
        self.arrays = {name: np.array(values, dtype=np.float64) for name, values in block.items()}
        shape = next(iter(self.arrays.values())).shape
        self.mended = np.zeros(shape, dtype=bool)
        self.masked = np.zeros(shape, dtype=bool)
        self.counts: dict[str, int] = {}
        self.worst: dict[str, Worst] = {}

    def mask(self, kind: str, where: np.ndarray, excess: np.ndarray, name: str) -> None:
        """Mark cell-days as missing."""
        self._count(f"{kind}_masked", where, excess, name)
        self.masked |= where

    def mend(
        self, kind: str, where: np.ndarray, excess: np.ndarray, name: str, values: np.ndarray | float
    ) -> None:
        """Replace values of a variable."""
        self._count(f"{kind}_mended", where, excess, name)
        self.arrays[name] = np.where(where, values, self.arrays[name])
        self.mended |= where

    def _count(self, kind: str, where: np.ndarray, excess: np.ndarray, name: str) -> None:
        count = int(where.sum())
        if count:
            self.counts[kind] = count
            flat = int(np.argmax(np.where(where, excess, -np.inf)))
            index = tuple(int(each) for each in np.unravel_index(flat, where.shape))
            words = f"{name} {self.arrays[name][index]:.6g} {QUANTITIES[name].unit}, too far by {excess[index]:.3g}"
            self.worst[kind] = Worst(float(excess[index]), (index[0], index[1], index[2]), words)

    def judge(
        self, kind: str, excess: np.ndarray, limit: np.ndarray | float, name: str, values: object
    ) -> None:
        """Mend what is beyond by no more than a limit, mask the rest."""
        beyond = excess > 0.0
        small = beyond & (excess <= limit)
        self.mask(kind, beyond & ~small, excess, name)
        self.mend(kind, small, excess, name, np.asarray(values))


def mend_block(block: Mapping[str, np.ndarray], extraterrestrial: np.ndarray) -> MendedBlock:
    """Mend or mask the small faults of a block of days by the rules above.

    Parameters
    ----------
    block : mapping of str to numpy.ndarray (time, Y, X)
        `tmax`, `tmin` [degC] and any of `vapour_pressure` [kPa], `radiation` [MJ m-2 d-1], `wind` [m s-1],
        `pressure` [kPa], `rain` [mm d-1]; NaN where missing. All that are given are needed.
    extraterrestrial : numpy.ndarray, broadcast against (time, Y, X)
        Radiation at the top of the air [MJ m-2 d-1].

    Returns
    -------
    MendedBlock
        New arrays; the input is not changed. Each cell and day is judged by itself, so blocks may be cut
        anyhow.
    """
    work = _Mending(block)
    with np.errstate(invalid="ignore", over="ignore"):
        _mend_temperature(work)
        if "radiation" in block:
            _mend_radiation(work, extraterrestrial)
        if "vapour_pressure" in block:
            _mend_vapour_pressure(work)
        if "wind" in block:
            wind = work.arrays["wind"]
            work.mask("wind_below_zero", wind < 0.0, -wind, "wind")
        if "pressure" in block:
            _mask_outside(work, "pressure_impossible", "pressure", LOWEST_PRESSURE, HIGHEST_PRESSURE)
        if "rain" in block:
            work.judge("rain_below_zero", -work.arrays["rain"], NEAR_ZERO, "rain", 0.0)
    missing = work.masked.copy()
    for values in work.arrays.values():
        missing |= np.isnan(values)
    arrays = {name: np.where(missing, np.nan, values) for name, values in work.arrays.items()}
    return MendedBlock(arrays, (work.mended & ~missing).astype(np.uint8), work.counts, work.worst)


def _mask_outside(work: _Mending, kind: str, name: str, low: float, high: float) -> None:
    values = work.arrays[name]
    excess = np.maximum(low - values, values - high)
    work.mask(kind, excess > 0.0, excess, name)


def _mend_temperature(work: _Mending) -> None:
    tmax, tmin = work.arrays["tmax"], work.arrays["tmin"]
    beyond = [np.maximum(LOWEST_TEMPERATURE - each, each - HIGHEST_TEMPERATURE) for each in (tmax, tmin)]
    highest = [np.max(np.where(np.isnan(each), -np.inf, each), initial=-np.inf) for each in beyond]
    excess = np.fmax(*beyond)
    work.mask("temperature_impossible", excess > 0.0, excess, "tmax" if highest[0] >= highest[1] else "tmin")
    crossing = np.where(work.masked, np.nan, tmin - tmax)
    mean = 0.5 * (tmax + tmin)
    work.mask("tmin_above_tmax", crossing > LARGEST_CROSSING, crossing, "tmin")
    small = (crossing > 0.0) & (crossing <= LARGEST_CROSSING)
    work.mend("tmin_above_tmax", small, crossing, "tmin", mean)
    work.arrays["tmax"] = np.where(small, mean, tmax)


def _mend_radiation(work: _Mending, extraterrestrial: np.ndarray) -> None:
    work.judge("radiation_below_zero", -work.arrays["radiation"], NEAR_ZERO, "radiation", 0.0)
    top = np.broadcast_to(extraterrestrial, work.mended.shape)
    excess = work.arrays["radiation"] - top
    work.mend(
        "radiation_just_above_top_of_air", (excess > 0.0) & (excess <= NEAR_ZERO), excess, "radiation", top
    )
    excess = work.arrays["radiation"] - top
    work.judge("radiation_above_top_of_air", excess, LARGEST_EXCESS * top, "radiation", top)


def _mend_vapour_pressure(work: _Mending) -> None:
    pressure = work.arrays["vapour_pressure"]
    work.mask("vapour_pressure_below_zero", pressure < 0.0, -pressure, "vapour_pressure")
    saturation = mean_saturation_vapour_pressure(work.arrays["tmax"], work.arrays["tmin"])
    saturation = np.where(
        work.masked, np.nan, saturation
    )  # an impossible temperature says nothing of humidity
    excess = np.where(pressure > saturation * (1.0 + ROUNDING), pressure - saturation, 0.0)
    work.judge(
        "vapour_pressure_above_saturation", excess, LARGEST_EXCESS * saturation, "vapour_pressure", saturation
    )


def judge_mends(
    counts: Mapping[str, int], cell_days: int, worst: Mapping[str, str | Worst] | None = None
) -> list[Fault]:
    """Tell which small faults are so many that they are systematic.

    Parameters
    ----------
    counts : mapping of str to int
        Cell-days by kind, of all blocks together.
    cell_days : int
        Cell-days that had data [1].
    worst : mapping of str to Worst or str, optional
        The worst example of each kind, better with its place and date in words.

    Returns
    -------
    list of Fault
        One for each kind that comes up in more than 1 % of the cell-days (and more than 5 of them), with the
        counts and the worst example.
    """
    faults = []
    for kind, count in counts.items():
        if kind in HARMLESS or count <= max(SYSTEMATIC_SHARE * cell_days, FEW):
            continue
        stem, _, done = kind.rpartition("_")
        example = (worst or {}).get(kind)
        shown = example.words if isinstance(example, Worst) else example
        share = f"{count} of {cell_days} cell-days ({100.0 * count / cell_days:.1f} %)"
        what = f"{_WORDS[stem]} in {share}, too many to be {done}"
        if shown:
            what += f"; the worst: {shown}"
        remedy = "Check the variable, its unit and its cell method, or mend the files."
        faults.append(Fault(what, f"weather: {VARIABLES_OF[stem]}", remedy))
    return faults


def mend_words(counts: Mapping[str, int]) -> list[str]:
    """Return what was mended or masked, in words for people, most first."""
    ordered = sorted(counts.items(), key=lambda item: -item[1])
    return [
        f"{_WORDS[kind.rpartition('_')[0]]}: {count_of(count, 'cell-day')} {kind.rpartition('_')[2]}"
        for kind, count in ordered
    ]
