"""C4 photosynthesis: von Caemmerer 2000, chapter 4, with mesophyll CO2 equal to intercellular CO2.

The equations keep the share x of electron transport for the CO2 pump fixed, so in dim light they overstate
what oxygen costs a C4 leaf.
"""

from __future__ import annotations

import math
from typing import Any, NamedTuple

from cropstress.compiled import at, inlined
from cropstress.leaf.responses import (
    arrhenius,
    deactivated,
    deactivation_exponent,
    leaf_respiration,
    smaller_root,
    three_inverses,
    useful_light,
)
from cropstress.leaf.stomata import LEAST_CO2, newton_on_demand, supply

_MICROBAR_PER_MOLE_FRACTION = 0.01  # ubar in 1 umol mol-1 at 1 kPa; 0.01 x P [kPa]


class C4State(NamedTuple):
    """Rates [umol m-2 s-1] and constants [ubar] of one C4 leaf at its temperature and light."""

    respiration: float
    carboxylation: float
    pep_carboxylation: float
    pep_regeneration: float
    pep_michaelis: float
    michaelis_co2: float
    inverse_michaelis_o2: float
    half_inverse_specificity: float
    electron_transport: float


@inlined
def c4_state(leaf: Any, around: Any, temperature: float, step: float) -> C4State:
    """Return the state of a leaf of given surroundings at a temperature [degC] and its Arrhenius step [K-1]."""
    carboxylation_kept, electron_kept, pep_kept = three_inverses(
        deactivated(
            leaf.carboxylation_deactivation,
            deactivation_exponent(leaf.carboxylation_deactivation, leaf.carboxylation_entropy_intercept),
            step,
        ),
        deactivated(
            leaf.electron_transport_deactivation,
            deactivation_exponent(leaf.electron_transport_deactivation, leaf.electron_transport_entropy_intercept),
            step,
        ),
        deactivated(
            leaf.pep_carboxylation_deactivation,
            deactivation_exponent(leaf.pep_carboxylation_deactivation, leaf.pep_carboxylation_entropy),
            step,
        ),
    )
    carboxylation = around.carboxylation_25 * arrhenius(leaf.carboxylation_activation, step) * carboxylation_kept
    electrons = around.electron_transport_25 * arrhenius(leaf.electron_transport_activation, step) * electron_kept
    pep = around.capacity * leaf.pep_normal * arrhenius(leaf.pep_carboxylation_activation, step) * pep_kept
    respiration = leaf_respiration(leaf.respiration_linear, leaf.respiration_quadratic, temperature)
    respiration *= around.capacity * leaf.carboxylation_capacity * leaf.respiration_ratio
    return C4State(
        respiration,
        around.capacity * carboxylation,
        leaf.pep_carboxylation_ratio * pep,
        leaf.pep_regeneration_ratio * pep,
        leaf.pep_michaelis * arrhenius(leaf.pep_michaelis_activation, step),
        leaf.michaelis_co2 * arrhenius(leaf.michaelis_co2_activation, step),
        around.oxygenation / leaf.michaelis_o2 * arrhenius(-leaf.michaelis_o2_activation, step),
        around.oxygenation
        * leaf.half_inverse_specificity
        * arrhenius(leaf.half_inverse_specificity_activation, step),
        smaller_root(leaf.light_curvature, useful_light(leaf, around), around.capacity * electrons),
    )


@inlined
def c4_kept(leaf: Any, space: Any, row: int, i: int, state: C4State) -> None:
    """Write a state into nine rows of a workspace."""
    space[at(row, i)] = state.respiration
    space[at(row + 1, i)] = state.carboxylation
    space[at(row + 2, i)] = state.pep_carboxylation
    space[at(row + 3, i)] = state.pep_regeneration
    space[at(row + 4, i)] = state.pep_michaelis
    space[at(row + 5, i)] = state.michaelis_co2
    space[at(row + 6, i)] = state.inverse_michaelis_o2
    space[at(row + 7, i)] = state.half_inverse_specificity
    space[at(row + 8, i)] = state.electron_transport


@inlined
def c4_found(leaf: Any, space: Any, row: int, i: int) -> C4State:
    """Read a state from nine rows of a workspace."""
    return C4State(
        space[at(row, i)], space[at(row + 1, i)], space[at(row + 2, i)], space[at(row + 3, i)], space[at(row + 4, i)],
        space[at(row + 5, i)], space[at(row + 6, i)], space[at(row + 7, i)], space[at(row + 8, i)],
    )  # fmt: skip


@inlined
def mesophyll_oxygen(leaf: Any, pressure: float) -> float:
    """Return the oxygen pressure in the mesophyll [ubar]."""
    return leaf.oxygen * 1000.0 * _MICROBAR_PER_MOLE_FRACTION * pressure


@inlined
def quadratic_rate(square: float, linear: float, constant: float) -> tuple[float, float]:
    """Return the smaller root of square A2 - linear A + constant = 0 and the root of its discriminant.

    `square` stays near 1 for every bundle sheath (alpha 0 to 1), so the plain formula loses no digits that
    matter.
    """
    root = math.sqrt(max(linear * linear - 4.0 * square * constant, 1e-18))
    return 0.5 * (linear - root) / square, root


@inlined
def c4_enzyme_demand(leaf: Any, state: C4State, co2: float, pressure: float) -> tuple[float, float, float]:
    """Return the enzyme-limited net rate, and its slope with intercellular CO2 as numerator and denominator.

    By implicit differentiation dA/dX = (used - A) / sqrt(discriminant), X being the pumped CO2.
    """
    to_pressure = _MICROBAR_PER_MOLE_FRACTION * pressure
    mesophyll = co2 * to_pressure
    oxygen = mesophyll_oxygen(leaf, pressure)
    conductance = leaf.bundle_sheath_conductance
    leak = leaf.bundle_sheath_oxygen_share / leaf.oxygen_leak_ratio
    inverse = 1.0 / (mesophyll + state.pep_michaelis)
    by_co2 = state.pep_carboxylation * mesophyll * inverse
    pep_slope = state.pep_carboxylation * state.pep_michaelis * inverse * inverse
    pep = min(by_co2, state.pep_regeneration)
    pumped = pep - leaf.mesophyll_respiration_share * state.respiration + conductance * mesophyll
    pumped_slope = ((pep_slope if by_co2 < state.pep_regeneration else 0.0) + conductance) * to_pressure
    used = state.carboxylation - state.respiration
    kinetics = conductance * state.michaelis_co2 * (1.0 + oxygen * state.inverse_michaelis_o2)
    specificity = state.half_inverse_specificity
    constants = state.michaelis_co2 * state.inverse_michaelis_o2
    square = 1.0 - leak * constants
    linear = (
        pumped + used + kinetics + leak * (specificity * state.carboxylation + state.respiration * constants)
    )
    constant = used * pumped - (
        state.carboxylation * conductance * specificity * oxygen + state.respiration * kinetics
    )
    rate, root = quadratic_rate(square, linear, constant)
    return rate, (used - rate) * pumped_slope, root


@inlined
def c4_light_demand(leaf: Any, state: C4State, co2: float, pressure: float) -> tuple[float, float, float]:
    """Return the net rate limited by electron transport, and its slope as of `c4_enzyme_demand`."""
    to_pressure = _MICROBAR_PER_MOLE_FRACTION * pressure
    oxygen = mesophyll_oxygen(leaf, pressure)
    conductance = leaf.bundle_sheath_conductance
    leak = leaf.bundle_sheath_oxygen_share / leaf.oxygen_leak_ratio
    specificity = state.half_inverse_specificity
    pumped = (
        0.5 * leaf.electron_partition * state.electron_transport
        - leaf.mesophyll_respiration_share * state.respiration
        + conductance * co2 * to_pressure
    )
    cycle = (1.0 - leaf.electron_partition) * state.electron_transport / 3.0
    used = cycle - state.respiration
    oxygen_cost = specificity * (cycle + 7.0 * state.respiration / 3.0)
    square = 1.0 - 7.0 * specificity * leak / 3.0
    linear = pumped + used + conductance * 7.0 * specificity * oxygen / 3.0 + leak * oxygen_cost
    constant = pumped * used - conductance * oxygen * oxygen_cost
    rate, root = quadratic_rate(square, linear, constant)
    return rate, (used - rate) * conductance * to_pressure, root


@inlined
def c4_rates(leaf: Any, state: C4State, co2: float, pressure: float) -> tuple[float, float]:
    """Return both limiting net rates at a given intercellular CO2: enzymes and electron transport."""
    enzyme, _, _ = c4_enzyme_demand(leaf, state, co2, pressure)
    light, _, _ = c4_light_demand(leaf, state, co2, pressure)
    return enzyme, light


@inlined
def c4_improved_rates(
    leaf: Any, state: C4State, enzyme: float, light: float, stomata: Any, pressure: float
) -> tuple[float, float]:
    """Return both limiting net rates nearer to where each meets the stomata by itself: a Newton step each."""
    inside, supply_slope = supply(stomata, enzyme)
    demand, rise, run = c4_enzyme_demand(leaf, state, max(inside, LEAST_CO2), pressure)
    enzyme = newton_on_demand(demand, rise, run, enzyme, supply_slope)
    inside, supply_slope = supply(stomata, light)
    demand, rise, run = c4_light_demand(leaf, state, max(inside, LEAST_CO2), pressure)
    light = newton_on_demand(demand, rise, run, light, supply_slope)
    return enzyme, light


@inlined
def c4_net_rate(leaf: Any, state: C4State, enzyme: float, light: float, co2_at_rest: float) -> float:
    """Return the smaller of the two limits, each solved with the stomata by itself."""
    return min(enzyme, light)


@inlined
def c4_carboxylation(
    leaf: Any, state: C4State, co2: float, assimilation: float, pressure: float
) -> tuple[float, float]:
    """Return carboxylation Vc and oxygenation Vo in the bundle sheath, whose gases follow from A."""
    mesophyll = co2 * _MICROBAR_PER_MOLE_FRACTION * pressure
    enzyme_rate, light_rate = c4_rates(leaf, state, co2, pressure)
    pep = min(
        state.pep_carboxylation * mesophyll / (mesophyll + state.pep_michaelis), state.pep_regeneration
    )
    limited_by_light = light_rate < enzyme_rate
    pumped = 0.5 * leaf.electron_partition * state.electron_transport if limited_by_light else pep
    conductance = leaf.bundle_sheath_conductance
    mesophyll_respiration = leaf.mesophyll_respiration_share * state.respiration
    co2_inside = mesophyll + (pumped - assimilation - mesophyll_respiration) / conductance
    oxygen_inside = (
        leaf.bundle_sheath_oxygen_share * assimilation / (leaf.oxygen_leak_ratio * conductance)
        + mesophyll_oxygen(leaf, pressure)
    )
    cycle = (1.0 - leaf.electron_partition) * state.electron_transport / 3.0
    enzyme = state.carboxylation * co2_inside / (
        co2_inside + state.michaelis_co2 * (1.0 + oxygen_inside * state.inverse_michaelis_o2)
    )
    light = cycle * co2_inside / (co2_inside + 7.0 * state.half_inverse_specificity * oxygen_inside / 3.0)
    carboxylation = light if limited_by_light else enzyme
    return carboxylation, 2.0 * state.half_inverse_specificity * oxygen_inside / co2_inside * carboxylation
