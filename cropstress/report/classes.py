"""The classes of the maps: fixed round limits, the same for all crops, scenarios and years."""

from __future__ import annotations

import itertools
from dataclasses import dataclass

import numpy as np

from cropstress.errors import fail, nearest
from cropstress.report import colours
from cropstress.report.phrases import months, number, phrase
from cropstress.season.measures import CAUSES, MEASURES, Measure

#: Limits between the five classes [unit of the measure], and the colours. A value equal to a limit belongs
#: to the class above it. Chosen here: round, and wide enough for a cool and a hot year alike.
_MOL_LOST = (1.0, 3.0, 10.0, 20.0)
_MOL_CAUSE = (0.0, 0.5, 2.0, 5.0)
_DAYS = (5.0, 10.0, 20.0, 40.0)
_FEW_DAYS = (2.0, 4.0, 7.0, 10.0)
#: 1 March, May, July and September of a year that is no leap year [day of the year].
_MONTHS = (60.0, 121.0, 182.0, 244.0)
_MONTH_NUMBERS = (1, 3, 5, 7, 9, 13)

LIMITS: dict[str, tuple[float, ...]] = {
    "assimilation": (30.0, 60.0, 90.0, 120.0),
    "lost_to_heat": _MOL_LOST,
    "lost_to_heat_share": (0.01, 0.05, 0.10, 0.20),
    "lost_to_heat_by_photorespiration": _MOL_CAUSE,
    "lost_to_heat_by_stomata": _MOL_CAUSE,
    "lost_to_heat_by_enzymes": _MOL_CAUSE,
    "lost_to_heat_by_respiration": _MOL_CAUSE,
    "lost_to_photorespiration": (5.0, 20.0, 40.0, 60.0),
    "lost_to_photorespiration_share": (0.01, 0.10, 0.20, 0.30),
    "photorespired_co2": (5.0, 10.0, 20.0, 40.0),
    "hot_days": _DAYS,
    "hot_days_if_cooler": _DAYS,
    "hot_days_if_warmer": _DAYS,
    "hot_days_flowering": _FEW_DAYS,
    "hot_days_flowering_if_cooler": _FEW_DAYS,
    "hot_days_flowering_if_warmer": _FEW_DAYS,
    "hot_leaf_days": _DAYS,
    "hot_hours": (20.0, 50.0, 100.0, 200.0),
    "degree_days_above_limit": (5.0, 20.0, 50.0, 100.0),
    "longest_hot_spell": _FEW_DAYS,
    "longest_hot_spell_start": _MONTHS,
    "first_hot_day": _MONTHS,
    "last_hot_day": _MONTHS,
    "hottest_day": _MONTHS,
    "hottest_temperature": (30.0, 35.0, 40.0, 45.0),
    "warm_nights": _DAYS,
    "warm_nights_flowering": _FEW_DAYS,
    "dry_air_days": (10.0, 20.0, 40.0, 80.0),
    "mean_vapour_pressure_deficit": (1.0, 1.5, 2.0, 3.0),
    "sowing_day": _MONTHS,
    "flowering_day": _MONTHS,
    "maturity_day": _MONTHS,
    "season_days": (90.0, 120.0, 150.0, 180.0),
    "growing_degree_days": (1000.0, 1500.0, 2000.0, 2500.0),
    "missing_days": _FEW_DAYS,
    "mended_days": _FEW_DAYS,
}


@dataclass(frozen=True)
class Classes:
    """The classes of one measure.

    Attributes
    ----------
    measure : Measure
    limits : tuple of float
        Between the classes, rising [unit of the measure]; for flags the flag values.
    colours : tuple of str
        One for each class.
    labels : tuple of str
        One for each class, as the legend shows them.
    hatches : tuple of str
        One for each class, empty for none.
    """

    measure: Measure
    limits: tuple[float, ...]
    colours: tuple[str, ...]
    labels: tuple[str, ...]
    hatches: tuple[str, ...]

    def index(self, values: np.ndarray) -> np.ndarray:
        """Return the class of each value, 0 being the first; values must not be missing.

        Parameters
        ----------
        values : numpy.ndarray
            [unit of the measure]

        Returns
        -------
        numpy.ndarray of int8
        """
        if self.measure.kind == "flag":
            return np.asarray(values).astype(np.int8)
        return np.digitize(values, self.limits).astype(np.int8)


def known_measure(name: str) -> Measure:
    """Return a measure by its name.

    Raises
    ------
    InputError
        When there is no such measure; names the nearest.
    """
    if name in MEASURES:
        return MEASURES[name]
    near = nearest(name, MEASURES)
    raise fail(
        f'there is no measure "{name}"',
        "[maps] measures",
        f'Did you mean "{near}"?' if near else "Take one of: " + ", ".join(MEASURES) + ".",
    )


def classes_for(name: str) -> Classes:
    """Return the classes of a measure.

    Parameters
    ----------
    name : str
        Name of the measure.

    Raises
    ------
    InputError
        When there is no such measure.
    """
    measure = known_measure(name)
    if measure.kind == "flag":
        labels = (phrase("causes.none"), *(phrase(f"causes.{cause}") for cause in CAUSES))
        return Classes(
            measure,
            tuple(float(flag) for flag in range(len(labels))),
            (colours.NONE, *colours.CAUSE),
            labels,
            ("", *colours.CAUSE_HATCH),
        )
    limits = LIMITS[name]
    return Classes(measure, limits, _colours(measure), _labels(measure, limits), ("",) * (len(limits) + 1))


def _colours(measure: Measure) -> tuple[str, ...]:
    if measure.kind == "day_of_year" or measure.name in (
        "assimilation",
        "season_days",
        "growing_degree_days",
        "missing_days",
        "mended_days",
    ):
        return colours.NEUTRAL
    if measure.name.startswith(("lost_", "photorespired_")):
        return colours.LOSS
    return colours.HEAT


def _labels(measure: Measure, limits: tuple[float, ...]) -> tuple[str, ...]:
    if measure.kind == "share":
        percents = [number(100.0 * limit) + " %" for limit in limits]
        return _between(percents, phrase("words.too_small", high=percents[0]))
    if measure.kind == "count":
        return _whole_numbers([round(limit) for limit in limits], measure.zero_is_none)
    if measure.kind == "day_of_year":
        return tuple(
            f"{months()[first - 1]} – {months()[last - 2]}"
            for first, last in itertools.pairwise(_MONTH_NUMBERS)
        )
    texts = [number(limit) for limit in limits]
    first = phrase("words.gain") if limits[0] == 0.0 else phrase("words.less_than", high=texts[0])
    return _between(texts, first)


def _between(texts: list[str], first: str) -> tuple[str, ...]:
    middle = [
        phrase("words.range_of_amounts", low=low.removesuffix(" %"), high=high)
        for low, high in itertools.pairwise(texts)
    ]
    return (first, *middle, phrase("words.and_more", low=texts[-1]))


def _whole_numbers(limits: list[int], zero_apart: bool) -> tuple[str, ...]:
    if zero_apart:
        first = "1" if limits[0] == 2 else phrase("words.range", low=1, high=limits[0] - 1)
    else:
        first = phrase("words.less_than", high=limits[0])
    middle = [
        str(low) if high == low + 1 else phrase("words.range", low=low, high=high - 1)
        for low, high in itertools.pairwise(limits)
    ]
    return (first, *middle, phrase("words.and_more", low=limits[-1]))
