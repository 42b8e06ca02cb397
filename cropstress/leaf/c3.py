"""C3 photosynthesis: Farquhar, von Caemmerer & Berry 1980, with intercellular CO2.

`C3State` is what leaf temperature and light make of a leaf before its stomata are known.
"""

from __future__ import annotations

from typing import Any, NamedTuple

from cropstress.compiled import inlined
from cropstress.leaf.responses import (
    arrhenius,
    deactivation_exponent,
    inverse_temperature_step,
    leaf_respiration,
    peaked_arrhenius,
    smaller_root,
)


class C3State(NamedTuple):
    """Rates [umol m-2 s-1] and constants [umol mol-1] of one C3 leaf at its temperature and light."""

    respiration: float
    carboxylation: float
    effective_michaelis: float
    electron_transport: float
    compensation_point: float
    triose_phosphate: float


@inlined
def c3_state(
    leaf: Any,
    temperature: float,
    absorbed_photons: float,
    capacity: float,
    growth_temperature: float,
    normal_carboxylation: float,
    normal_electron_transport: float,
    pressure: float,
    oxygenation: float,
) -> C3State:
    """Return the state of a leaf; `oxygenation` is 1, or 0 for the leaf without it."""
    step = inverse_temperature_step(temperature)
    in_pressure = leaf.reference_pressure / pressure
    michaelis_co2 = leaf.michaelis_co2 * arrhenius(leaf.michaelis_co2_activation, step) * in_pressure
    # Kc O / Ko: the two pressure factors cancel.
    oxygen_term = (
        leaf.michaelis_co2
        * leaf.oxygen
        / leaf.michaelis_o2
        * arrhenius(leaf.michaelis_co2_activation - leaf.michaelis_o2_activation, step)
    )
    carboxylation_exponent = deactivation_exponent(
        leaf.carboxylation_deactivation,
        leaf.carboxylation_entropy_intercept + leaf.carboxylation_entropy_slope * growth_temperature,
    )
    electron_exponent = deactivation_exponent(
        leaf.electron_transport_deactivation,
        leaf.electron_transport_entropy_intercept + leaf.electron_transport_entropy_slope * growth_temperature,
    )
    triose_exponent = deactivation_exponent(leaf.triose_phosphate_deactivation, leaf.triose_phosphate_entropy)
    maximum_electron_transport = (
        capacity
        * normal_electron_transport
        * peaked_arrhenius(
            leaf.electron_transport_activation, leaf.electron_transport_deactivation, electron_exponent, step
        )
    )
    useful_light = 0.5 * (1.0 - leaf.electron_loss_fraction) * absorbed_photons
    return C3State(
        capacity
        * leaf.carboxylation_capacity
        * leaf.respiration_ratio
        * leaf_respiration(leaf.respiration_linear, leaf.respiration_quadratic, temperature),
        capacity
        * normal_carboxylation
        * peaked_arrhenius(
            leaf.carboxylation_activation, leaf.carboxylation_deactivation, carboxylation_exponent, step
        ),
        michaelis_co2 + oxygenation * oxygen_term,
        smaller_root(leaf.light_curvature, useful_light, maximum_electron_transport),
        oxygenation * leaf.compensation_point * arrhenius(leaf.compensation_point_activation, step),
        capacity
        * leaf.triose_normal
        * peaked_arrhenius(
            leaf.triose_phosphate_activation, leaf.triose_phosphate_deactivation, triose_exponent, step
        ),
    )


@inlined
def c3_enzyme_demand(leaf: Any, state: C3State, co2: float, pressure: float) -> tuple[float, float]:
    """Return the Rubisco-limited net rate and its slope with intercellular CO2."""
    inverse = 1.0 / (co2 + state.effective_michaelis)
    gross = state.carboxylation * (co2 - state.compensation_point) * inverse
    slope = state.carboxylation * (state.effective_michaelis + state.compensation_point) * inverse * inverse
    return gross - state.respiration, slope


@inlined
def c3_light_demand(leaf: Any, state: C3State, co2: float, pressure: float) -> tuple[float, float]:
    """Return the net rate limited by electron transport and its slope with intercellular CO2."""
    inverse = 1.0 / (4.0 * co2 + 8.0 * state.compensation_point)
    gross = state.electron_transport * (co2 - state.compensation_point) * inverse
    slope = state.electron_transport * 12.0 * state.compensation_point * inverse * inverse
    return gross - state.respiration, slope


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
def c3_carboxylation(leaf: Any, state: C3State, co2: float, assimilation: float, pressure: float) -> tuple[float, float]:
    """Return carboxylation Vc and oxygenation Vo = 2 (compensation point / CO2) Vc."""
    enzyme = state.carboxylation * co2 / (co2 + state.effective_michaelis)
    light = state.electron_transport * co2 / (4.0 * co2 + 8.0 * state.compensation_point)
    ratio = state.compensation_point / co2
    above = max(1.0 - ratio, 1e-12)
    # At or below the compensation point the use of triose phosphate sets no limit.
    triose = 3.0 * state.triose_phosphate / above if ratio < 1.0 else 1e30
    carboxylation = min(min(enzyme, light), triose)
    return carboxylation, 2.0 * ratio * carboxylation
