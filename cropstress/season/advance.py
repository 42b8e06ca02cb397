"""Walk the seasons of many cells through a block of days."""

from __future__ import annotations

import math

import numpy as np

from cropstress.compiled import exact_inlined, exact_kernel
from cropstress.day import block, course
from cropstress.day.block import CELLS, crop_day_of_block, sky_of_block, sunset_temperature
from cropstress.leaf.solve import LANES
from cropstress.season import layout as at
from cropstress.season.stages import degree_days, leaf_area_at, stage_at

ROUNDING = 1e-3  # K: 35 degC in float32 kelvin is 34.999994 degC


@exact_kernel
def advance(
    leaves, crops, co2, sowing, day_of_year, ten_days, first_ten_days, first_day,
    weather, mended, latitude, elevation, with_gas_exchange,
    walk, recent, bits, totals, by_stage, by_ten_days, daily,
):  # type: ignore[no-untyped-def] # fmt: skip
    """Carry the seasons of a tile of cells through a block of days.

    A row is a set of parameters (a scenario, a member of an ensemble) computed from the same weather: sun and
    courses are worked out once a day for all of them.

    Parameters
    ----------
    leaves : record array (rows,) of `C3_LEAF` or `C4_LEAF`
    crops : record array (rows,) of `SEASON_CROP`
    co2 : float64 array (rows, seasons)
        [umol mol-1]
    sowing : int64 array (rows, seasons, cells)
        Day of sowing on the time axis of the run; negative for none.
    day_of_year : float64 array (days,)
        For the sun.
    ten_days : int64 array (days,)
        Number of the calendar ten days of each day.
    first_ten_days : int64 array (seasons,)
        Number of the ten days in which each season begins.
    first_day : int
        Number of the block's first day on the time axis.
    weather : float64 array (6, days, cells)
        tmax, tmin [degC], vapour pressure [kPa], radiation [MJ m-2 d-1], wind [m s-1], pressure [kPa]; NaN
        where missing.
    mended : uint8 array (days, cells)
    latitude : float64 array (cells,)
        [rad]
    elevation : float64 array (cells,)
        [m]
    with_gas_exchange : bool
        False where tmax and tmin are all there is.
    walk, recent, bits, totals, by_stage, by_ten_days : arrays
        The state, see `layout`; carried on in place.
    daily : float64 array (rows, days or 0, DAILY, cells)
        Written for every day where it has days.
    """
    rows = crops.shape[0]
    days = day_of_year.shape[0]
    count = latitude.shape[0]
    cells = np.zeros((block.DAY_INPUTS, CELLS))
    sky = np.zeros((6, LANES))
    crop_cells = np.zeros((block.CROP_INPUTS, CELLS))
    daylight = np.zeros(CELLS)
    answers = np.zeros((block.DAY_ANSWERS, CELLS))
    present = np.zeros(CELLS, dtype=np.bool_)
    active = np.zeros(CELLS, dtype=np.bool_)
    sunset = np.zeros(CELLS)
    for start in range(0, count, CELLS):
        width = min(CELLS, count - start)
        for day in range(days):
            today = first_day + day
            declination = course.declination(day_of_year[day])
            for i in range(CELLS):
                # A block is filled up with its last cell, so that every loop has its full width.
                cell = start + min(i, width - 1)
                present[i] = not math.isnan(weather[0, day, cell])
                for k in range(6):
                    cells[k, i] = weather[k, day, cell] if present[i] else _HARMLESS[k]
                cells[block.LATITUDE, i] = latitude[cell]
                cells[block.ELEVATION, i] = elevation[cell]
                daylight[i] = course.daylight_hours(course.sunset_angle(latitude[cell], declination))
                sunset[i] = sunset_temperature(cells[block.HIGHEST, i], cells[block.LOWEST, i], daylight[i])
                if i < width:
                    mean = 0.5 * (cells[block.HIGHEST, i] + cells[block.LOWEST, i])
                    recent[today % at.RECENT_DAYS, cell] = mean if present[i] else np.nan
            sky_known = False
            for row in range(rows):
                crop = crops[row]
                growing = False
                for i in range(CELLS):
                    cell = start + min(i, width - 1)
                    if i < width:
                        begin_season(crop, row, cell, today, sowing, walk, bits, totals)
                    active[i] = walk[row, at.SEASON, cell] >= 0.0
                    before = walk[row, at.SUNSET_BEFORE, cell]
                    crop_cells[block.SUNSET_BEFORE, i] = (
                        sunset[i] if math.isnan(before) or daylight[i] <= course.POLAR_NIGHT else before
                    )
                    crop_cells[block.LEAF_AREA, i] = 0.0
                    crop_cells[block.CO2, i] = co2[row, 0]
                    crop_cells[block.GROWTH_TEMPERATURE, i] = growth_temperature(crop, recent, cell)
                    if active[i]:
                        season = int(walk[row, at.SEASON, cell])
                        mean = 0.5 * (cells[block.HIGHEST, i] + cells[block.LOWEST, i])
                        progress = progress_at_noon(crop, row, cell, mean, walk)
                        crop_cells[block.LEAF_AREA, i] = leaf_area_at(crop, progress)
                        crop_cells[block.CO2, i] = co2[row, season]
                        growing = growing or (present[i] and i < width)
                if growing and with_gas_exchange:
                    if not sky_known:
                        sky_of_block(day_of_year[day], cells, sky)
                        sky_known = True
                    crop_day_of_block(
                        leaves[row], crop.heat_onset, crop.capacity_decline, crop.single_leaf > 0.5,
                        cells, sky, crop_cells, daylight, answers,
                    )  # fmt: skip
                for i in range(width):
                    cell = start + i
                    if active[i]:
                        count_day(
                            crop, row, cell, i, day, today, ten_days[day], first_ten_days, present[i],
                            mended[day, cell], cells, crop_cells, daylight[i], with_gas_exchange, answers,
                            walk, bits, totals, by_stage, by_ten_days, daily,
                        )  # fmt: skip
                    walk[row, at.SUNSET_BEFORE, cell] = sunset[i] if present[i] else np.nan


# Weather put in place of what is missing: computed with, never counted.
_HARMLESS = np.array([20.0, 10.0, 1.0, 10.0, 2.0, 101.3])


@exact_inlined
def begin_season(crop, row, cell, today, sowing, walk, bits, totals):  # type: ignore[no-untyped-def]
    """Begin a cell's next season if it is sown today."""
    following = int(walk[row, at.NEXT_SEASON, cell])
    if following >= sowing.shape[1] or sowing[row, following, cell] != today:
        if following < sowing.shape[1] and sowing[row, following, cell] < today:
            walk[row, at.NEXT_SEASON, cell] = following + 1  # nothing sown in that season
            if following + 1 < sowing.shape[1] and sowing[row, following + 1, cell] == today:
                following += 1
            else:
                return
        else:
            return
    walk[row, at.SEASON, cell] = following
    walk[row, at.NEXT_SEASON, cell] = following + 1
    walk[row, at.DAYS, cell] = 0.0
    walk[row, at.THERMAL, cell] = 0.0
    walk[row, at.MID_STARTED, cell] = 0.0
    for k in range(at.BITS):
        bits[row, k, cell] = 0
    for k in range(at.TOTALS):
        totals[row, following, k, cell] = 0.0
    for k in (at.LONGEST_SPELL_START, at.FIRST_HOT, at.LAST_HOT, at.HOTTEST_DAY, at.FLOWERING, at.MATURITY):
        totals[row, following, k, cell] = -1.0
    totals[row, following, at.HOTTEST_TEMPERATURE, cell] = -1e30
    totals[row, following, at.SOWING, cell] = today
    if crop.flowers > 0.5 and crop.thermal_time < 0.5:
        totals[row, following, at.FLOWERING, cell] = today + crop.development_end + crop.flowering_offset


@exact_inlined
def growth_temperature(crop, recent, cell):  # type: ignore[no-untyped-def]
    """Return the profile's growth temperature, or the mean of the last 30 days there are [degC]."""
    if crop.acclimates < 0.5:
        return crop.growth_temperature
    total = 0.0
    known = 0
    for k in range(at.RECENT_DAYS):
        if not math.isnan(recent[k, cell]):
            total += recent[k, cell]
            known += 1
    if known == 0:
        return crop.growth_temperature
    return min(max(total / known, crop.lowest_growth_temperature), crop.highest_growth_temperature)


@exact_inlined
def progress_at_noon(crop, row, cell, mean, walk):  # type: ignore[no-untyped-def]
    """Return how far the season has come at the middle of the day [d or K d since sowing]."""
    if crop.thermal_time > 0.5:
        return walk[row, at.THERMAL, cell] + 0.5 * degree_days(crop, mean)
    return walk[row, at.DAYS, cell] + 0.5


@exact_inlined
def bits_between(word, newest, oldest):  # type: ignore[no-untyped-def]
    """Count the set bits of a memory from `newest` to `oldest` days ago, both included."""
    total = 0
    for ago in range(max(newest, 0), min(oldest, 63) + 1):
        total += (word >> ago) & 1
    return total


@exact_kernel
def count_day(
    crop, row, cell, i, day, today, ten_day, first_ten_days, present, mended, cells, crop_cells, daylight,
    with_gas_exchange, answers, walk, bits, totals, by_stage, by_ten_days, daily,
):  # type: ignore[no-untyped-def] # fmt: skip
    """Add one day of one cell to its season."""
    season = int(walk[row, at.SEASON, cell])
    sums = totals[row, season, :, cell]
    thermal = crop.thermal_time > 0.5
    done = walk[row, at.THERMAL, cell] if thermal else walk[row, at.DAYS, cell]
    stage = stage_at(crop, done)
    step = ten_day - first_ten_days[season]
    highest = cells[block.HIGHEST, i]
    lowest = cells[block.LOWEST, i]
    mean = 0.5 * (highest + lowest)
    if crop.flowers > 0.5 and thermal and stage >= 2 and walk[row, at.MID_STARTED, cell] < 0.5:
        walk[row, at.MID_STARTED, cell] = 1.0
        flowering = today + crop.flowering_offset
        sums[at.FLOWERING] = flowering
        newest = today - 1 - int(flowering + crop.window_end)
        oldest = today - 1 - int(flowering + crop.window_start)
        sums[at.FLOWERING_HOT] += bits_between(bits[row, at.HOT_BITS, cell], newest, oldest)
        sums[at.FLOWERING_HOT_IF_COOLER] += bits_between(bits[row, at.COOLER_BITS, cell], newest, oldest)
        sums[at.FLOWERING_HOT_IF_WARMER] += bits_between(bits[row, at.WARMER_BITS, cell], newest, oldest)
        sums[at.FLOWERING_WARM_NIGHTS] += bits_between(bits[row, at.WARM_NIGHT_BITS, cell], newest, oldest)
    for k in range(at.BITS):
        bits[row, k, cell] = bits[row, k, cell] << 1
    hours = 0.0
    if not present:
        sums[at.MISSING] += 1.0
        by_stage[row, season, stage, at.MISSING, cell] += 1.0
        by_ten_days[row, season, step, at.MISSING, cell] += 1.0
        sums[at.SPELL] = 0.0
    else:
        hours = count_heat(
            crop, row, cell, i, today, stage, step, season, cells, crop_cells, daylight, bits, sums, by_stage,
            by_ten_days,
        )  # fmt: skip
        if mended > 0:
            sums[at.MENDED] += 1.0
        sums[at.COUNTED_DAYS] += 1.0
        gained = degree_days(crop, mean)
        sums[at.GROWING_DEGREE_DAYS] += gained
        walk[row, at.THERMAL, cell] += gained
        if with_gas_exchange:
            for k in range(at.GAS_SERIES):
                sums[k] += answers[k, i]
                by_stage[row, season, stage, k, cell] += answers[k, i]
                by_ten_days[row, season, step, k, cell] += answers[k, i]
            if answers[block.HIGHEST_LEAF, i] > crop.hot_leaf_limit + ROUNDING:
                sums[at.HOT_LEAF_DAYS] += 1.0
            if answers[block.DAYTIME_DEFICIT, i] > crop.dry_air_limit:
                sums[at.DRY_AIR_DAYS] += 1.0
            sums[at.DEFICIT_SUM] += answers[block.DAYTIME_DEFICIT, i]
    walk[row, at.DAYS, cell] += 1.0
    sums[at.SEASON_DAYS] += 1.0
    sums[at.LAST_STAGE] = stage
    if daily.shape[1] > 0:
        for k in range(block.DAY_ANSWERS):
            daily[row, day, k, cell] = answers[k, i] if present and with_gas_exchange else np.nan
        daily[row, day, at.DAILY_STAGE, cell] = stage
        daily[row, day, at.DAILY_LEAF_AREA, cell] = crop_cells[block.LEAF_AREA, i]
        daily[row, day, at.DAILY_HOT_HOURS, cell] = hours if present else np.nan
        daily[row, day, at.DAILY_GROWTH_TEMPERATURE, cell] = crop_cells[block.GROWTH_TEMPERATURE, i]
    now = walk[row, at.THERMAL, cell] if thermal else walk[row, at.DAYS, cell]
    if now >= crop.late_end - 1e-9:
        sums[at.MATURITY] = today
        walk[row, at.SEASON, cell] = -1.0


@exact_inlined
def count_heat(
    crop, row, cell, i, today, stage, step, season, cells, crop_cells, daylight, bits, sums, by_stage, by_ten_days,
):  # fmt: skip
    """Count what needs only tmax and tmin; return the hours above the limit."""
    highest = cells[block.HIGHEST, i]
    lowest = cells[block.LOWEST, i]
    limit = crop.hot_day_limit + ROUNDING
    in_window = False
    if crop.flowers > 0.5 and sums[at.FLOWERING] >= 0.0:
        since = today - sums[at.FLOWERING]
        in_window = crop.window_start <= since <= crop.window_end
    if highest > limit:
        sums[at.HOT] += 1.0
        by_stage[row, season, stage, at.HOT, cell] += 1.0
        by_ten_days[row, season, step, at.HOT, cell] += 1.0
        if sums[at.FIRST_HOT] < 0.0:
            sums[at.FIRST_HOT] = today
        sums[at.LAST_HOT] = today
        if sums[at.SPELL] == 0.0:
            sums[at.SPELL_START] = today
        sums[at.SPELL] += 1.0
        if sums[at.SPELL] > sums[at.LONGEST_SPELL]:
            sums[at.LONGEST_SPELL] = sums[at.SPELL]
            sums[at.LONGEST_SPELL_START] = sums[at.SPELL_START]
    else:
        sums[at.SPELL] = 0.0
    if highest - 1.0 > limit:
        sums[at.HOT_IF_COOLER] += 1.0
    if highest + 1.0 > limit:
        sums[at.HOT_IF_WARMER] += 1.0
    flowering_limit = crop.flowering_limit + ROUNDING
    if highest > flowering_limit:
        bits[row, at.HOT_BITS, cell] |= 1
        sums[at.FLOWERING_HOT] += 1.0 if in_window else 0.0
    if highest - 1.0 > flowering_limit:
        bits[row, at.COOLER_BITS, cell] |= 1
        sums[at.FLOWERING_HOT_IF_COOLER] += 1.0 if in_window else 0.0
    if highest + 1.0 > flowering_limit:
        bits[row, at.WARMER_BITS, cell] |= 1
        sums[at.FLOWERING_HOT_IF_WARMER] += 1.0 if in_window else 0.0
    if lowest > crop.warm_night_limit + ROUNDING:
        bits[row, at.WARM_NIGHT_BITS, cell] |= 1
        sums[at.WARM_NIGHTS] += 1.0
        sums[at.FLOWERING_WARM_NIGHTS] += 1.0 if in_window else 0.0
    if highest > sums[at.HOTTEST_TEMPERATURE]:
        sums[at.HOTTEST_TEMPERATURE] = highest
        sums[at.HOTTEST_DAY] = today
    hours, excess = course.time_above(
        crop.hot_day_limit, highest, lowest, daylight, crop_cells[block.SUNSET_BEFORE, i]
    )
    sums[at.DEGREE_DAYS] += excess
    sums[at.HOT_HOURS] += hours
    return hours
