"""A second, independent solution of one leaf, slow and sure.

Nothing here steps towards an answer. At a held leaf temperature the net rate is the one root of demand minus
supply, which falls all the way, so it is bracketed. The energy left over is then looked at on a fine ladder of
leaf temperatures from the coolest to the warmest a leaf can have; every change of sign is a solution, and a
dip or a hump between rungs is searched for a pair of solutions that the ladder stepped over.

Only the values of a crop profile are taken from the package: no equation, no constant of an equation.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import NamedTuple

import numpy as np
from scipy.optimize import elementwise

from cropstress.crops import CropProfile

GAS_CONSTANT = 8.314e-3  # kJ mol-1 K-1; as Bernacchi et al. 2001 use it
RUNGS = 128
_BEYOND = 1e-3  # K: the ends of the ladder lie beyond every solution
_LARGEST_CO2 = 1e6  # umol mol-1
_SMALLEST_CO2 = 1e-6


class Conditions(NamedTuple):
    """What surrounds a leaf; arrays of one shape."""

    air_temperature: np.ndarray  # [degC]
    vapour_pressure: np.ndarray  # [kPa]
    absorbed_photons: np.ndarray  # [umol m-2 s-1]
    net_radiation: np.ndarray  # isothermal [W m-2]
    capacity: np.ndarray  # of the top leaf's [1]
    wind: np.ndarray  # [m s-1]
    pressure: np.ndarray  # [kPa]
    co2: np.ndarray  # of the air [umol mol-1]
    growth_temperature: np.ndarray  # [degC]

    def part(self, which: np.ndarray | slice) -> Conditions:
        """Return some of the leaves."""
        return Conditions(*(values[which] for values in self))


@dataclass
class Solutions:
    """Every temperature at which a leaf's energy balances, from the coolest up within each leaf."""

    leaf: np.ndarray  # number of the leaf
    temperature: np.ndarray  # [degC]
    stable: np.ndarray  # a leaf a little warmer loses more than it takes up

    def count(self, leaves: int) -> np.ndarray:
        """Return the number of solutions of each leaf."""
        return np.bincount(self.leaf, minlength=leaves)


def saturation(temperature: np.ndarray) -> np.ndarray:
    """Saturation vapour pressure [kPa]; FAO-56 Eq. 11."""
    return 0.6108 * np.exp(17.27 * temperature / (temperature + 237.3))


def dew_point(vapour_pressure: np.ndarray) -> np.ndarray:
    """Temperature [degC] at which a vapour pressure saturates: Eq. 11 of FAO-56 turned round."""
    logarithm = np.log(vapour_pressure / 0.6108)
    return 237.3 * logarithm / (17.27 - logarithm)


def exponential_response(activation: float, temperature: np.ndarray) -> np.ndarray:
    """exp[Ea (T - 25) / (298.15 R TK)], Ea in kJ mol-1; Bernacchi et al. 2001."""
    limited = np.clip(temperature, -40.0, 75.0)
    return np.exp(activation * (limited - 25.0) / (298.15 * GAS_CONSTANT * (limited + 273.15)))


def peaked_response(
    activation: float, deactivation: float, entropy: np.ndarray | float, temperature: np.ndarray
) -> np.ndarray:
    """Medlyn et al. 2002, Eq. 17, 1 at 25 degC; energies in kJ mol-1, entropy in J mol-1 K-1."""
    kelvin = np.clip(temperature, -40.0, 75.0) + 273.15
    entropy = np.asarray(entropy) / 1000.0
    at_25 = 1.0 + np.exp((298.15 * entropy - deactivation) / (298.15 * GAS_CONSTANT))
    here = 1.0 + np.exp((kelvin * entropy - deactivation) / (kelvin * GAS_CONSTANT))
    return exponential_response(activation, temperature) * at_25 / here


def electron_transport(curvature: float, useful: np.ndarray, largest: np.ndarray) -> np.ndarray:
    """Smaller root J of theta J2 - (I2 + Jmax) J + I2 Jmax = 0."""
    total = useful + largest
    return (total - np.sqrt(total**2 - 4.0 * curvature * useful * largest)) / (2.0 * curvature)


def respiration_response(numbers: dict[str, float], temperature: np.ndarray) -> np.ndarray:
    """Heskel et al. 2016: ln R = a + 0.1012 T - 0.0005 T2, 1 at 25 degC."""
    t = np.clip(temperature, -40.0, 75.0)
    return np.exp(numbers["respiration_linear"] * (t - 25.0) + numbers["respiration_quadratic"] * (t**2 - 25.0**2))


class C3:
    """Farquhar, von Caemmerer & Berry 1980 with intercellular CO2."""

    def __init__(self, numbers: dict[str, float], acclimation: bool, oxygenation: bool) -> None:
        self.numbers, self.acclimation, self.oxygenation = numbers, acclimation, oxygenation

    def rates(self, temperature, photons, capacity, growth_temperature, pressure):
        """Vcmax, Kc (1 + O/Ko), J, gamma star, TPU, Rd at a leaf temperature."""
        n = self.numbers
        ratio = n["electron_transport_ratio"]
        if self.acclimation:
            ratio = n["acclimated_ratio_intercept"] + n["acclimated_ratio_slope"] * growth_temperature
        top = n["carboxylation_capacity"] * capacity
        peaks = {}
        for process in ("carboxylation", "electron_transport"):
            entropy = n[f"{process}_entropy_intercept"] + n[f"{process}_entropy_slope"] * growth_temperature
            peaks[process] = peaked_response(
                n[f"{process}_activation"], n[f"{process}_deactivation"], entropy, temperature
            )
        triose = peaked_response(
            n["triose_phosphate_activation"],
            n["triose_phosphate_deactivation"],
            n["triose_phosphate_entropy"],
            temperature,
        )
        to_pressure = n["reference_pressure"] / pressure
        kc = n["michaelis_co2"] * to_pressure * exponential_response(n["michaelis_co2_activation"], temperature)
        ko = n["michaelis_o2"] * to_pressure * exponential_response(n["michaelis_o2_activation"], temperature)
        oxygen = n["oxygen"] if self.oxygenation else 0.0
        star = n["compensation_point"] if self.oxygenation else 0.0
        useful = 0.5 * (1.0 - n["electron_loss_fraction"]) * photons
        return (
            top * peaks["carboxylation"],
            kc * (1.0 + oxygen / ko),
            electron_transport(n["light_curvature"], useful, top * ratio * peaks["electron_transport"]),
            star * exponential_response(n["compensation_point_activation"], temperature),
            top * n["triose_phosphate_ratio"] * triose,
            top * n["respiration_ratio"] * respiration_response(n, temperature),
        )

    def fluxes(self, co2, vcmax, kinetics, j, star, tpu, respiration):
        """Carboxylation and oxygenation at an intercellular CO2."""
        with np.errstate(divide="ignore"):
            triose = np.where(co2 > star, 3.0 * tpu / np.maximum(1.0 - star / co2, 1e-300), np.inf)
        fixed = np.minimum(np.minimum(vcmax * co2 / (co2 + kinetics), j * co2 / (4.0 * co2 + 8.0 * star)), triose)
        return fixed, 2.0 * star / co2 * fixed

    def demand(self, co2, vcmax, kinetics, j, star, tpu, respiration):
        """Net rate at an intercellular CO2."""
        fixed, oxygenated = self.fluxes(co2, vcmax, kinetics, j, star, tpu, respiration)
        return fixed - 0.5 * oxygenated - respiration

    def respiration_of(self, rates):
        """Rd among the rates."""
        return rates[5]


class C4:
    """von Caemmerer 2000, chapter 4: both quadratics whole, mesophyll CO2 equal to intercellular CO2."""

    def __init__(self, numbers: dict[str, float], acclimation: bool, oxygenation: bool) -> None:
        self.numbers, self.oxygenation = numbers, oxygenation

    def rates(self, temperature, photons, capacity, growth_temperature, pressure):
        """Vcmax, Vpmax, Vpr, Kp, Kc, 1/Ko, gamma star, J, Rd, and what turns a mole fraction into ubar."""
        n = self.numbers
        top = n["carboxylation_capacity"] * capacity
        shape = {
            process: peaked_response(
                n[f"{process}_activation"], n[f"{process}_deactivation"], n[f"{process}_entropy"], temperature
            )
            for process in ("carboxylation", "electron_transport", "pep_carboxylation")
        }
        useful = 0.5 * (1.0 - n["electron_loss_fraction"]) * photons
        largest = top * n["electron_transport_ratio"] * shape["electron_transport"]
        one = 1.0 if self.oxygenation else 0.0
        ko = n["michaelis_o2"] * exponential_response(n["michaelis_o2_activation"], temperature)
        return (
            top * shape["carboxylation"],
            top * n["pep_carboxylation_ratio"] * shape["pep_carboxylation"],
            top * n["pep_regeneration_ratio"] * shape["pep_carboxylation"],
            n["pep_michaelis"] * exponential_response(n["pep_michaelis_activation"], temperature),
            n["michaelis_co2"] * exponential_response(n["michaelis_co2_activation"], temperature),
            one / ko,
            one
            * n["half_inverse_specificity"]
            * exponential_response(n["half_inverse_specificity_activation"], temperature),
            electron_transport(n["light_curvature"], useful, largest),
            top * n["respiration_ratio"] * respiration_response(n, temperature),
            pressure / 100.0,
        )

    def _limits(self, co2, vcmax, vpmax, vpr, kp, kc, inverse_ko, star, j, respiration, to_ubar):
        """Enzyme-limited and light-limited net rate, the pump of each, and what else the bundle sheath needs."""
        n = self.numbers
        gbs, x = n["bundle_sheath_conductance"], n["electron_partition"]
        leak = n["bundle_sheath_oxygen_share"] / n["oxygen_leak_ratio"]
        cm = co2 * to_ubar
        om = n["oxygen"] * 1000.0 * to_ubar
        rm = n["mesophyll_respiration_share"] * respiration
        pump = np.minimum(vpmax * cm / (cm + kp), vpr)
        supplied = pump - rm + gbs * cm
        a = 1.0 - leak * kc * inverse_ko
        b = -(
            supplied
            + (vcmax - respiration)
            + gbs * kc * (1.0 + om * inverse_ko)
            + leak * (star * vcmax + respiration * kc * inverse_ko)
        )
        c = (vcmax - respiration) * supplied - (
            vcmax * gbs * star * om + respiration * gbs * kc * (1.0 + om * inverse_ko)
        )
        enzyme = 2.0 * c / (-b + np.sqrt(b * b - 4.0 * a * c))
        light_pump = x * j / 2.0
        supplied = light_pump - rm + gbs * cm
        cycle = (1.0 - x) * j / 3.0
        a = 1.0 - 7.0 * star * leak / 3.0
        b = -(
            supplied
            + (cycle - respiration)
            + gbs * 7.0 * star * om / 3.0
            + leak * star * (cycle + 7.0 * respiration / 3.0)
        )
        c = supplied * (cycle - respiration) - gbs * star * om * (cycle + 7.0 * respiration / 3.0)
        light = 2.0 * c / (-b + np.sqrt(b * b - 4.0 * a * c))
        return enzyme, light, pump, light_pump, cycle, cm, om, rm

    def demand(self, co2, *rates):
        """Net rate at an intercellular CO2."""
        enzyme, light, *_ = self._limits(co2, *rates)
        return np.minimum(enzyme, light)

    def fluxes(self, co2, *rates):
        """Carboxylation and oxygenation in the bundle sheath, whose gases follow from the net rate."""
        vcmax, _, _, _, kc, inverse_ko, star, _, _, _ = rates
        n = self.numbers
        enzyme, light, pump, light_pump, cycle, cm, om, rm = self._limits(co2, *rates)
        rate = np.minimum(enzyme, light)
        gbs = n["bundle_sheath_conductance"]
        cs = cm + (np.where(light < enzyme, light_pump, pump) - rate - rm) / gbs
        os = n["bundle_sheath_oxygen_share"] * rate / (n["oxygen_leak_ratio"] * gbs) + om
        fixed = np.where(
            light < enzyme,
            cycle * cs / (cs + 7.0 * star * os / 3.0),
            vcmax * cs / (cs + kc * (1.0 + os * inverse_ko)),
        )
        return fixed, 2.0 * star * os / cs * fixed

    def respiration_of(self, rates):
        """Rd among the rates."""
        return rates[8]


class LeafOracle:
    """One crop's leaf, from the values of its profile."""

    def __init__(self, profile: CropProfile, acclimation: bool = False, oxygenation: bool = True) -> None:
        self.numbers = {name: value.value for name, value in (profile.kinetics | profile.values).items()}
        pathway: Callable[..., C3 | C4] = C3 if profile.pathway == "C3" else C4
        self.biochemistry = pathway(self.numbers, acclimation, oxygenation)

    def boundary(self, conditions: Conditions) -> tuple[np.ndarray, np.ndarray]:
        """Conductances to heat, with radiation, and to vapour, both sides; Campbell & Norman 1998, Table 7.6."""
        root = np.sqrt(np.maximum(conditions.wind, 0.5) / (0.72 * self.numbers["leaf_width"]))
        kelvin = conditions.air_temperature + 273.15
        radiative = 2.0 * 4.0 * 0.97 * 5.67e-8 * kelvin**3 / 29.3
        return 2.0 * 1.4 * 0.135 * root + radiative, 2.0 * 1.4 * 0.147 * root

    def gas_exchange(self, temperature: np.ndarray, conditions: Conditions) -> dict[str, np.ndarray]:
        """Solve stomata and net rate of leaves whose temperature is held."""
        shape = np.broadcast_shapes(np.shape(temperature), *(np.shape(values) for values in conditions))
        rates = self.biochemistry.rates(
            temperature,
            conditions.absorbed_photons,
            conditions.capacity,
            conditions.growth_temperature,
            conditions.pressure,
        )
        _, vapour = self.boundary(conditions)
        resistance = 1.37 / vapour
        deficit = saturation(temperature) - conditions.vapour_pressure
        factor = 1.6 * (1.0 + self.numbers["stomatal_slope"] / np.sqrt(np.maximum(deficit, 0.05)))
        given = [np.broadcast_to(each, shape) for each in (conditions.co2, resistance, factor, *rates)]
        lowest = self.biochemistry.demand(np.full(shape, _SMALLEST_CO2), *given[3:]) - 1e-3
        highest = self.biochemistry.demand(np.full(shape, _LARGEST_CO2), *given[3:]) + 1e-3
        highest = np.minimum(highest, 0.999 * given[0] / given[1])
        found = elementwise.find_root(
            self._shortage, (lowest, highest), args=tuple(given), tolerances={"xatol": 1e-10, "xrtol": 1e-13}
        )
        if not found.success.all():
            raise ArithmeticError("the net rate is not bracketed")
        rate = found.x
        inside, conductance = self._supply(rate, *given[:3])
        fixed, oxygenated = self.biochemistry.fluxes(inside, *given[3:])
        return {
            "assimilation": rate,
            "intercellular_co2": inside,
            "stomatal_conductance": conductance,
            "carboxylation": fixed,
            "oxygenation": oxygenated,
            "respiration": self.biochemistry.respiration_of(given[3:]),
            "deficit": np.broadcast_to(deficit, shape),
        }

    def _supply(self, rate, co2, resistance, factor):
        """Intercellular CO2 and conductance that the stomata allow at a net rate; Medlyn et al. 2011, 2012."""
        surface = co2 - resistance * rate
        conductance = self.numbers["stomatal_intercept"] + factor * np.maximum(rate, 0.0) / surface
        return surface - 1.6 * rate / conductance, conductance

    def _shortage(self, rate, co2, resistance, factor, *rates):
        inside, _ = self._supply(rate, co2, resistance, factor)
        return self.biochemistry.demand(np.maximum(inside, _SMALLEST_CO2), *rates) - rate

    def surplus(self, temperature: np.ndarray, *conditions: np.ndarray) -> np.ndarray:
        """Energy taken up less energy lost by leaves whose temperature is held [W m-2]."""
        c = Conditions(*conditions)
        answer = self.gas_exchange(temperature, c)
        heat, vapour = self.boundary(c)
        passed = answer["stomatal_conductance"] * vapour / (answer["stomatal_conductance"] + vapour)
        lost = 29.3 * heat * (temperature - c.air_temperature) + 44100.0 * passed * answer["deficit"] / c.pressure
        return c.net_radiation - lost

    def solutions(self, conditions: Conditions) -> Solutions:
        """Find every solution of leaves; arrays of one dimension."""
        heat, _ = self.boundary(conditions)
        dew = dew_point(conditions.vapour_pressure)
        driest = conditions.air_temperature + conditions.net_radiation / (29.3 * heat)
        lowest = np.minimum(dew, driest) - _BEYOND
        highest = np.maximum(dew, driest) + _BEYOND
        ladder = lowest[:, None] + (highest - lowest)[:, None] * np.linspace(0.0, 1.0, RUNGS + 1)
        surplus = self.surplus(ladder, *(values[:, None] for values in conditions))
        if not ((surplus[:, 0] > 0.0) & (surplus[:, -1] < 0.0)).all():
            raise ArithmeticError("a leaf's energy balance is not bracketed")
        leaf, rung = np.nonzero(np.sign(surplus[:, :-1]) * np.sign(surplus[:, 1:]) <= 0.0)
        below, above = ladder[leaf, rung], ladder[leaf, rung + 1]
        pair_leaf, pair_below, pair_middle, pair_above = self._pairs(ladder, surplus, conditions)
        leaf = np.concatenate([leaf, pair_leaf, pair_leaf])
        below = np.concatenate([below, pair_below, pair_middle])
        above = np.concatenate([above, pair_middle, pair_above])
        found = elementwise.find_root(
            self.surplus,
            (below, above),
            args=tuple(conditions.part(leaf)),
            tolerances={"xatol": 1e-9, "xrtol": 1e-13},
        )
        if not found.success.all():
            raise ArithmeticError("a leaf temperature is not bracketed")
        order = np.lexsort((found.x, leaf))
        leaf, temperature = leaf[order], found.x[order]
        first = np.concatenate([[True], leaf[1:] != leaf[:-1]])
        place = np.arange(leaf.size) - np.maximum.accumulate(np.where(first, np.arange(leaf.size), 0))
        # The surplus is positive at the bottom, so the first, third ... root is one where it falls.
        return Solutions(leaf, temperature, place % 2 == 0)

    def _pairs(self, ladder, surplus, conditions):
        """Find pairs of solutions between rungs: a dip below zero or a hump above it that the ladder missed."""
        found = []
        middle = surplus[:, 1:-1]
        for sign in (1.0, -1.0):
            here = sign * middle
            turning = (here > 0.0) & (here <= sign * surplus[:, :-2]) & (here <= sign * surplus[:, 2:])
            leaf, rung = np.nonzero(turning)
            if leaf.size == 0:
                continue
            low, mid, high = (ladder[leaf, rung + k] for k in range(3))

            def upright(temperature, *given, sign=sign):
                return sign * self.surplus(temperature, *given)

            lowest = elementwise.find_minimum(upright, (low, mid, high), args=tuple(conditions.part(leaf)))
            crossed = lowest.f_x < 0.0
            found.append((leaf[crossed], low[crossed], lowest.x[crossed], high[crossed]))
        if not found:
            empty = np.zeros(0)
            return empty.astype(int), empty, empty, empty
        return tuple(np.concatenate(each) for each in zip(*found, strict=True))
