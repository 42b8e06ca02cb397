"""One day of a block of cells.

Lanes are moments of cells: lane = moment x CELLS + cell. Sunlit and shaded leaves are solved one after the
other, each in the actual weather, without oxygenation and, where a moment is above the onset, in the cool
world; then the moments are added up.
"""

from __future__ import annotations

import numpy as np

from cropstress.compiled import inlined, kernel
from cropstress.day import canopy, course
from cropstress.day.worlds import causes_at, solve_worlds
from cropstress.leaf import solve
from cropstress.leaf.air import dew_point
from cropstress.leaf.responses import leaf_respiration

CELLS = 32
MOMENTS = 8

# Gauss-Legendre points and weights on 0 ... 1; Goudriaan 1986 for their use through the day.
_POINTS, _WEIGHTS = np.polynomial.legendre.leggauss(MOMENTS)
DAY_POINTS = 0.5 * (_POINTS + 1.0)
DAY_WEIGHTS = 0.5 * _WEIGHTS
_POINTS, _WEIGHTS = np.polynomial.legendre.leggauss(5)
NIGHT_POINTS = 0.5 * (_POINTS + 1.0)
NIGHT_WEIGHTS = 0.5 * _WEIGHTS

# Rows of the weather of a block of cells, and of what does not change with the crop.
HIGHEST = 0  # tmax [degC]
LOWEST = 1  # tmin [degC]
VAPOUR_PRESSURE = 2  # of the day [kPa]
RADIATION = 3  # [MJ m-2 d-1]
WIND = 4  # [m s-1]
PRESSURE = 5  # [kPa]
LATITUDE = 6  # [rad]
ELEVATION = 7  # [m]
DAY_INPUTS = 8

# Rows of what a crop's cell adds.
LEAF_AREA = 0  # [1]
CO2 = 1  # [umol mol-1]
GROWTH_TEMPERATURE = 2  # [degC]
SUNSET_BEFORE = 3  # temperature of the evening before [degC]
CROP_INPUTS = 4

# Rows of a day's answers.
ASSIMILATION = 0  # all sums [mol m-2 d-1]
LOST_TO_HEAT = 1
BY_PHOTORESPIRATION = 2
BY_STOMATA = 3
BY_ENZYMES = 4
BY_RESPIRATION = 5
LOST_TO_PHOTORESPIRATION = 6
PHOTORESPIRED_CO2 = 7
HIGHEST_LEAF = 8  # sunlit leaf [degC]
LARGEST_LEAF_EXCESS = 9  # sunlit leaf above air [K]
SMALLEST_LEAF_EXCESS = 10  # [K]
DAYTIME_DEFICIT = 11  # mean of the air [kPa]
DAY_ANSWERS = 12

_MOLES = 3600.0e-6  # mol m-2 per h of 1 umol m-2 s-1


@inlined
def sunset_temperature(highest: float, lowest: float, daylight: float) -> float:
    """Return the air temperature at sunset [degC]; the day's mean where the sun does not rise."""
    if daylight <= course.POLAR_NIGHT:
        return 0.5 * (highest + lowest)
    return course.day_temperature(highest, lowest, daylight, daylight)


@inlined
def respired_by_night(leaf, lowest, at_sunset, daylight, highest_allowed):  # type: ignore[no-untyped-def]
    """Return a night's respiration of the top leaf [mol m-2], with air capped at a temperature."""
    relative = 0.0
    for point in range(NIGHT_POINTS.size):
        if daylight <= course.POLAR_NIGHT:
            air = at_sunset
        else:
            air = course.night_temperature(lowest, at_sunset, NIGHT_POINTS[point])
        relative += NIGHT_WEIGHTS[point] * leaf_respiration(
            leaf.respiration_linear, leaf.respiration_quadratic, min(air, highest_allowed)
        )
    hours = 0.0 if daylight >= course.POLAR_DAY else 24.0 - daylight
    return relative * hours * _MOLES * leaf.carboxylation_capacity * leaf.respiration_ratio


@kernel
def sky_of_block(day_of_year, cells, sky):  # type: ignore[no-untyped-def]
    """Work out the sun and the courses of a day, which all crops share.

    Parameters
    ----------
    day_of_year : float
    cells : float64 array (DAY_INPUTS, CELLS)
    sky : float64 array (6, MOMENTS x CELLS)
        Written: air temperature [degC], vapour pressure [kPa], beam and diffuse radiation [W m-2 of ground],
        net longwave [W m-2], beam extinction kb [1] (0 where dark).

    Returns
    -------
    None
    """
    declination = course.declination(day_of_year)
    distance = course.relative_distance(day_of_year)
    shape = np.empty(MOMENTS)
    for cell in range(CELLS):
        latitude = cells[LATITUDE, cell]
        sunset = course.sunset_angle(latitude, declination)
        daylight = course.daylight_hours(sunset)
        above = course.extraterrestrial_radiation(latitude, declination, distance, sunset)
        clear = (0.75 + 2e-5 * cells[ELEVATION, cell]) * above  # FAO-56 Eq. 37
        relative = cells[RADIATION, cell] / max(clear, 1e-9)
        total = 0.0
        for moment in range(MOMENTS):
            hour = 12.0 - 0.5 * daylight + daylight * DAY_POINTS[moment]
            sine = course.sine_of_elevation(latitude, declination, hour)
            bright = daylight > course.POLAR_NIGHT and sine > course.LOWEST_SUN
            shape[moment] = course.radiation_shape(sunset, hour, sine) if bright else 0.0
            total += DAY_WEIGHTS[moment] * daylight * shape[moment]
        for moment in range(MOMENTS):
            lane = moment * CELLS + cell
            hour = 12.0 - 0.5 * daylight + daylight * DAY_POINTS[moment]
            sine = course.sine_of_elevation(latitude, declination, hour)
            air = course.day_temperature(
                cells[HIGHEST, cell], cells[LOWEST, cell], daylight, daylight * DAY_POINTS[moment]
            )
            if daylight <= course.POLAR_NIGHT:
                air = 0.5 * (cells[HIGHEST, cell] + cells[LOWEST, cell])
            humidity = min(cells[VAPOUR_PRESSURE, cell], course.saturation(air))
            # The day's sum is met exactly: the shape is normalised by the quadrature's own sum.
            flux = cells[RADIATION, cell] / 0.0036 * shape[moment] / max(total, 1e-12)  # MJ per h to W
            clearness = min(flux / max(course.SOLAR_CONSTANT * distance * sine, 1e-9), 1.0)
            diffuse = course.diffuse_share(clearness) * flux
            sky[0, lane] = air
            sky[1, lane] = humidity
            sky[2, lane] = flux - diffuse
            sky[3, lane] = diffuse
            sky[4, lane] = course.net_longwave(air, humidity, relative)
            sky[5, lane] = canopy.beam_extinction(sine) if flux > 0.0 else 0.0


@inlined
def leaf_class(sky, lane, leaf_area, decline, sunlit, single_leaf):  # type: ignore[no-untyped-def]
    """Return leaf area, absorbed PAR, net radiation and capacity of a class of leaves, per leaf area.

    Radiation [W m-2 of leaf], area [m2 m-2], capacity of the top leaf's [1].
    """
    kb = sky[5, lane]
    beam, diffuse = 0.5 * sky[2, lane], 0.5 * sky[3, lane]  # half is visible, half near infra-red
    if leaf_area < canopy.SMALLEST_LEAF_AREA:
        return 0.0, 0.0, 0.0, 1.0
    if single_leaf:
        kb_open = max(kb, 0.0)
        visible = canopy.absorbed_by_top_leaf(beam, diffuse, kb_open, canopy.SCATTERING_VISIBLE)
        infrared = canopy.absorbed_by_top_leaf(beam, diffuse, kb_open, canopy.SCATTERING_NEAR_INFRARED)
        longwave = canopy.DIFFUSE_EXTINCTION * sky[4, lane]
        return (1.0 if sunlit else 0.0), visible, visible + infrared + longwave, 1.0
    if kb == 0.0:
        # In the dark all leaves are one class.
        longwave = canopy.longwave_shares(0.0, leaf_area)[0] * sky[4, lane]
        capacity = canopy.whole_capacity(leaf_area, decline) / leaf_area
        return (leaf_area if sunlit else 0.0), 0.0, longwave / leaf_area, capacity
    visible, visible_sunlit = canopy.absorbed(beam, diffuse, kb, leaf_area, canopy.SCATTERING_VISIBLE)
    infrared, infrared_sunlit = canopy.absorbed(beam, diffuse, kb, leaf_area, canopy.SCATTERING_NEAR_INFRARED)
    longwave_all, longwave_sunlit = canopy.longwave_shares(kb, leaf_area)
    area_sunlit = canopy.sunlit_area(kb, leaf_area)
    capacity_sunlit = canopy.sunlit_capacity(kb, leaf_area, decline)
    if sunlit:
        net = visible_sunlit + infrared_sunlit + longwave_sunlit * sky[4, lane]
        return area_sunlit, visible_sunlit / area_sunlit, net / area_sunlit, capacity_sunlit / area_sunlit
    area = max(leaf_area - area_sunlit, 1e-9)
    shaded = max(visible - visible_sunlit, 0.0)
    net = shaded + infrared - infrared_sunlit + (longwave_all - longwave_sunlit) * sky[4, lane]
    return area, shaded / area, net / area, (canopy.whole_capacity(leaf_area, decline) - capacity_sunlit) / area


@kernel
def crop_day_of_block(leaf, heat_onset, decline, single_leaf, cells, sky, crop_cells, daylight, answers):  # type: ignore[no-untyped-def]
    """Assimilation and losses of one crop through one day in a block of cells.

    Parameters
    ----------
    leaf : record of `C3_LEAF` or `C4_LEAF`
    heat_onset : float
        [degC], momentary air temperature.
    decline : float
        Decline of leaf capacity through the canopy, kn [1].
    single_leaf : bool
        One sunlit leaf at the top instead of the canopy.
    cells : float64 array (DAY_INPUTS, CELLS)
    sky : float64 array (6, MOMENTS x CELLS), see `sky_of_block`
    crop_cells : float64 array (CROP_INPUTS, CELLS)
    daylight : float64 array (CELLS,)
        [h]
    answers : float64 array (DAY_ANSWERS, CELLS)
        Written, per ground area (per leaf area for a single leaf).
    """
    lanes = np.empty((solve.LEAF_INPUTS, solve.LANES))
    actual = np.empty((solve.LEAF_OUTPUTS, solve.LANES))
    actual_open = np.empty((solve.LEAF_OUTPUTS, solve.LANES))
    cooled = np.empty((solve.LEAF_OUTPUTS, solve.LANES))
    cooled_open = np.empty((solve.LEAF_OUTPUTS, solve.LANES))
    mixed_dry = np.empty(solve.LANES)
    mixed_warm = np.empty(solve.LANES)
    area = np.empty(solve.LANES)
    answers[:, :] = 0.0
    answers[HIGHEST_LEAF, :] = -1e30
    answers[LARGEST_LEAF_EXCESS, :] = -1e30
    answers[SMALLEST_LEAF_EXCESS, :] = 1e30

    for sunlit in (True, False):
        if single_leaf and not sunlit:
            break
        for lane in range(solve.LANES):
            cell = lane % CELLS
            air = sky[0, lane]
            humidity = sky[1, lane]
            leaf_area, visible, net, capacity = leaf_class(
                sky, lane, crop_cells[LEAF_AREA, cell], decline, sunlit, single_leaf
            )
            area[lane] = leaf_area
            lanes[solve.AIR_TEMPERATURE, lane] = air
            lanes[solve.VAPOUR_PRESSURE, lane] = humidity
            lanes[solve.DEW_POINT, lane] = min(dew_point(humidity), air)
            lanes[solve.NET_RADIATION, lane] = net
            lanes[solve.PHOTONS, lane] = visible * canopy.PHOTONS_PER_JOULE
            lanes[solve.CAPACITY, lane] = capacity
            lanes[solve.WIND, lane] = cells[WIND, cell]
            lanes[solve.PRESSURE, lane] = cells[PRESSURE, cell]
            lanes[solve.CO2, lane] = crop_cells[CO2, cell]
            lanes[solve.GROWTH_TEMPERATURE, lane] = crop_cells[GROWTH_TEMPERATURE, cell]
        solve_worlds(
            leaf, heat_onset, lanes, actual, actual_open, cooled, cooled_open, mixed_dry, mixed_warm
        )  # fmt: skip
        for lane in range(solve.LANES):
            cell = lane % CELLS
            moles = DAY_WEIGHTS[lane // CELLS] * daylight[cell] * area[lane] * _MOLES
            if moles == 0.0:
                continue
            rate = actual[solve.ASSIMILATION, lane]
            answers[ASSIMILATION, cell] += moles * rate
            answers[LOST_TO_PHOTORESPIRATION, cell] += moles * (actual_open[solve.ASSIMILATION, lane] - rate)
            answers[PHOTORESPIRED_CO2, cell] += moles * 0.5 * actual[solve.OXYGENATION, lane]
            if sunlit:
                leaf_temperature = actual[solve.LEAF_TEMPERATURE, lane]
                excess = leaf_temperature - lanes[solve.AIR_TEMPERATURE, lane]
                answers[HIGHEST_LEAF, cell] = max(answers[HIGHEST_LEAF, cell], leaf_temperature)
                answers[LARGEST_LEAF_EXCESS, cell] = max(answers[LARGEST_LEAF_EXCESS, cell], excess)
                answers[SMALLEST_LEAF_EXCESS, cell] = min(answers[SMALLEST_LEAF_EXCESS, cell], excess)
            if lanes[solve.AIR_TEMPERATURE, lane] > heat_onset:
                by_photorespiration, by_stomata, by_enzymes, by_respiration = causes_at(
                    lane, actual, actual_open, cooled, cooled_open, mixed_dry, mixed_warm
                )
                answers[LOST_TO_HEAT, cell] += moles * (cooled[solve.ASSIMILATION, lane] - rate)
                answers[BY_PHOTORESPIRATION, cell] += moles * by_photorespiration
                answers[BY_STOMATA, cell] += moles * by_stomata
                answers[BY_ENZYMES, cell] += moles * by_enzymes
                answers[BY_RESPIRATION, cell] += moles * by_respiration

    for cell in range(CELLS):
        lowest = cells[LOWEST, cell]
        leaf_area = crop_cells[LEAF_AREA, cell]
        deficit = 0.0
        for moment in range(MOMENTS):
            lane = moment * CELLS + cell
            deficit += DAY_WEIGHTS[moment] * (course.saturation(sky[0, lane]) - sky[1, lane])
        answers[DAYTIME_DEFICIT, cell] = deficit
        if leaf_area < canopy.SMALLEST_LEAF_AREA:
            continue
        capacity = 1.0 if single_leaf else canopy.whole_capacity(leaf_area, decline)
        before = crop_cells[SUNSET_BEFORE, cell]
        respired = capacity * respired_by_night(leaf, lowest, before, daylight[cell], 1e30)
        cool_respired = respired
        if max(before, lowest) > heat_onset:
            cool_respired = capacity * respired_by_night(leaf, lowest, before, daylight[cell], heat_onset)
        answers[ASSIMILATION, cell] -= respired
        answers[LOST_TO_HEAT, cell] += respired - cool_respired
        answers[BY_RESPIRATION, cell] += respired - cool_respired
