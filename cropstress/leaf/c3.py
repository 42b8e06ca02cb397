"""C3 photosynthesis: Farquhar, von Caemmerer & Berry 1980, with intercellular CO2.

`C3State` is what leaf temperature and light make of a leaf before its stomata are known.
"""

from __future__ import annotations

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
from cropstress.leaf.stomata import hyperbola, newton_on_hyperbola


class C3State(NamedTuple):
    """Rates [umol m-2 s-1] and constants [umol mol-1] of one C3 leaf at its temperature and light."""

    respiration: float
    carboxylation: float
    effective_michaelis: float
    electron_transport: float
    compensation_point: float
    triose_phosphate: float


@inlined
def c3_state(leaf: Any, around: Any, temperature: float, step: float) -> C3State:
    """Return the state of a leaf of given surroundings at a temperature [degC] and its Arrhenius step [K-1]."""
    michaelis_co2 = leaf.michaelis_co2 * arrhenius(leaf.michaelis_co2_activation, step)
    michaelis_co2 *= leaf.reference_pressure * around.inverse_pressure
    # Kc O / Ko: the two pressure factors cancel.
    oxygen_term = (
        leaf.michaelis_co2
        * leaf.oxygen
        / leaf.michaelis_o2
        * arrhenius(leaf.michaelis_co2_activation - leaf.michaelis_o2_activation, step)
    )
    carboxylation_exponent = deactivation_exponent(
        leaf.carboxylation_deactivation,
        leaf.carboxylation_entropy_intercept + leaf.carboxylation_entropy_slope * around.growth,
    )
    electron_exponent = deactivation_exponent(
        leaf.electron_transport_deactivation,
        leaf.electron_transport_entropy_intercept + leaf.electron_transport_entropy_slope * around.growth,
    )
    triose_exponent = deactivation_exponent(leaf.triose_phosphate_deactivation, leaf.triose_phosphate_entropy)
    carboxylation_kept, electron_kept, triose_kept = three_inverses(
        deactivated(leaf.carboxylation_deactivation, carboxylation_exponent, step),
        deactivated(leaf.electron_transport_deactivation, electron_exponent, step),
        deactivated(leaf.triose_phosphate_deactivation, triose_exponent, step),
    )
    carboxylation = around.carboxylation_25 * arrhenius(leaf.carboxylation_activation, step) * carboxylation_kept
    electrons = around.electron_transport_25 * arrhenius(leaf.electron_transport_activation, step) * electron_kept
    triose_phosphate = leaf.triose_normal * arrhenius(leaf.triose_phosphate_activation, step) * triose_kept
    respiration = leaf_respiration(leaf.respiration_linear, leaf.respiration_quadratic, temperature)
    return C3State(
        around.capacity * leaf.carboxylation_capacity * leaf.respiration_ratio * respiration,
        around.capacity * carboxylation,
        michaelis_co2 + around.oxygenation * oxygen_term,
        smaller_root(leaf.light_curvature, useful_light(leaf, around), around.capacity * electrons),
        around.oxygenation * leaf.compensation_point * arrhenius(leaf.compensation_point_activation, step),
        around.capacity * triose_phosphate,
    )


@inlined
def c3_kept(leaf: Any, space: Any, row: int, i: int, state: C3State) -> None:
    """Write a state into six rows of a workspace."""
    space[at(row, i)] = state.respiration
    space[at(row + 1, i)] = state.carboxylation
    space[at(row + 2, i)] = state.effective_michaelis
    space[at(row + 3, i)] = state.electron_transport
    space[at(row + 4, i)] = state.compensation_point
    space[at(row + 5, i)] = state.triose_phosphate


@inlined
def c3_found(leaf: Any, space: Any, row: int, i: int) -> C3State:
    """Read a state from six rows of a workspace."""
    return C3State(
        space[at(row, i)], space[at(row + 1, i)], space[at(row + 2, i)], space[at(row + 3, i)],
        space[at(row + 4, i)], space[at(row + 5, i)],
    )  # fmt: skip


@inlined
def c3_rates(leaf: Any, state: C3State, co2: float, pressure: float) -> tuple[float, float]:
    """Return both limiting net rates at a given intercellular CO2: Rubisco and electron transport."""
    above = co2 - state.compensation_point
    enzyme = state.carboxylation * above / (co2 + state.effective_michaelis)
    light = state.electron_transport * above / (4.0 * co2 + 8.0 * state.compensation_point)
    return enzyme - state.respiration, light - state.respiration


@inlined
def c3_improved_rates(
    leaf: Any, state: C3State, enzyme: float, light: float, stomata: Any, pressure: float
) -> tuple[float, float]:
    """Return both limiting net rates nearer to where each meets the stomata by itself.

    Two Newton steps each; both demands are hyperbolas in CO2, so that a step takes one division.
    """
    by_enzyme = hyperbola(
        state.carboxylation, state.effective_michaelis, state.compensation_point, state.respiration, stomata
    )
    by_light = hyperbola(
        0.25 * state.electron_transport, 2.0 * state.compensation_point, state.compensation_point,
        state.respiration, stomata,
    )  # fmt: skip
    enzyme = newton_on_hyperbola(by_enzyme, newton_on_hyperbola(by_enzyme, enzyme))
    light = newton_on_hyperbola(by_light, newton_on_hyperbola(by_light, light))
    return enzyme, light


@inlined
def c3_net_rate(leaf: Any, state: C3State, enzyme: float, light: float, co2_at_rest: float) -> float:
    """Return the net rate that follows from the limits, each solved with the stomata by itself.

    Above the compensation point it is the smallest. Below it the smallest carboxylation gives the largest,
    least negative, net rate, and the use of triose phosphate sets no limit. `co2_at_rest` is the intercellular
    CO2 of a leaf that only respires: it lies on the same side of the compensation point as the answer.
    """
    above = min(min(enzyme, light), 3.0 * state.triose_phosphate - state.respiration)
    below = max(enzyme, light)
    return above if co2_at_rest > state.compensation_point else below


@inlined
def c3_carboxylation(
    leaf: Any, state: C3State, co2: float, assimilation: float, pressure: float
) -> tuple[float, float]:
    """Return carboxylation Vc and oxygenation Vo = 2 (compensation point / CO2) Vc."""
    by_enzyme, by_light, by_co2 = three_inverses(
        co2 + state.effective_michaelis, 4.0 * co2 + 8.0 * state.compensation_point, co2
    )
    enzyme = state.carboxylation * co2 * by_enzyme
    light = state.electron_transport * co2 * by_light
    ratio = state.compensation_point * by_co2
    # At or below the compensation point the use of triose phosphate sets no limit.
    triose = 3.0 * state.triose_phosphate / max(1.0 - ratio, 1e-12) if ratio < 1.0 else 1e30
    carboxylation = min(min(enzyme, light), triose)
    return carboxylation, 2.0 * ratio * carboxylation
