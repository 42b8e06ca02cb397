"""What the air around a leaf does to it: boundary layer, humidity and energy."""

from __future__ import annotations

import math

from cropstress.compiled import inlined
from cropstress.leaf.responses import ZERO_CELSIUS

AIR_HEAT_CAPACITY = 29.3  # J mol-1 K-1; Campbell & Norman 1998 (from memory)
EVAPORATION_HEAT = 44100.0  # J mol-1; Campbell & Norman 1998 (from memory)
LEAF_EMISSIVITY = 0.97  # 1; Campbell & Norman 1998 (from memory)
STEFAN_BOLTZMANN = 5.67e-8  # W m-2 K-4
VAPOUR_TO_CO2_STOMATA = 1.6  # 1; ratio of diffusivities (from memory)
VAPOUR_TO_CO2_BOUNDARY = 1.37  # 1; the same to the power 2/3 (from memory)
SMALLEST_STOMATAL_DEFICIT = 0.05  # kPa, chosen here: the stomatal law grows without bound at 0
SMALLEST_WIND = 0.5  # m s-1, chosen here: forced convection only
_OUTDOORS_BOTH_SIDES = 2.0 * 1.4  # two sides x turbulence of outdoor air; Campbell & Norman 1998
_CHARACTERISTIC_SHARE = 0.72  # of leaf width; Campbell & Norman 1998


@inlined
def heat_conductance(wind: float, leaf_width: float) -> float:
    """Return the boundary-layer conductance to heat [mol m-2 s-1], both sides; Campbell & Norman 1998, T. 7.6."""
    return _OUTDOORS_BOTH_SIDES * 0.135 * math.sqrt(max(wind, SMALLEST_WIND) / (_CHARACTERISTIC_SHARE * leaf_width))


@inlined
def vapour_conductance(wind: float, leaf_width: float) -> float:
    """Return the boundary-layer conductance to vapour [mol m-2 s-1], both sides; Campbell & Norman 1998, T. 7.6."""
    return _OUTDOORS_BOTH_SIDES * 0.147 * math.sqrt(max(wind, SMALLEST_WIND) / (_CHARACTERISTIC_SHARE * leaf_width))


@inlined
def radiative_conductance(air_temperature: float) -> float:
    """Return 4 emissivity sigma T3 / cp [mol m-2 s-1], both sides."""
    kelvin = air_temperature + ZERO_CELSIUS
    return 8.0 * LEAF_EMISSIVITY * STEFAN_BOLTZMANN * kelvin * kelvin * kelvin / AIR_HEAT_CAPACITY


@inlined
def energy_surplus(
    leaf_temperature: float,
    air_temperature: float,
    deficit: float,
    net_radiation: float,
    sensible_conductance: float,
    vapour_conductance: float,
    inverse_pressure: float,
) -> float:
    """Return absorbed minus lost energy of a leaf [W m-2]; zero at its temperature."""
    sensible = AIR_HEAT_CAPACITY * sensible_conductance * (leaf_temperature - air_temperature)
    return net_radiation - sensible - EVAPORATION_HEAT * vapour_conductance * deficit * inverse_pressure


@inlined
def dew_point(vapour_pressure: float) -> float:
    """Return the dew point [degC] of a vapour pressure [kPa]; FAO-56 Eq. 3-11, the inverse of Eq. 11."""
    logarithm = math.log(vapour_pressure / 0.6108)
    return 237.3 * logarithm / (17.27 - logarithm)
