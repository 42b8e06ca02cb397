"""Leaves whose temperature and deficit are held: only the rates and the stomata are solved."""

from __future__ import annotations

import numpy as np

from cropstress.compiled import LANES, ROW, at, kernel
from cropstress.leaf import solve
from cropstress.leaf.air import VAPOUR_TO_CO2_BOUNDARY, vapour_conductance
from cropstress.leaf.pathway import improved_rates, leaf_state, net_rate, state_found, state_kept
from cropstress.leaf.responses import temperature_terms
from cropstress.leaf.stomata import Stomata, co2_at_rest, stomatal_factor

_TEMPERATURE = 0
_DEFICIT = 1
_RATE = 2
_GROSS = 3
_STATE = 4  # and the rows after it
_WORKSPACE = 13
_IMPROVEMENTS = 4


@kernel
def gross_without_oxygenation(leaf, lanes, temperature, deficit, start, answers):  # type: ignore[no-untyped-def]
    """Gross assimilation without oxygenation at a given leaf temperature and deficit.

    Parameters
    ----------
    leaf : record of `C3_LEAF` or `C4_LEAF`
    lanes : float64 array (LEAF_INPUTS, LANES)
        See the row names of `solve`.
    temperature, deficit : float64 array (LANES,)
        Leaf temperature [degC] and leaf-to-air deficit [kPa], held.
    start : float64 array (LANES,)
        A net rate to start from [umol m-2 s-1].
    answers : float64 array (LANES,)
        Written: net rate plus respiration [umol m-2 s-1].
    """
    space = np.empty(solve.LEAF_INPUTS * ROW)
    held = np.empty(_WORKSPACE * ROW)
    for row in range(solve.LEAF_INPUTS):
        for i in range(LANES):
            space[at(row, i)] = lanes[row, i]
    for i in range(LANES):
        held[at(_TEMPERATURE, i)] = temperature[i]
        held[at(_DEFICIT, i)] = deficit[i]
        held[at(_RATE, i)] = start[i]
    for i in range(LANES):
        carboxylation_25, electron_transport_25 = solve.normal_capacities(leaf, space[at(solve.GROWTH_TEMPERATURE, i)])
        around = solve.Surroundings(
            space[at(solve.PHOTONS, i)], space[at(solve.CAPACITY, i)], space[at(solve.GROWTH_TEMPERATURE, i)],
            carboxylation_25, electron_transport_25, 1.0 / space[at(solve.PRESSURE, i)], 0.0,
        )  # fmt: skip
        step, _ = temperature_terms(held[at(_TEMPERATURE, i)])
        state_kept(leaf, held, _STATE, i, leaf_state(leaf, around, held[at(_TEMPERATURE, i)], step))
    for i in range(LANES):
        state = state_found(leaf, held, _STATE, i)
        stomata = Stomata(
            space[at(solve.CO2, i)],
            VAPOUR_TO_CO2_BOUNDARY / vapour_conductance(space[at(solve.WIND, i)], leaf.leaf_width),
            leaf.stomatal_intercept,
            stomatal_factor(leaf.stomatal_slope, held[at(_DEFICIT, i)]),
        )
        enzyme, light = held[at(_RATE, i)], held[at(_RATE, i)]
        for _ in range(_IMPROVEMENTS):
            enzyme, light = improved_rates(leaf, state, enzyme, light, stomata, space[at(solve.PRESSURE, i)])
        rate = net_rate(leaf, state, enzyme, light, co2_at_rest(stomata, state.respiration))
        held[at(_GROSS, i)] = rate + state.respiration
    for i in range(LANES):
        answers[i] = held[at(_GROSS, i)]
