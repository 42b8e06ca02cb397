"""Leaf temperature, stomata and assimilation of many leaves, solved together.

A block of leaves ("lanes") is walked step by step. In each step one straight-line loop over the lanes
evaluates the leaf at its present temperature and a second one improves that temperature, so that the compiler
turns both into vector instructions. Every array written in a loop is made inside the function: only then
does the compiler know that no two of them overlap.

Six secant steps inside a bracket are enough for nearly every leaf. The few that are left are gathered and
solved again with care: a scan upwards from the coolest possible leaf finds the first temperature at which
the leaf loses more energy than it takes up, which is the solution a leaf reaches from a cool morning.
"""

from __future__ import annotations

from typing import Any

import numpy as np

from cropstress.compiled import exponential, inlined, kernel
from cropstress.leaf.air import (
    AIR_HEAT_CAPACITY,
    EVAPORATION_HEAT,
    VAPOUR_TO_CO2_BOUNDARY,
    VAPOUR_TO_CO2_STOMATA,
    energy_surplus,
    heat_conductance,
    radiative_conductance,
    stomatal_factor,
    vapour_conductance,
    vapour_deficit,
)
from cropstress.leaf.pathway import carboxylation, enzyme_demand, leaf_state, light_demand, net_rate
from cropstress.leaf.responses import deactivation_exponent

LANES = 256  # leaves in a block
CAREFUL_LANES = 32  # leaves in a block of the second stage; a multiple of every vector width times unrolling
_SECANT_STEPS = 6
_SCAN_STEPS = 40
_REFINING_STEPS = 24
_START = 0.35  # share of the way up the bracket, measured
_TOLERANCE = 1e-5  # of cp (gH + gr), in K: energy left over in an accepted solution
_KEPT_OPEN = 0.5  # 1; see `expected_slope`
_LAST_STEP = 1e-3  # K: a larger last step means that the secant had not settled
_LEAST_CO2 = 1.0  # umol mol-1: a Newton step that overshoots is caught here
_FIRST_CO2_SHARE = 0.7  # of the air's CO2: where the search starts

# Rows of the block that describes the leaves.
AIR_TEMPERATURE = 0  # [degC]
VAPOUR_PRESSURE = 1  # [kPa]
DEW_POINT = 2  # [degC]
NET_RADIATION = 3  # isothermal [W m-2 of leaf]
PHOTONS = 4  # absorbed [umol m-2 s-1 of leaf]
CAPACITY = 5  # of the top leaf's [1]
WIND = 6  # [m s-1]
PRESSURE = 7  # [kPa]
CO2 = 8  # of the air [umol mol-1]
GROWTH_TEMPERATURE = 9  # [degC]
LEAF_INPUTS = 10

# Rows of the block with the answers.
ASSIMILATION = 0  # net [umol m-2 s-1]
RESPIRATION = 1  # [umol m-2 s-1]
LEAF_TEMPERATURE = 2  # [degC]
DEFICIT = 3  # leaf to air [kPa]
INTERCELLULAR_CO2 = 4  # [umol mol-1]
STOMATAL_CONDUCTANCE = 5  # to vapour [mol m-2 s-1]
CARBOXYLATION = 6  # [umol m-2 s-1]
OXYGENATION = 7  # [umol m-2 s-1]
UNSETTLED = 8  # 1 where the first stage did not settle
LEAF_OUTPUTS = 9


@inlined
def normal_capacities(leaf, growth_temperature):  # type: ignore[no-untyped-def]
    """Return Vcmax25 and Jmax25 with the normalisations of their peaks [umol m-2 s-1]."""
    carboxylation_exponent = deactivation_exponent(
        leaf.carboxylation_deactivation,
        leaf.carboxylation_entropy_intercept + leaf.carboxylation_entropy_slope * growth_temperature,
    )
    electron_exponent = deactivation_exponent(
        leaf.electron_transport_deactivation,
        leaf.electron_transport_entropy_intercept + leaf.electron_transport_entropy_slope * growth_temperature,
    )
    ratio = leaf.electron_transport_ratio_intercept + leaf.electron_transport_ratio_slope * growth_temperature
    return (
        leaf.carboxylation_capacity * (1.0 + exponential(carboxylation_exponent)),
        leaf.carboxylation_capacity * ratio * (1.0 + exponential(electron_exponent)),
    )


@inlined
def supply(
    assimilation: float, co2: float, resistance: float, intercept: float, factor: float
) -> tuple[float, float]:
    """Return what the stomata allow at a net rate.

    Returns
    -------
    tuple
        Intercellular CO2 [umol mol-1] and its slope with the rate.
    """
    surface = co2 - resistance * assimilation
    gain = max(assimilation, 0.0)
    # Conductance x surface CO2, so that one division serves all.
    opened = intercept * surface + factor * gain
    inverse = 1.0 / opened
    opening = (factor if assimilation > 0.0 else 0.0) - intercept * resistance
    inside = surface - VAPOUR_TO_CO2_STOMATA * assimilation * surface * inverse
    slope = -resistance - VAPOUR_TO_CO2_STOMATA * inverse * (
        surface - assimilation * resistance - assimilation * surface * opening * inverse
    )
    return inside, slope


@inlined
def newton_step(demand: float, demand_slope: float, assimilation: float, supply_slope: float) -> float:
    """Return a net rate nearer to where demand and supply meet."""
    return assimilation - (demand - assimilation) / (demand_slope * supply_slope - 1.0)


@inlined
def improved_rates(leaf, state, enzyme, light, co2, resistance, factor, pressure):  # type: ignore[no-untyped-def]
    """Return both limiting net rates after one Newton step each."""
    inside, slope = supply(enzyme, co2, resistance, leaf.stomatal_intercept, factor)
    demand, demand_slope = enzyme_demand(leaf, state, max(inside, _LEAST_CO2), pressure)
    enzyme = newton_step(demand, demand_slope, enzyme, slope)
    inside, slope = supply(light, co2, resistance, leaf.stomatal_intercept, factor)
    demand, demand_slope = light_demand(leaf, state, max(inside, _LEAST_CO2), pressure)
    return enzyme, newton_step(demand, demand_slope, light, slope)


@inlined
def expected_slope(leaf_temperature, saturation, sensible, vapour, conductance, pressure):  # type: ignore[no-untyped-def]
    """Return about how fast the surplus falls with leaf temperature [W m-2 K-1], for a first step.

    Stomata that close as the air gets drier give back about half of what the deficit adds (measured).
    """
    steepness = 4098.0 * saturation / ((leaf_temperature + 237.3) * (leaf_temperature + 237.3))  # FAO-56 Eq. 13
    passed = conductance * vapour / (conductance + vapour)
    return -AIR_HEAT_CAPACITY * sensible - _KEPT_OPEN * EVAPORATION_HEAT * passed * steepness / pressure


@inlined
def combined_rate(leaf, state, enzyme, light, co2, resistance):  # type: ignore[no-untyped-def]
    """Return the net rate, from the limits and the CO2 inside a leaf that only respires."""
    at_rest = co2 + (resistance + VAPOUR_TO_CO2_STOMATA / leaf.stomatal_intercept) * state.respiration
    return net_rate(leaf, state, enzyme, light, at_rest)


@kernel
def solve_block(leaf, lanes, width, oxygenation, careful, answers):  # type: ignore[no-untyped-def]
    """Solve leaf temperature, stomata and assimilation of one block of leaves.

    Parameters
    ----------
    leaf : record of `C3_LEAF` or `C4_LEAF`
    lanes : float64 array (LEAF_INPUTS, >= width)
        The leaves, see the row names of this module.
    width : int
        Leaves to solve: a multiple of CAREFUL_LANES, at most LANES.
    oxygenation : float
        1, or 0 for leaves whose Rubisco takes no oxygen.
    careful : bool
        Scan upwards for the coolest solution, then refine it.
    answers : float64 array (LEAF_OUTPUTS, >= width)
        Written.
    """
    air = np.empty(LANES)
    humidity = np.empty(LANES)
    net_radiation = np.empty(LANES)
    photons = np.empty(LANES)
    capacity = np.empty(LANES)
    pressure = np.empty(LANES)
    co2 = np.empty(LANES)
    growth = np.empty(LANES)
    normal_carboxylation = np.empty(LANES)
    normal_electron_transport = np.empty(LANES)
    sensible = np.empty(LANES)
    vapour = np.empty(LANES)
    temperature = np.empty(LANES)
    before = np.empty(LANES)
    surplus = np.empty(LANES)
    surplus_before = np.empty(LANES)
    first_slope = np.empty(LANES)
    lower = np.empty(LANES)
    upper = np.empty(LANES)
    stride = np.empty(LANES)
    unsettled = np.empty(LANES)
    enzyme = np.empty(LANES)
    light = np.empty(LANES)
    answer_rate = np.empty(LANES)
    answer_respiration = np.empty(LANES)
    answer_deficit = np.empty(LANES)
    answer_co2 = np.empty(LANES)
    answer_conductance = np.empty(LANES)
    answer_carboxylation = np.empty(LANES)
    answer_oxygenation = np.empty(LANES)
    for i in range(width):
        air[i] = lanes[AIR_TEMPERATURE, i]
        humidity[i] = lanes[VAPOUR_PRESSURE, i]
        net_radiation[i] = lanes[NET_RADIATION, i]
    for i in range(width):
        photons[i] = lanes[PHOTONS, i]
        capacity[i] = lanes[CAPACITY, i]
        pressure[i] = lanes[PRESSURE, i]
    for i in range(width):
        co2[i] = lanes[CO2, i]
        growth[i] = lanes[GROWTH_TEMPERATURE, i]
        vapour[i] = lanes[WIND, i]
        lower[i] = lanes[DEW_POINT, i]
    for i in range(width):
        dew_point = lower[i]
        wind = vapour[i]
        vapour[i] = vapour_conductance(wind, leaf.leaf_width)
        conductance = heat_conductance(wind, leaf.leaf_width) + radiative_conductance(air[i])
        driest = air[i] + net_radiation[i] / (AIR_HEAT_CAPACITY * conductance)
        coolest = min(dew_point, driest)
        warmest = max(dew_point, driest)
        sensible[i] = conductance
        normal_carboxylation[i], normal_electron_transport[i] = normal_capacities(leaf, growth[i])
        lower[i] = coolest
        upper[i] = warmest
        stride[i] = (warmest - coolest) / _SCAN_STEPS
        start = coolest if careful else coolest + _START * (warmest - coolest)
        temperature[i] = start
        before[i] = start
        surplus_before[i] = 0.0
        unsettled[i] = 0.0
    for i in range(width):
        state = leaf_state(
            leaf, temperature[i], photons[i], capacity[i], growth[i], normal_carboxylation[i],
            normal_electron_transport[i], pressure[i], oxygenation,
        )
        guess = _FIRST_CO2_SHARE * co2[i]
        enzyme[i] = enzyme_demand(leaf, state, guess, pressure[i])[0]
        light[i] = light_demand(leaf, state, guess, pressure[i])[0]

    steps = _SCAN_STEPS + _REFINING_STEPS if careful else _SECANT_STEPS
    for step in range(steps):
        for i in range(width):
            state = leaf_state(
                leaf, temperature[i], photons[i], capacity[i], growth[i], normal_carboxylation[i],
                normal_electron_transport[i], pressure[i], oxygenation,
            )
            resistance = VAPOUR_TO_CO2_BOUNDARY / vapour[i]
            deficit = vapour_deficit(temperature[i], humidity[i])
            factor = stomatal_factor(leaf.stomatal_slope, deficit)
            first, second = improved_rates(
                leaf, state, enzyme[i], light[i], co2[i], resistance, factor, pressure[i]
            )
            first, second = improved_rates(leaf, state, first, second, co2[i], resistance, factor, pressure[i])
            enzyme[i] = first
            light[i] = second
            rate = combined_rate(leaf, state, first, second, co2[i], resistance)
            conductance = leaf.stomatal_intercept + factor * max(rate, 0.0) / (co2[i] - resistance * rate)
            surplus[i] = energy_surplus(
                temperature[i], air[i], deficit, net_radiation[i], sensible[i], vapour[i], conductance, pressure[i]
            )
            first_slope[i] = expected_slope(
                temperature[i], humidity[i] + deficit, sensible[i], vapour[i], conductance, pressure[i]
            )
        if careful and step < _SCAN_STEPS:
            for i in range(width):
                here, coolest, warmest, left_over, crossed = (
                    temperature[i], lower[i], upper[i], surplus[i], unsettled[i],
                )  # fmt: skip
                now_crossed = 1.0 if left_over <= 0.0 else crossed
                warmest = here if now_crossed > crossed else warmest
                coolest = coolest if now_crossed > 0.0 else here
                lower[i] = coolest
                upper[i] = warmest
                unsettled[i] = now_crossed
                temperature[i] = 0.5 * (coolest + warmest) if now_crossed > 0.0 else here + stride[i]
        elif careful:
            for i in range(width):
                here, coolest, warmest, left_over = temperature[i], lower[i], upper[i], surplus[i]
                coolest = here if left_over > 0.0 else coolest
                warmest = warmest if left_over > 0.0 else here
                lower[i] = coolest
                upper[i] = warmest
                before[i] = here
                temperature[i] = 0.5 * (coolest + warmest)
        else:
            for i in range(width):
                here, coolest, warmest, left_over = temperature[i], lower[i], upper[i], surplus[i]
                conducted = AIR_HEAT_CAPACITY * sensible[i]
                moved = here - before[i]
                small = abs(moved) < 1e-9
                secant = (left_over - surplus_before[i]) / (1.0 if small else moved)
                slope = first_slope[i] if small or secant > -0.05 * conducted else secant
                before[i] = here
                surplus_before[i] = left_over
                temperature[i] = min(max(here - left_over / slope, coolest), warmest)

    for i in range(width):
        state = leaf_state(
            leaf, temperature[i], photons[i], capacity[i], growth[i], normal_carboxylation[i],
            normal_electron_transport[i], pressure[i], oxygenation,
        )
        resistance = VAPOUR_TO_CO2_BOUNDARY / vapour[i]
        deficit = vapour_deficit(temperature[i], humidity[i])
        factor = stomatal_factor(leaf.stomatal_slope, deficit)
        first, second = improved_rates(leaf, state, enzyme[i], light[i], co2[i], resistance, factor, pressure[i])
        first, second = improved_rates(leaf, state, first, second, co2[i], resistance, factor, pressure[i])
        rate = combined_rate(leaf, state, first, second, co2[i], resistance)
        inside, _ = supply(rate, co2[i], resistance, leaf.stomatal_intercept, factor)
        conductance = leaf.stomatal_intercept + factor * max(rate, 0.0) / (co2[i] - resistance * rate)
        surplus[i] = energy_surplus(
            temperature[i], air[i], deficit, net_radiation[i], sensible[i], vapour[i], conductance, pressure[i]
        )
        fixed, oxygenated = carboxylation(leaf, state, inside, rate, pressure[i])
        answer_carboxylation[i] = fixed
        answer_oxygenation[i] = oxygenated
        answer_rate[i] = fixed - 0.5 * oxygenated - state.respiration
        answer_respiration[i] = state.respiration
        answer_deficit[i] = deficit
        answer_co2[i] = inside
        answer_conductance[i] = conductance
        # What counts is the step that the energy left over would still ask for.
        moved = temperature[i] - before[i]
        conducted = AIR_HEAT_CAPACITY * sensible[i]
        unsettled[i] = 1.0 if abs(surplus[i]) > _TOLERANCE * conducted or abs(moved) > _LAST_STEP else 0.0
    count = 0.0
    for i in range(width):
        answers[ASSIMILATION, i] = answer_rate[i]
        answers[RESPIRATION, i] = answer_respiration[i]
        answers[LEAF_TEMPERATURE, i] = temperature[i]
        answers[DEFICIT, i] = answer_deficit[i]
        answers[INTERCELLULAR_CO2, i] = answer_co2[i]
        answers[STOMATAL_CONDUCTANCE, i] = answer_conductance[i]
        answers[CARBOXYLATION, i] = answer_carboxylation[i]
        answers[OXYGENATION, i] = answer_oxygenation[i]
        answers[UNSETTLED, i] = unsettled[i]
        count += unsettled[i]
    return count


@kernel
def solve_leaves(leaf, lanes, oxygenation, answers):  # type: ignore[no-untyped-def]
    """Solve a block of LANES leaves; the few that the first stage leaves over are solved with care.

    Parameters are those of `solve_block`.
    """
    unsettled = solve_block(leaf, lanes, LANES, oxygenation, False, answers)
    if unsettled == 0.0:
        return
    few = np.empty((LEAF_INPUTS, CAREFUL_LANES))
    few_answers = np.empty((LEAF_OUTPUTS, CAREFUL_LANES))
    places = np.empty(CAREFUL_LANES, dtype=np.int64)
    next_lane = 0
    while next_lane < LANES:
        count = 0
        while next_lane < LANES and count < CAREFUL_LANES:
            if answers[UNSETTLED, next_lane] > 0.0:
                places[count] = next_lane
                few[:, count] = lanes[:LEAF_INPUTS, next_lane]
                count += 1
            next_lane += 1
        if count == 0:
            break
        for i in range(count, CAREFUL_LANES):
            few[:, i] = few[:, 0]
        solve_block(leaf, few, CAREFUL_LANES, oxygenation, True, few_answers)
        for i in range(count):
            answers[:LEAF_OUTPUTS, places[i]] = few_answers[:, i]


@kernel
def gross_without_oxygenation(leaf, lanes, temperature, deficit, start, answers):  # type: ignore[no-untyped-def]
    """Gross assimilation without oxygenation at a given leaf temperature and deficit.

    Parameters
    ----------
    leaf : record of `C3_LEAF` or `C4_LEAF`
    lanes : float64 array (LEAF_INPUTS, LANES)
    temperature, deficit : float64 array (LANES,)
        Leaf temperature [degC] and leaf-to-air deficit [kPa], held.
    start : float64 array (LANES,)
        A net rate to start from [umol m-2 s-1].
    answers : float64 array (LANES,)
        Written: net rate plus respiration [umol m-2 s-1].
    """
    leaf_temperature = np.empty(LANES)
    leaf_deficit = np.empty(LANES)
    photons = np.empty(LANES)
    capacity = np.empty(LANES)
    pressure = np.empty(LANES)
    co2 = np.empty(LANES)
    growth = np.empty(LANES)
    vapour = np.empty(LANES)
    first_guess = np.empty(LANES)
    gross = np.empty(LANES)
    for i in range(LANES):
        leaf_temperature[i] = temperature[i]
        leaf_deficit[i] = deficit[i]
        first_guess[i] = start[i]
    for i in range(LANES):
        photons[i] = lanes[PHOTONS, i]
        capacity[i] = lanes[CAPACITY, i]
        pressure[i] = lanes[PRESSURE, i]
    for i in range(LANES):
        co2[i] = lanes[CO2, i]
        growth[i] = lanes[GROWTH_TEMPERATURE, i]
        vapour[i] = lanes[WIND, i]
    for i in range(LANES):
        normal_carboxylation, normal_electron_transport = normal_capacities(leaf, growth[i])
        state = leaf_state(
            leaf, leaf_temperature[i], photons[i], capacity[i], growth[i], normal_carboxylation,
            normal_electron_transport, pressure[i], 0.0,
        )  # fmt: skip
        resistance = VAPOUR_TO_CO2_BOUNDARY / vapour_conductance(vapour[i], leaf.leaf_width)
        factor = stomatal_factor(leaf.stomatal_slope, leaf_deficit[i])
        enzyme = first_guess[i]
        light = first_guess[i]
        enzyme, light = improved_rates(leaf, state, enzyme, light, co2[i], resistance, factor, pressure[i])
        enzyme, light = improved_rates(leaf, state, enzyme, light, co2[i], resistance, factor, pressure[i])
        enzyme, light = improved_rates(leaf, state, enzyme, light, co2[i], resistance, factor, pressure[i])
        enzyme, light = improved_rates(leaf, state, enzyme, light, co2[i], resistance, factor, pressure[i])
        enzyme, light = improved_rates(leaf, state, enzyme, light, co2[i], resistance, factor, pressure[i])
        gross[i] = combined_rate(leaf, state, enzyme, light, co2[i], resistance) + state.respiration
    for i in range(LANES):
        answers[i] = gross[i]
