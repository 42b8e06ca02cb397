"""Rates of a leaf without oxygenation over again in plain NumPy, at a held temperature and deficit."""

from __future__ import annotations

import numpy as np

from cropstress.crops import CropProfile
from cropstress.leaf import solve


def peaked(activation: float, deactivation: float, entropy: np.ndarray | float, temperature: np.ndarray) -> np.ndarray:
    """Peaked Arrhenius response, 1 at 25 degC; Medlyn et al. 2002, Eq. 17; energies in kJ mol-1."""
    kelvin, reference, gas = temperature + 273.15, 298.15, 8.314

    def falling(at: np.ndarray | float) -> np.ndarray:
        return 1.0 + np.exp((at * entropy - 1000.0 * deactivation) / (gas * at))

    return rising(activation, temperature) * falling(reference) / falling(kelvin)


def rising(activation: float, temperature: np.ndarray) -> np.ndarray:
    """Arrhenius response, 1 at 25 degC; energy in kJ mol-1."""
    return np.exp(1000.0 * activation * (temperature - 25.0) / (298.15 * 8.314 * (temperature + 273.15)))


def respiration_response(profile: CropProfile, temperature: np.ndarray) -> np.ndarray:
    """Respiration, 1 at 25 degC; Heskel et al. 2016."""
    linear, quadratic = profile.number("respiration_linear"), profile.number("respiration_quadratic")
    return np.exp(linear * (temperature - 25.0) + quadratic * (temperature**2 - 25.0**2))


def gross_without_oxygenation(
    profile: CropProfile, temperature: np.ndarray, deficit: np.ndarray, lanes: np.ndarray
) -> np.ndarray:
    """Gross rate of a leaf without oxygenation at a held temperature and deficit [umol m-2 s-1].

    Farquhar et al. 1980 without oxygen, von Caemmerer 2000 without oxygen, with the stomata of Medlyn et al. 2011.
    """
    number = profile.number
    photons, capacity, wind = lanes[solve.PHOTONS], lanes[solve.CAPACITY], lanes[solve.WIND]
    pressure, growth = lanes[solve.PRESSURE], lanes[solve.GROWTH_TEMPERATURE]
    vcmax25 = capacity * number("carboxylation_capacity")
    c3 = profile.pathway == "C3"

    def capacity_at(process: str, at_25: np.ndarray) -> np.ndarray:
        if c3 and process != "triose_phosphate":
            entropy = number(f"{process}_entropy_intercept") + number(f"{process}_entropy_slope") * growth
        else:
            entropy = number(f"{process}_entropy")
        response = peaked(number(f"{process}_activation"), number(f"{process}_deactivation"), entropy, temperature)
        return at_25 * response

    vcmax = capacity_at("carboxylation", vcmax25)
    jmax = capacity_at("electron_transport", number("electron_transport_ratio") * vcmax25)
    useful = 0.5 * (1.0 - number("electron_loss_fraction")) * photons
    theta = number("light_curvature")
    j = (useful + jmax - np.sqrt((useful + jmax) ** 2 - 4.0 * theta * useful * jmax)) / (2.0 * theta)
    rd = vcmax25 * number("respiration_ratio") * respiration_response(profile, temperature)
    kc = number("michaelis_co2") * rising(number("michaelis_co2_activation"), temperature)
    if c3:
        kc = kc * 101.3 / pressure
        tpu = capacity_at("triose_phosphate", number("triose_phosphate_ratio") * vcmax25)
    else:
        vpmax = capacity_at("pep_carboxylation", number("pep_carboxylation_ratio") * vcmax25)
        vpr = vpmax / number("pep_carboxylation_ratio") * number("pep_regeneration_ratio")
        kp = number("pep_michaelis") * rising(number("pep_michaelis_activation"), temperature)
        gbs, x, rm = number("bundle_sheath_conductance"), number("electron_partition"), 0.5 * rd

    def demand(inside: np.ndarray) -> np.ndarray:
        if c3:
            return np.minimum(np.minimum(vcmax * inside / (inside + kc), j / 4.0), 3.0 * tpu) - rd
        mesophyll = inside * pressure / 100.0
        pumped = np.minimum(vpmax * mesophyll / (mesophyll + kp), vpr) - rm + gbs * mesophyll
        used = vcmax - rd
        total = pumped + used + gbs * kc
        enzymes = (total - np.sqrt(total**2 - 4.0 * (used * pumped - rd * gbs * kc))) / 2.0
        light = np.minimum(x * j / 2.0 - rm + gbs * mesophyll, (1.0 - x) * j / 3.0 - rd)
        return np.minimum(enzymes, light)

    boundary = 2.0 * 1.4 * 0.147 * np.sqrt(np.maximum(wind, 0.5) / (0.72 * number("leaf_width")))
    factor = 1.6 * (1.0 + number("stomatal_slope") / np.sqrt(np.maximum(deficit, 0.05)))
    co2 = lanes[solve.CO2]
    low, high = -2.0 * rd, co2 * boundary / 1.37
    for _ in range(70):
        rate = 0.5 * (low + high)
        surface = co2 - 1.37 * rate / boundary
        opened = number("stomatal_intercept") * surface + factor * np.maximum(rate, 0.0)  # gs times surface CO2
        inside = surface - 1.6 * rate * surface / opened
        too_low = (inside > 0.0) & (demand(np.maximum(inside, 0.0)) > rate)
        low, high = np.where(too_low, rate, low), np.where(too_low, high, rate)
    return 0.5 * (low + high) + rd
