"""The leaf solution once more in plain vectorised NumPy, to the same accuracy: what the kernel is measured against.

It is the same secant on the energy surplus with two Newton steps on each limit, written as one would write it
with arrays, and the same scan upwards for the leaves that do not settle, on the arrays of just those leaves.
"""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import numpy as np

from cropstress.leaf import solve

Array = np.ndarray
Leaf = dict[str, float]

_GAS = 8.314
_HEAT = 29.3  # J mol-1 K-1
_EVAPORATION = 44100.0  # J mol-1
_SECANT_STEPS = 6


def _arrhenius(activation: float, step: Array) -> Array:
    return np.exp(activation / _GAS * step)


def _peaked(activation: float, deactivation: float, entropy: Array | float, step: Array) -> Array:
    at_25 = (298.15 * entropy - deactivation) / (298.15 * _GAS)
    return _arrhenius(activation, step) * (1.0 + np.exp(at_25)) / (1.0 + np.exp(at_25 + deactivation / _GAS * step))


def _respiration(leaf: Leaf, capacity: Array, temperature: Array) -> Array:
    shape = leaf["respiration_linear"] * (temperature - 25.0)
    shape = shape + leaf["respiration_quadratic"] * (temperature**2 - 625.0)
    return capacity * leaf["carboxylation_capacity"] * leaf["respiration_ratio"] * np.exp(shape)


def _electron_transport(leaf: Leaf, lanes: Array, step: Array) -> Array:
    growth = lanes[solve.GROWTH_TEMPERATURE]
    entropy = leaf["electron_transport_entropy_intercept"] + leaf["electron_transport_entropy_slope"] * growth
    ratio = leaf["electron_transport_ratio_intercept"] + leaf["electron_transport_ratio_slope"] * growth
    maximum = lanes[solve.CAPACITY] * leaf["carboxylation_capacity"] * ratio
    maximum = maximum * _peaked(
        leaf["electron_transport_activation"], leaf["electron_transport_deactivation"], entropy, step
    )
    useful = 0.5 * (1.0 - leaf["electron_loss_fraction"]) * lanes[solve.PHOTONS]
    total = useful + maximum
    return 2.0 * useful * maximum / (total + np.sqrt(total**2 - 4.0 * leaf["light_curvature"] * useful * maximum))


def _carboxylation_capacity(leaf: Leaf, lanes: Array, step: Array) -> Array:
    growth = lanes[solve.GROWTH_TEMPERATURE]
    entropy = leaf["carboxylation_entropy_intercept"] + leaf["carboxylation_entropy_slope"] * growth
    shape = _peaked(leaf["carboxylation_activation"], leaf["carboxylation_deactivation"], entropy, step)
    return lanes[solve.CAPACITY] * leaf["carboxylation_capacity"] * shape


def _c3_demands(leaf: Leaf, lanes: Array, temperature: Array, oxygenation: float) -> dict[str, Any]:
    step = 1.0 / 298.15 - 1.0 / (temperature + 273.15)
    capacity = lanes[solve.CAPACITY]
    respiration = _respiration(leaf, capacity, temperature)
    fixing = _carboxylation_capacity(leaf, lanes, step)
    relative = leaf["reference_pressure"] / lanes[solve.PRESSURE]
    michaelis = leaf["michaelis_co2"] * _arrhenius(leaf["michaelis_co2_activation"], step) * relative
    michaelis_o2 = leaf["michaelis_o2"] * _arrhenius(leaf["michaelis_o2_activation"], step) * relative
    michaelis = michaelis * (1.0 + oxygenation * leaf["oxygen"] / michaelis_o2)
    star = oxygenation * leaf["compensation_point"] * _arrhenius(leaf["compensation_point_activation"], step)
    electrons = _electron_transport(leaf, lanes, step)
    triose = capacity * leaf["triose_normal"] * _arrhenius(leaf["triose_phosphate_activation"], step)
    at_25 = (298.15 * leaf["triose_phosphate_entropy"] - leaf["triose_phosphate_deactivation"]) / (298.15 * _GAS)
    triose = triose / (1.0 + np.exp(at_25 + leaf["triose_phosphate_deactivation"] / _GAS * step))

    def enzyme(co2: Array) -> tuple[Array, Array]:
        inverse = 1.0 / (co2 + michaelis)
        return fixing * (co2 - star) * inverse - respiration, fixing * (michaelis + star) * inverse**2

    def light(co2: Array) -> tuple[Array, Array]:
        inverse = 1.0 / (4.0 * co2 + 8.0 * star)
        return electrons * (co2 - star) * inverse - respiration, 12.0 * electrons * star * inverse**2

    def combined(by_enzyme: Array, by_light: Array, at_rest: Array) -> Array:
        above = np.minimum(np.minimum(by_enzyme, by_light), 3.0 * triose - respiration)
        return np.where(at_rest > star, above, np.maximum(by_enzyme, by_light))

    return {"enzyme": enzyme, "light": light, "combined": combined, "respiration": respiration}


def _c4_demands(leaf: Leaf, lanes: Array, temperature: Array, oxygenation: float) -> dict[str, Any]:
    step = 1.0 / 298.15 - 1.0 / (temperature + 273.15)
    capacity = lanes[solve.CAPACITY]
    respiration = _respiration(leaf, capacity, temperature)
    mesophyll = leaf["mesophyll_respiration_share"] * respiration
    fixing = _carboxylation_capacity(leaf, lanes, step)
    at_25 = (298.15 * leaf["pep_carboxylation_entropy"] - leaf["pep_carboxylation_deactivation"]) / (298.15 * _GAS)
    pep = capacity * leaf["pep_normal"] * _arrhenius(leaf["pep_carboxylation_activation"], step)
    pep = pep / (1.0 + np.exp(at_25 + leaf["pep_carboxylation_deactivation"] / _GAS * step))
    pep_michaelis = leaf["pep_michaelis"] * _arrhenius(leaf["pep_michaelis_activation"], step)
    michaelis = leaf["michaelis_co2"] * _arrhenius(leaf["michaelis_co2_activation"], step)
    per_oxygen = oxygenation / (leaf["michaelis_o2"] * _arrhenius(leaf["michaelis_o2_activation"], step))
    warmed = _arrhenius(leaf["half_inverse_specificity_activation"], step)
    star = oxygenation * leaf["half_inverse_specificity"] * warmed
    electrons = _electron_transport(leaf, lanes, step)
    to_pressure = 0.01 * lanes[solve.PRESSURE]
    oxygen = 1000.0 * leaf["oxygen"] * to_pressure
    sheath = leaf["bundle_sheath_conductance"]
    leak = leaf["bundle_sheath_oxygen_share"] / leaf["oxygen_leak_ratio"]

    def root_of(square: Array, linear: Array, constant: Array) -> tuple[Array, Array]:
        root = np.sqrt(np.maximum(linear**2 - 4.0 * square * constant, 1e-18))
        return 0.5 * (linear - root) / square, root

    def enzyme(co2: Array) -> tuple[Array, Array]:
        pressure = co2 * to_pressure
        by_co2 = leaf["pep_carboxylation_ratio"] * pep * pressure / (pressure + pep_michaelis)
        most = leaf["pep_regeneration_ratio"] * pep
        pumped = np.minimum(by_co2, most) - mesophyll + sheath * pressure
        slope = np.where(by_co2 < most, by_co2 * pep_michaelis / (pressure * (pressure + pep_michaelis)), 0.0) + sheath
        used = fixing - respiration
        kinetics = sheath * michaelis * (1.0 + oxygen * per_oxygen)
        constants = michaelis * per_oxygen
        linear = pumped + used + kinetics + leak * (star * fixing + respiration * constants)
        constant = used * pumped - (fixing * sheath * star * oxygen + respiration * kinetics)
        rate, root = root_of(1.0 - leak * constants, linear, constant)
        return rate, (used - rate) / root * slope * to_pressure

    def light(co2: Array) -> tuple[Array, Array]:
        pumped = 0.5 * leaf["electron_partition"] * electrons - mesophyll + sheath * co2 * to_pressure
        cycle = (1.0 - leaf["electron_partition"]) * electrons / 3.0
        used = cycle - respiration
        cost = star * (cycle + 7.0 * respiration / 3.0)
        linear = pumped + used + sheath * 7.0 * star * oxygen / 3.0 + leak * cost
        rate, root = root_of(1.0 - 7.0 * star * leak / 3.0, linear, pumped * used - sheath * oxygen * cost)
        return rate, (used - rate) / root * sheath * to_pressure

    def combined(by_enzyme: Array, by_light: Array, at_rest: Array) -> Array:
        return np.minimum(by_enzyme, by_light)

    return {"enzyme": enzyme, "light": light, "combined": combined, "respiration": respiration}


class _Block:
    """Leaves with what does not change while they are solved."""

    def __init__(self, leaf: Leaf, lanes: Array, oxygenation: float) -> None:
        self.leaf, self.lanes, self.oxygenation = leaf, lanes, oxygenation
        size = np.sqrt(np.maximum(lanes[solve.WIND], 0.5) / (0.72 * leaf["leaf_width"]))
        kelvin = lanes[solve.AIR_TEMPERATURE] + 273.15
        self.sensible = 2.8 * 0.135 * size + 8.0 * 0.97 * 5.67e-8 * kelvin**3 / _HEAT
        self.vapour = 2.8 * 0.147 * size
        self.resistance = 1.37 / self.vapour
        driest = lanes[solve.AIR_TEMPERATURE] + lanes[solve.NET_RADIATION] / (_HEAT * self.sensible)
        self.coolest = np.minimum(driest, lanes[solve.DEW_POINT])
        self.warmest = np.maximum(driest, lanes[solve.DEW_POINT])
        self.demands: Callable[..., dict[str, Any]] = _c3_demands if "compensation_point" in leaf else _c4_demands

    def evaluate(self, temperature: Array, enzyme: Array | None, light: Array | None) -> tuple[Array, ...]:
        """Return both limiting rates, the net rate, the surplus and an expected slope at leaf temperatures."""
        lanes, intercept = self.lanes, self.leaf["stomatal_intercept"]
        co2 = lanes[solve.CO2]
        demands = self.demands(self.leaf, lanes, temperature, self.oxygenation)
        saturation = 0.6108 * np.exp(17.27 * temperature / (temperature + 237.3))
        deficit = saturation - lanes[solve.VAPOUR_PRESSURE]
        factor = 1.6 * (1.0 + self.leaf["stomatal_slope"] / np.sqrt(np.maximum(deficit, 0.05)))
        rates = []
        for demand, rate in ((demands["enzyme"], enzyme), (demands["light"], light)):
            if rate is None:
                rate = demand(0.7 * co2)[0]
            for _ in range(2):
                surface = co2 - self.resistance * rate
                opened = intercept * surface + factor * np.maximum(rate, 0.0)
                opening = np.where(rate > 0.0, factor, 0.0) - intercept * self.resistance
                inside = surface - 1.6 * rate * surface / opened
                slope = -self.resistance - 1.6 / opened * (
                    surface - rate * self.resistance - rate * surface * opening / opened
                )
                wanted, wanted_slope = demand(np.maximum(inside, 1.0))
                rate = rate - (wanted - rate) / (wanted_slope * slope - 1.0)
            rates.append(rate)
        at_rest = co2 + (self.resistance + 1.6 / intercept) * demands["respiration"]
        net = demands["combined"](rates[0], rates[1], at_rest)
        conductance = intercept + factor * np.maximum(net, 0.0) / (co2 - self.resistance * net)
        passed = conductance * self.vapour / (conductance + self.vapour)
        pressure = lanes[solve.PRESSURE]
        surplus = lanes[solve.NET_RADIATION] - _HEAT * self.sensible * (temperature - lanes[solve.AIR_TEMPERATURE])
        surplus = surplus - _EVAPORATION * passed * deficit / pressure
        steepness = 4098.0 * saturation / (temperature + 237.3) ** 2
        expected = -_HEAT * self.sensible - 0.5 * _EVAPORATION * passed * steepness / pressure
        return rates[0], rates[1], net, surplus, expected


def solve_with_numpy(leaves: Array, lanes: Array, oxygenation: float = 1.0) -> tuple[Array, Array]:
    """Return net rate [umol m-2 s-1] and leaf temperature [degC] of leaves given as the rows of `solve`."""
    leaf = {name: float(leaves[name][0]) for name in leaves.dtype.names or ()}
    block = _Block(leaf, lanes, oxygenation)
    here = block.coolest + 0.35 * (block.warmest - block.coolest)
    enzyme, light, net, surplus, slope = block.evaluate(here, None, None)
    for _ in range(_SECANT_STEPS):
        before, surplus_before = here, surplus
        here = np.clip(here - surplus / slope, block.coolest, block.warmest)
        enzyme, light, net, surplus, _expected = block.evaluate(here, enzyme, light)
        moved = here - before
        small = np.abs(moved) < 1e-9
        secant = (surplus - surplus_before) / np.where(small, 1.0, moved)
        slope = np.where(small | (secant > -0.05 * _HEAT * block.sensible), slope, secant)
    left = np.nonzero(~(np.abs(surplus) < 3e-5 * np.minimum(_HEAT * block.sensible, -slope)))[0]
    if left.size:
        net[left], here[left] = _scan_upwards(_Block(leaf, lanes[:, left], oxygenation))
    return net, here


def _scan_upwards(block: _Block) -> tuple[Array, Array]:
    """Return net rate and leaf temperature of the coolest solution, by a scan and bisection."""
    coolest, warmest = block.coolest.copy(), block.warmest.copy()
    stride = (warmest - coolest) / 40
    here, crossed = coolest.copy(), np.zeros(coolest.shape, dtype=bool)
    enzyme: Array | None = None
    light: Array | None = None
    net = np.empty_like(here)
    for _ in range(64):
        enzyme, light, net, surplus, _ = block.evaluate(here, enzyme, light)
        crossed |= surplus <= 0.0
        coolest = np.where(surplus > 0.0, here, coolest)
        warmest = np.where(surplus > 0.0, warmest, here)
        here = np.where(crossed, 0.5 * (coolest + warmest), here + stride)
    return net, here
