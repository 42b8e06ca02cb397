"""What stomata let through, and the net rate at which supply and demand of CO2 meet."""

from __future__ import annotations

import math
from typing import Any, NamedTuple

from cropstress.compiled import inlined
from cropstress.leaf.air import SMALLEST_STOMATAL_DEFICIT, VAPOUR_TO_CO2_STOMATA

LEAST_CO2 = 1.0  # umol mol-1: a Newton step that overshoots is caught here
_SMALLEST_SHARE = 0.1  # of the rate before that a Newton step may leave


class Stomata(NamedTuple):
    """The way of CO2 into one leaf at its present deficit."""

    co2: float  # of the air [umol mol-1]
    resistance: float  # of the boundary layer to CO2 [m2 s mol-1]
    intercept: float  # conductance to vapour of a leaf that takes up nothing, g0 [mol m-2 s-1]
    factor: float  # 1.6 (1 + g1 / sqrt D) [1]


@inlined
def stomatal_factor(stomatal_slope: float, deficit: float) -> float:
    """Return 1.6 (1 + g1 / sqrt D); Medlyn et al. 2011, Eq. 11, with the corrigendum of 2012."""
    return VAPOUR_TO_CO2_STOMATA * (1.0 + stomatal_slope / math.sqrt(max(deficit, SMALLEST_STOMATAL_DEFICIT)))


@inlined
def surface_co2(stomata: Any, assimilation: float) -> float:
    """Return the CO2 at the leaf's surface [umol mol-1]."""
    return stomata.co2 - stomata.resistance * assimilation


@inlined
def conductance(stomata: Any, assimilation: float) -> float:
    """Return the stomatal conductance to vapour [mol m-2 s-1]; Medlyn et al. 2011."""
    return stomata.intercept + stomata.factor * max(assimilation, 0.0) / surface_co2(stomata, assimilation)


@inlined
def conductance_in_series(stomata: Any, assimilation: float, boundary: float) -> float:
    """Return the conductance of stomata and boundary layer to vapour [mol m-2 s-1]."""
    surface = surface_co2(stomata, assimilation)
    # Stomatal conductance x surface CO2, so that one division serves both.
    opened = stomata.intercept * surface + stomata.factor * max(assimilation, 0.0)
    return opened * boundary / (opened + boundary * surface)


@inlined
def supply(stomata: Any, assimilation: float) -> tuple[float, float]:
    """Return what the stomata allow at a net rate.

    Returns
    -------
    tuple
        Intercellular CO2 [umol mol-1] and its slope with the rate.
    """
    surface = surface_co2(stomata, assimilation)
    # Conductance x surface CO2, so that one division serves all.
    opened = stomata.intercept * surface + stomata.factor * max(assimilation, 0.0)
    inverse = 1.0 / opened
    opening = (stomata.factor if assimilation > 0.0 else 0.0) - stomata.intercept * stomata.resistance
    inside = surface - VAPOUR_TO_CO2_STOMATA * assimilation * surface * inverse
    slope = -stomata.resistance - VAPOUR_TO_CO2_STOMATA * inverse * (
        surface - assimilation * stomata.resistance - assimilation * surface * opening * inverse
    )
    return inside, slope


@inlined
def co2_at_rest(stomata: Any, respiration: float) -> float:
    """Return the intercellular CO2 of a leaf that only respires [umol mol-1]."""
    return stomata.co2 + (stomata.resistance + VAPOUR_TO_CO2_STOMATA / stomata.intercept) * respiration


class Hyperbola(NamedTuple):
    """A demand A + R = V (C - Γ) / (C + K) with the stomata's supply put in for C.

    With C = Cs - 1.6 A / gs, Cs = Ca - r A and gs = g0 + f A / Cs, both C - Γ and C + K become quadratics in A
    over gs Cs, so their ratio needs no further division.
    """

    takes_up: bool  # the leaf takes up CO2 at this limit: the root is positive
    capacity: float  # V [umol m-2 s-1]
    respiration: float  # R [umol m-2 s-1]
    above_0: float
    above_1: float
    below_0: float
    below_1: float
    square: float  # the coefficient of A2 in both


@inlined
def hyperbola(
    capacity: float, half_saturation: float, compensation_point: float, respiration: float, stomata: Any
) -> Hyperbola:
    """Return demand and supply of one limit; a leaf that gives off CO2 keeps its stomata at g0."""
    takes_up = capacity * (stomata.co2 - compensation_point) > respiration * (stomata.co2 + half_saturation)
    # gs Cs = open_0 + open_1 A, and gs Cs C = inside_0 + inside_1 A + square A2.
    open_0 = stomata.intercept * stomata.co2
    open_1 = (stomata.factor if takes_up else 0.0) - stomata.intercept * stomata.resistance
    narrowed = open_1 - VAPOUR_TO_CO2_STOMATA
    inside_0 = stomata.co2 * open_0
    inside_1 = stomata.co2 * narrowed - stomata.resistance * open_0
    return Hyperbola(
        takes_up,
        capacity,
        respiration,
        inside_0 - compensation_point * open_0,
        inside_1 - compensation_point * open_1,
        inside_0 + half_saturation * open_0,
        inside_1 + half_saturation * open_1,
        -stomata.resistance * narrowed,
    )


@inlined
def newton_on_hyperbola(limit: Any, rate: float) -> float:
    """Return a net rate nearer to where demand and supply of one limit meet.

    Nearly shut stomata make the supply steep near no uptake, with a pole on the other side: a leaf is kept on its
    own side, where steps from the side of zero never overshoot.
    """
    rate = max(rate, 0.0) if limit.takes_up else min(rate, 0.0)
    above = limit.above_0 + rate * (limit.above_1 + rate * limit.square)
    below = limit.below_0 + rate * (limit.below_1 + rate * limit.square)
    above_slope = limit.above_1 + 2.0 * rate * limit.square
    below_slope = limit.below_1 + 2.0 * rate * limit.square
    missing = limit.capacity * above - (limit.respiration + rate) * below
    fall = below * below - limit.capacity * (above_slope * below - above * below_slope)
    further = rate + below * missing / fall
    return max(further, _SMALLEST_SHARE * rate) if limit.takes_up else min(further, 0.0)


@inlined
def co2_when_open(stomata: Any) -> float:
    """Return the intercellular CO2 of a leaf whose uptake alone opens its stomata, in still free air [umol mol-1]."""
    return stomata.co2 * (1.0 - VAPOUR_TO_CO2_STOMATA / stomata.factor)


@inlined
def newton_on_demand(demand: float, rise: float, run: float, rate: float, supply_slope: float) -> float:
    """Return a net rate nearer to where a demand of slope rise / run with CO2 meets the supply."""
    return rate - (demand - rate) * run / (rise * supply_slope - run)
