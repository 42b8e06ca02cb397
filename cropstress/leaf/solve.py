"""Leaf temperature, stomata and assimilation of many leaves, solved together.

A block of leaves ("lanes") is walked step by step. A step is three straight-line loops over the lanes: what
leaf temperature makes of the leaf, where supply and demand of CO2 meet, and how the energy left over improves
the temperature. Short loops without branches become vector instructions, and the processor works on several
lanes at once. A leaf that has settled is left as it is, so no leaf depends on its neighbours.

A few secant steps inside a bracket are enough for nearly every leaf. Those that are left are gathered and
given more steps, and the last of them a scan upwards from the coolest possible leaf: it finds the first
temperature at which the leaf loses more energy than it takes up, the solution a leaf reaches from a cool morning.
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np

from cropstress.compiled import LANES, ROW, at, exponential, inlined, kernel, lane_loop
from cropstress.leaf.air import (
    AIR_HEAT_CAPACITY,
    EVAPORATION_HEAT,
    VAPOUR_TO_CO2_BOUNDARY,
    energy_surplus,
    heat_conductance,
    radiative_conductance,
    vapour_conductance,
)
from cropstress.leaf.pathway import (
    carboxylation,
    improved_rates,
    leaf_state,
    limiting_rates,
    net_rate,
    state_found,
    state_kept,
)
from cropstress.leaf.responses import peak_normalisation, temperature_terms, three_inverses
from cropstress.leaf.stomata import (
    Stomata,
    co2_at_rest,
    co2_when_open,
    conductance,
    conductance_in_series,
    stomatal_factor,
    supply,
)

FEW_LANES = 32  # those left over are taken in multiples of this, of every vector width times unrolling
_SECANT_STEPS = 4  # for all leaves
_MORE_SECANT_STEPS = 12  # for the few that are left then
_SCAN_STEPS = 40
_REFINING_STEPS = 24
_START = 0.25  # share of the way from the air down to the coolest leaf: few steps, and the coolest solution (measured)
_TOLERANCE = 3e-5  # K: the surplus left over in an accepted solution, by its slope with temperature
_LAST_STEP = 0.05  # K: a larger last step means that the secant had not settled
_KEPT_OPEN = 0.5  # 1; see `expected_slope`
_LEAST_SLOPE = 0.05  # of cp (gH + gr): a flatter secant is not trusted
_RATE_TOLERANCE = 1e-5  # umol m-2 s-1: between the net rate solved for and what carboxylation gives

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
# Further rows of the workspace that holds them.
_CARBOXYLATION_25 = 10
_ELECTRON_TRANSPORT_25 = 11
_SENSIBLE = 12
_VAPOUR = 13
_RESISTANCE = 14
_INVERSE_PRESSURE = 15
_LOWER = 16
_UPPER = 17
_TEMPERATURE = 18
_BEFORE = 19
_SURPLUS_BEFORE = 20
_RISE = 21
_RUN = 22
_SETTLED = 23
_ENZYME = 24
_LIGHT = 25
_DEFICIT = 26
_FACTOR = 27
_STATE = 28  # and the rows after it
_WORKSPACE = 37

# Rows of the block with the answers.
ASSIMILATION = 0  # net [umol m-2 s-1]
RESPIRATION = 1  # [umol m-2 s-1]
LEAF_TEMPERATURE = 2  # [degC]
DEFICIT = 3  # leaf to air [kPa]
INTERCELLULAR_CO2 = 4  # [umol mol-1]
STOMATAL_CONDUCTANCE = 5  # to vapour [mol m-2 s-1]
CARBOXYLATION = 6  # [umol m-2 s-1]
OXYGENATION = 7  # [umol m-2 s-1]
UNSETTLED = 8  # 1 where the steps taken did not settle
LEAF_OUTPUTS = 9


class Surroundings(NamedTuple):
    """What makes the state of one leaf at a temperature, beside the crop."""

    photons: float  # absorbed [umol m-2 s-1]
    capacity: float  # of the top leaf's [1]
    growth: float  # temperature [degC]
    carboxylation_25: float  # Vcmax25 with the normalisation of its peak [umol m-2 s-1]
    electron_transport_25: float  # Jmax25 with the normalisation of its peak [umol m-2 s-1]
    inverse_pressure: float  # [kPa-1]
    oxygenation: float  # 1, or 0 for the leaf without it


@inlined
def normal_capacities(leaf, growth_temperature):  # type: ignore[no-untyped-def]
    """Return Vcmax25 and Jmax25 with the normalisations of their peaks [umol m-2 s-1]."""
    ratio = leaf.electron_transport_ratio_intercept + leaf.electron_transport_ratio_slope * growth_temperature
    return (
        leaf.carboxylation_capacity
        * peak_normalisation(
            leaf.carboxylation_deactivation,
            leaf.carboxylation_entropy_intercept + leaf.carboxylation_entropy_slope * growth_temperature,
        ),
        leaf.carboxylation_capacity
        * ratio
        * peak_normalisation(
            leaf.electron_transport_deactivation,
            leaf.electron_transport_entropy_intercept + leaf.electron_transport_entropy_slope * growth_temperature,
        ),
    )


@inlined
def stomata_of(leaf, space, i):  # type: ignore[no-untyped-def]
    """Return the way of CO2 into the leaf of one lane."""
    return Stomata(space[at(CO2, i)], space[at(_RESISTANCE, i)], leaf.stomatal_intercept, space[at(_FACTOR, i)])


@lane_loop
def set_out(leaf, lanes, width, space):  # type: ignore[no-untyped-def]
    """Copy a block of leaves into the workspace and work out what does not change while they are solved."""
    for row in range(LEAF_INPUTS):
        for i in range(width):
            space[at(row, i)] = lanes[row, i]
    for i in range(width):
        wind, air, dew_point = space[at(WIND, i)], space[at(AIR_TEMPERATURE, i)], space[at(DEW_POINT, i)]
        sensible = heat_conductance(wind, leaf.leaf_width) + radiative_conductance(air)
        vapour = vapour_conductance(wind, leaf.leaf_width)
        by_vapour, by_pressure, by_sensible = three_inverses(vapour, space[at(PRESSURE, i)], sensible)
        driest = air + space[at(NET_RADIATION, i)] / AIR_HEAT_CAPACITY * by_sensible
        carboxylation_25, electron_transport_25 = normal_capacities(leaf, space[at(GROWTH_TEMPERATURE, i)])
        space[at(_CARBOXYLATION_25, i)] = carboxylation_25
        space[at(_ELECTRON_TRANSPORT_25, i)] = electron_transport_25
        space[at(_SENSIBLE, i)] = sensible
        space[at(_VAPOUR, i)] = vapour
        space[at(_RESISTANCE, i)] = VAPOUR_TO_CO2_BOUNDARY * by_vapour
        space[at(_INVERSE_PRESSURE, i)] = by_pressure
        coolest, warmest = min(dew_point, driest), max(dew_point, driest)
        near_air = min(max(air, coolest), warmest)
        space[at(_LOWER, i)] = coolest
        space[at(_UPPER, i)] = warmest
        space[at(_TEMPERATURE, i)] = near_air - _START * (near_air - coolest)
        space[at(_SETTLED, i)] = 0.0


@lane_loop
def respond(leaf, width, oxygenation, space):  # type: ignore[no-untyped-def]
    """Work out what leaf temperature makes of the leaves: their state, deficit and stomata."""
    for i in range(width):
        around = Surroundings(
            space[at(PHOTONS, i)], space[at(CAPACITY, i)], space[at(GROWTH_TEMPERATURE, i)],
            space[at(_CARBOXYLATION_25, i)], space[at(_ELECTRON_TRANSPORT_25, i)], space[at(_INVERSE_PRESSURE, i)],
            oxygenation,
        )  # fmt: skip
        temperature = space[at(_TEMPERATURE, i)]
        step, inverse = temperature_terms(temperature)
        saturation = 0.6108 * exponential(17.27 * temperature * inverse)  # FAO-56 Eq. 11
        deficit = saturation - space[at(VAPOUR_PRESSURE, i)]
        space[at(_DEFICIT, i)] = deficit
        space[at(_FACTOR, i)] = stomatal_factor(leaf.stomatal_slope, deficit)
        state_kept(leaf, space, _STATE, i, leaf_state(leaf, around, temperature, step))


@lane_loop
def start_rates(leaf, width, space):  # type: ignore[no-untyped-def]
    """Set the limiting rates to those of a leaf whose uptake alone opens its stomata."""
    for i in range(width):
        state = state_found(leaf, space, _STATE, i)
        enzyme, light = limiting_rates(leaf, state, co2_when_open(stomata_of(leaf, space, i)), space[at(PRESSURE, i)])
        space[at(_ENZYME, i)] = enzyme
        space[at(_LIGHT, i)] = light


@lane_loop
def meet(leaf, width, space):  # type: ignore[no-untyped-def]
    """Bring the limiting rates nearer to where demand meets supply, in leaves that have not settled."""
    for i in range(width):
        state = state_found(leaf, space, _STATE, i)
        stomata = stomata_of(leaf, space, i)
        enzyme_before, light_before, settled = space[at(_ENZYME, i)], space[at(_LIGHT, i)], space[at(_SETTLED, i)]
        enzyme, light = improved_rates(leaf, state, enzyme_before, light_before, stomata, space[at(PRESSURE, i)])
        space[at(_ENZYME, i)] = enzyme_before if settled > 0.0 else enzyme
        space[at(_LIGHT, i)] = light_before if settled > 0.0 else light


@inlined
def energy_of(leaf, space, i):  # type: ignore[no-untyped-def]
    """Return the surplus of energy of one lane's leaf [W m-2] and its conductance to vapour [mol m-2 s-1]."""
    state = state_found(leaf, space, _STATE, i)
    stomata = stomata_of(leaf, space, i)
    rate = net_rate(leaf, state, space[at(_ENZYME, i)], space[at(_LIGHT, i)], co2_at_rest(stomata, state.respiration))
    passed = conductance_in_series(stomata, rate, space[at(_VAPOUR, i)])
    surplus = energy_surplus(
        space[at(_TEMPERATURE, i)], space[at(AIR_TEMPERATURE, i)], space[at(_DEFICIT, i)], space[at(NET_RADIATION, i)],
        space[at(_SENSIBLE, i)], passed, space[at(_INVERSE_PRESSURE, i)],
    )  # fmt: skip
    return surplus, passed


@inlined
def expected_slope(space, i, passed):  # type: ignore[no-untyped-def]
    """Return about how fast the surplus falls with leaf temperature [W m-2 K-1], for a first step.

    Stomata that close as the air gets drier give back about half of what the deficit adds (measured).
    """
    shifted = space[at(_TEMPERATURE, i)] + 237.3
    steepness = 4098.0 * (space[at(_DEFICIT, i)] + space[at(VAPOUR_PRESSURE, i)]) / (shifted * shifted)  # FAO-56 Eq. 13
    evaporated = _KEPT_OPEN * EVAPORATION_HEAT * passed * steepness * space[at(_INVERSE_PRESSURE, i)]
    return -AIR_HEAT_CAPACITY * space[at(_SENSIBLE, i)] - evaporated


@lane_loop
def first_step(leaf, width, space):  # type: ignore[no-untyped-def]
    """Improve the temperatures by the slope to be expected."""
    for i in range(width):
        here, coolest, warmest = space[at(_TEMPERATURE, i)], space[at(_LOWER, i)], space[at(_UPPER, i)]
        surplus, passed = energy_of(leaf, space, i)
        slope = expected_slope(space, i, passed)
        space[at(_BEFORE, i)] = here
        space[at(_SURPLUS_BEFORE, i)] = surplus
        space[at(_RISE, i)] = slope
        space[at(_RUN, i)] = 1.0
        space[at(_TEMPERATURE, i)] = min(max(here - surplus / slope, coolest), warmest)


@lane_loop
def secant_step(leaf, width, space):  # type: ignore[no-untyped-def]
    """Improve the temperatures by the slope from the step before; return how many leaves still move."""
    for i in range(width):
        here, before = space[at(_TEMPERATURE, i)], space[at(_BEFORE, i)]
        coolest, warmest = space[at(_LOWER, i)], space[at(_UPPER, i)]
        rise_before, run_before, settled = space[at(_RISE, i)], space[at(_RUN, i)], space[at(_SETTLED, i)]
        conducted = AIR_HEAT_CAPACITY * space[at(_SENSIBLE, i)]
        surplus, _ = energy_of(leaf, space, i)
        moved = here - before
        fell = surplus - space[at(_SURPLUS_BEFORE, i)]
        # The slope is fell / moved. One that is too flat, or of too small a step, is not trusted.
        steep = -fell * moved > _LEAST_SLOPE * conducted * moved * moved and abs(moved) > 1e-9
        rise = fell if steep else rise_before
        run = moved if steep else run_before
        asked = surplus * run / rise
        arrived = max(abs(asked), abs(surplus) / conducted) < _TOLERANCE and abs(moved) < _LAST_STEP
        stays = 1.0 if arrived else settled
        further = min(max(here - asked, coolest), warmest)
        space[at(_BEFORE, i)] = here
        space[at(_SURPLUS_BEFORE, i)] = surplus
        space[at(_RISE, i)] = rise
        space[at(_RUN, i)] = run
        space[at(_SETTLED, i)] = stays
        space[at(_TEMPERATURE, i)] = here if stays > 0.0 else further
    moving = 0
    for i in range(width):
        moving += 0 if space[at(_SETTLED, i)] > 0.0 else 1
    return moving


@lane_loop
def written_out(leaf, width, space, results, answers):  # type: ignore[no-untyped-def]
    """Work out the answers of leaves that have settled; return how many have not.

    The state of a leaf that has settled was made at its own temperature, by the last `respond`.
    """
    for i in range(width):
        state = state_found(leaf, space, _STATE, i)
        stomata = stomata_of(leaf, space, i)
        at_rest = co2_at_rest(stomata, state.respiration)
        solved = net_rate(leaf, state, space[at(_ENZYME, i)], space[at(_LIGHT, i)], at_rest)
        inside, _ = supply(stomata, solved)
        fixed, oxygenated = carboxylation(leaf, state, inside, solved, space[at(PRESSURE, i)])
        rate = fixed - 0.5 * oxygenated - state.respiration
        results[at(ASSIMILATION, i)] = rate
        results[at(RESPIRATION, i)] = state.respiration
        results[at(LEAF_TEMPERATURE, i)] = space[at(_TEMPERATURE, i)]
        results[at(DEFICIT, i)] = space[at(_DEFICIT, i)]
        results[at(INTERCELLULAR_CO2, i)] = inside
        results[at(STOMATAL_CONDUCTANCE, i)] = conductance(stomata, solved)
        results[at(CARBOXYLATION, i)] = fixed
        results[at(OXYGENATION, i)] = oxygenated
        agreed = abs(rate - solved) < _RATE_TOLERANCE
        results[at(UNSETTLED, i)] = 0.0 if agreed and space[at(_SETTLED, i)] > 0.0 else 1.0
    for row in range(LEAF_OUTPUTS):
        for i in range(width):
            answers[row, i] = results[at(row, i)]
    unsettled = 0
    for i in range(width):
        unsettled += 1 if results[at(UNSETTLED, i)] > 0.0 else 0
    return unsettled


@lane_loop
def gather(space, answers, first, most, few, places):  # type: ignore[no-untyped-def]
    """Copy unsettled lanes from lane `first` on, `most` at most, into another workspace.

    Returns
    -------
    tuple of int
        Lanes copied; that number filled up to whole vectors, with copies of the last; the lane to go on from.
    """
    count = 0
    lane = first
    while lane < LANES and count < most:
        if answers[UNSETTLED, lane] > 0.0:
            places[count] = lane
            count += 1
        lane += 1
    width = (count + FEW_LANES - 1) // FEW_LANES * FEW_LANES
    places[count:width] = places[count - 1]
    for row in range(_STATE):
        for k in range(width):
            few[at(row, k)] = space[at(row, places[k])]
    return count, width, lane


@lane_loop
def scatter(few_answers, count, places, answers):  # type: ignore[no-untyped-def]
    """Copy answers back to the lanes they belong to."""
    for k in range(count):
        for row in range(LEAF_OUTPUTS):
            answers[row, places[k]] = few_answers[row, k]


@lane_loop
def walk_by_secants(leaf, width, steps, oxygenation, space):  # type: ignore[no-untyped-def]
    """Take secant steps until all leaves have settled."""
    for _ in range(steps):
        respond(leaf, width, oxygenation, space)
        meet(leaf, width, space)
        if secant_step(leaf, width, space) == 0:
            break


@lane_loop
def scan_upwards(leaf, width, oxygenation, space):  # type: ignore[no-untyped-def]
    """Find the coolest temperature at which a leaf loses more energy than it takes up, then bisect."""
    for i in range(width):
        space[at(_TEMPERATURE, i)] = space[at(_LOWER, i)]
        space[at(_RUN, i)] = (space[at(_UPPER, i)] - space[at(_LOWER, i)]) / _SCAN_STEPS
        space[at(_RISE, i)] = 0.0  # 1 where it was found
        space[at(_SETTLED, i)] = 0.0
    respond(leaf, width, oxygenation, space)
    start_rates(leaf, width, space)
    for _ in range(_SCAN_STEPS + _REFINING_STEPS):
        respond(leaf, width, oxygenation, space)
        meet(leaf, width, space)
        for i in range(width):
            here, coolest, warmest = space[at(_TEMPERATURE, i)], space[at(_LOWER, i)], space[at(_UPPER, i)]
            surplus, _ = energy_of(leaf, space, i)
            found = 1.0 if surplus <= 0.0 else space[at(_RISE, i)]
            coolest = here if surplus > 0.0 else coolest
            warmest = warmest if surplus > 0.0 else here
            space[at(_LOWER, i)] = coolest
            space[at(_UPPER, i)] = warmest
            space[at(_RISE, i)] = found
            space[at(_TEMPERATURE, i)] = 0.5 * (coolest + warmest) if found > 0.0 else here + space[at(_RUN, i)]
    respond(leaf, width, oxygenation, space)


@kernel
def solve_leaves(leaf, lanes, oxygenation, answers):  # type: ignore[no-untyped-def]
    """Solve a block of leaves.

    Parameters
    ----------
    leaf : record of `C3_LEAF` or `C4_LEAF`
    lanes : float64 array (LEAF_INPUTS, LANES)
        The leaves, see the row names of this module.
    oxygenation : float
        1, or 0 for leaves whose Rubisco takes no oxygen.
    answers : float64 array (LEAF_OUTPUTS, LANES)
        Written.
    """
    space = np.empty(_WORKSPACE * ROW)
    results = np.empty(LEAF_OUTPUTS * ROW)
    set_out(leaf, lanes, LANES, space)
    respond(leaf, LANES, oxygenation, space)
    start_rates(leaf, LANES, space)
    meet(leaf, LANES, space)
    first_step(leaf, LANES, space)
    walk_by_secants(leaf, LANES, _SECANT_STEPS, oxygenation, space)
    unsettled = written_out(leaf, LANES, space, results, answers)
    if unsettled == 0:
        return
    few = np.empty(_WORKSPACE * ROW)
    few_answers = np.empty((LEAF_OUTPUTS, LANES))
    places = np.empty(LANES, dtype=np.int64)
    count, width, _ = gather(space, answers, 0, LANES, few, places)
    walk_by_secants(leaf, width, _MORE_SECANT_STEPS, oxygenation, few)
    unsettled = written_out(leaf, width, few, results, few_answers)
    scatter(few_answers, count, places, answers)
    next_lane = 0
    while unsettled > 0 and next_lane < LANES:
        count, width, next_lane = gather(space, answers, next_lane, FEW_LANES, few, places)
        if count == 0:
            break
        scan_upwards(leaf, width, oxygenation, few)
        written_out(leaf, width, few, results, few_answers)
        scatter(few_answers, count, places, answers)
