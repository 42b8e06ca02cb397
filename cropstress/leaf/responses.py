"""How rates and constants follow leaf temperature."""

from __future__ import annotations

from typing import Any

from cropstress.compiled import exponential, inlined

GAS_CONSTANT = 8.314  # J mol-1 K-1
ZERO_CELSIUS = 273.15  # K
REFERENCE_TEMPERATURE = 298.15  # K, 25 degC
LOWEST_RESPONSE_TEMPERATURE = -40.0  # degC, chosen here: responses are held constant beyond
HIGHEST_RESPONSE_TEMPERATURE = 75.0  # degC, chosen here


@inlined
def temperature_terms(leaf_temperature: float) -> tuple[float, float]:
    """Return what all responses of a leaf temperature share, with one division.

    Returns
    -------
    tuple
        1/298.15 K - 1/T [K-1], the argument of every Arrhenius term, and 1 / (T + 237.3) of FAO-56 Eq. 11.
    """
    limited = min(max(leaf_temperature, LOWEST_RESPONSE_TEMPERATURE), HIGHEST_RESPONSE_TEMPERATURE)
    kelvin = limited + ZERO_CELSIUS
    shifted = leaf_temperature + 237.3
    inverse = 1.0 / (kelvin * shifted)
    return 1.0 / REFERENCE_TEMPERATURE - inverse * shifted, inverse * kelvin


@inlined
def arrhenius(activation: float, step: float) -> float:
    """Return a rate relative to 25 degC: exp[Ea (T - 25) / (298.15 R T)]; Bernacchi et al. 2001."""
    return exponential(activation / GAS_CONSTANT * step)


@inlined
def deactivation_exponent(deactivation: float, entropy: float) -> float:
    """Return (298.15 dS - Hd) / (298.15 R), the exponent of the high-temperature term at 25 degC."""
    return entropy / GAS_CONSTANT - deactivation / (REFERENCE_TEMPERATURE * GAS_CONSTANT)


@inlined
def deactivated(deactivation: float, exponent_at_25: float, step: float) -> float:
    """Return the denominator of the peaked response; Medlyn et al. 2002, Eq. 17.

    The response is Arrhenius / denominator, without its normalisation at 25 degC.
    """
    return 1.0 + exponential(exponent_at_25 + deactivation / GAS_CONSTANT * step)


@inlined
def three_inverses(first: float, second: float, third: float) -> tuple[float, float, float]:
    """Return the inverses of three numbers with one division, which costs as much as ten products."""
    both = first * second
    inverse = 1.0 / (both * third)
    return inverse * second * third, inverse * first * third, inverse * both


@inlined
def peak_normalisation(deactivation: float, entropy: float) -> float:
    """Return what makes a peaked response 1 at 25 degC; Medlyn et al. 2002, Eq. 17."""
    return 1.0 + exponential(deactivation_exponent(deactivation, entropy))


@inlined
def leaf_respiration(linear: float, quadratic: float, leaf_temperature: float) -> float:
    """Return respiration relative to 25 degC; Heskel et al. 2016: ln R = a + 0.1012 T - 0.0005 T2."""
    t = min(max(leaf_temperature, LOWEST_RESPONSE_TEMPERATURE), HIGHEST_RESPONSE_TEMPERATURE)
    return exponential(linear * (t - 25.0) + quadratic * (t * t - 625.0))


@inlined
def saturation_pressure(temperature: float) -> float:
    """Return the saturation vapour pressure [kPa] at a temperature [degC]; FAO-56 Eq. 11."""
    return 0.6108 * exponential(17.27 * temperature / (temperature + 237.3))


@inlined
def useful_light(leaf: Any, around: Any) -> float:
    """Return the light that drives photosystem II, I2 [umol m-2 s-1]; von Caemmerer 2000."""
    return 0.5 * (1.0 - leaf.electron_loss_fraction) * around.photons


@inlined
def smaller_root(curvature: float, first: float, second: float) -> float:
    """Return the smaller root x of curvature x2 - (first + second) x + first second = 0."""
    total = first + second
    return 2.0 * first * second / (total + (total * total - 4.0 * curvature * first * second) ** 0.5)
