"""The counts of a season over again, day by day in plain Python: an oracle for what needs only tmax and tmin."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from cropstress.crops import CropProfile

ROUNDING = 1e-3  # K: 35 degC as float32 kelvin comes back as 34.999994 degC


@dataclass(frozen=True)
class Season:
    """Days of a season by number: each with its stage, and the days of the flowering window."""

    days: list[int]
    stages: list[int]
    degree_days: float
    matured: bool
    flowering: int | None
    window: list[int]


def gained(crop: CropProfile, highest: float, lowest: float) -> float:
    """Growing degree days of a day [K d]."""
    base, ceiling = crop.number("base_temperature"), crop.number("ceiling_temperature")
    return max(min((highest + lowest) / 2.0, ceiling) - base, 0.0)


def season_of(crop: CropProfile, highest: np.ndarray, lowest: np.ndarray, sowing: int, thermal: bool) -> Season:
    """Walk the stages from sowing to maturity or the end of the data."""
    lengths = crop.thermal_sums if thermal else crop.days
    assert lengths is not None
    ends = np.cumsum(lengths)
    days, stages = [], []
    progress = heat = 0.0
    flowering = None
    if crop.flowering_offset is not None and not thermal:
        flowering = sowing + crop.days[0] + crop.days[1] + crop.flowering_offset
    for day in range(sowing, len(highest)):
        stage = int(np.searchsorted(ends[:3], progress, side="right"))
        if thermal and stage >= 2 and flowering is None and crop.flowering_offset is not None:
            flowering = day + crop.flowering_offset
        days.append(day)
        stages.append(stage)
        today = 0.0 if math.isnan(highest[day]) else gained(crop, highest[day], lowest[day])
        heat += today
        progress += today if thermal else 1.0
        if progress >= ends[3] - 1e-9:
            break
    matured = progress >= ends[3] - 1e-9
    window: list[int] = []
    if flowering is not None and crop.flowering_window is not None:
        start, end = crop.flowering_window
        window = [day for day in days if flowering + start <= day <= flowering + end]
    return Season(days, stages, heat, matured, flowering, window)


def plain_counts(
    crop: CropProfile, highest: np.ndarray, lowest: np.ndarray, sowing: int, thermal: bool = False
) -> dict[str, float]:
    """Every count that needs only tmax and tmin; days are numbers from 0, NaN for none."""
    season = season_of(crop, highest, lowest, sowing, thermal)
    there = [day for day in season.days if not math.isnan(highest[day])]

    def above(limit: str, shift: float = 0.0, of: list[int] = there, values: np.ndarray = highest) -> list[int]:
        return [day for day in of if values[day] + shift > crop.number(limit) + ROUNDING]

    hot = above("hot_day_limit")
    spells = longest_spell(hot)
    counts: dict[str, float] = {
        "hot_days": len(hot),
        "hot_days_if_cooler": len(above("hot_day_limit", -1.0)),
        "hot_days_if_warmer": len(above("hot_day_limit", 1.0)),
        "warm_nights": len(above("warm_night_limit", values=lowest)),
        "longest_hot_spell": spells[0],
        "longest_hot_spell_start": spells[1],
        "first_hot_day": hot[0] if hot else math.nan,
        "last_hot_day": hot[-1] if hot else math.nan,
        "hottest_day": max(there, key=lambda day: highest[day]),
        "hottest_temperature": max(highest[day] for day in there),
        "season_days": len(season.days),
        "missing_days": len(season.days) - len(there),
        "growing_degree_days": season.degree_days,
        "sowing_day": sowing,
        "maturity_day": season.days[-1] if season.matured else math.nan,
    }
    if season.window:
        window = [day for day in season.window if day in there]
        counts |= {
            "hot_days_flowering": len(above("flowering_limit", of=window)),
            "hot_days_flowering_if_cooler": len(above("flowering_limit", -1.0, window)),
            "hot_days_flowering_if_warmer": len(above("flowering_limit", 1.0, window)),
            "warm_nights_flowering": len(above("warm_night_limit", of=window, values=lowest)),
        }
    for stage in range(4):
        counts[f"hot_days_by_stage {stage}"] = sum(season.stages[season.days.index(day)] == stage for day in hot)
    return counts


def longest_spell(hot: list[int]) -> tuple[int, float]:
    """Length and first day of the longest run of consecutive days, the first of equals."""
    best, start, length = (0, math.nan), -1, 0
    for number, day in enumerate(hot):
        length = length + 1 if number and day == hot[number - 1] + 1 else 1
        start = day - length + 1
        if length > best[0]:
            best = (length, float(start))
    return best
