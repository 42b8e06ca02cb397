"""The two kinetics sets against the tables they come from."""

import math

import pytest

from cropstress.crops import load_crop

GAS_CONSTANT = 8.314462618  # J mol-1 K-1, CODATA; published

# Bernacchi et al. 2001, Plant Cell Environ 24:253, Table 1, at 25 degC and activation energy; from memory.
BERNACCHI = {
    "michaelis_co2": 404.9,
    "michaelis_o2": 278.4,
    "compensation_point": 42.75,
    "michaelis_co2_activation": 79.43,
    "michaelis_o2_activation": 36.38,
    "compensation_point_activation": 37.83,
}
# Kattge & Knorr 2007, Plant Cell Environ 30:1176, Table 3; from memory.
KATTGE_KNORR = {
    "carboxylation_activation": 71.513,
    "carboxylation_entropy_intercept": 668.39,
    "carboxylation_entropy_slope": -1.07,
    "electron_transport_activation": 49.884,
    "electron_transport_entropy_intercept": 659.70,
    "electron_transport_entropy_slope": -0.75,
    "carboxylation_deactivation": 200.0,
    "acclimation_lowest": 11.0,
    "acclimation_highest": 35.0,
}
# von Caemmerer 2000, Biochemical Models of Leaf Photosynthesis, Table 4.1; from memory.
VON_CAEMMERER = {
    "michaelis_co2": 650.0,
    "michaelis_o2": 450000.0,
    "pep_michaelis": 80.0,
    "electron_partition": 0.4,
    "mesophyll_respiration_share": 0.5,
    "oxygen_leak_ratio": 0.047,
    "half_inverse_specificity": 0.5 / 2590.0,
}


@pytest.mark.parametrize(("name", "expected"), (BERNACCHI | KATTGE_KNORR).items())
def test_c3_set(name, expected):
    assert load_crop("wheat").kinetics[name].value == expected


@pytest.mark.parametrize(("name", "expected"), VON_CAEMMERER.items())
def test_c4_set(name, expected):
    assert load_crop("maize").kinetics[name].value == pytest.approx(expected, rel=1e-3)


def test_effective_michaelis_constant_in_air():
    wheat = load_crop("wheat")
    effective = wheat.number("michaelis_co2") * (1.0 + wheat.number("oxygen") / wheat.number("michaelis_o2"))
    assert effective == pytest.approx(710.32, abs=0.01)  # derived here from Bernacchi et al. 2001


def optimum(activation, deactivation, entropy):
    """Optimum of a peaked Arrhenius response [degC]; Medlyn et al. 2002."""
    ratio = activation / (deactivation - activation)
    return 1000.0 * deactivation / (entropy - GAS_CONSTANT * math.log(ratio)) - 273.15


@pytest.mark.parametrize(
    ("process", "expected"),  # derived here from Massad, Tuzet & Bethenod 2007
    [("carboxylation", 32.4), ("pep_carboxylation", 43.2), ("electron_transport", 31.4)],
)
def test_optima_of_the_c4_capacities(process, expected):
    kinetics = load_crop("maize").kinetics
    activation, deactivation = (
        kinetics[f"{process}_{part}"].value for part in ("activation", "deactivation")
    )
    entropy = kinetics[f"{process}_entropy"]
    assert optimum(activation, deactivation, entropy.value) == pytest.approx(expected, abs=0.1)
    # The range of the entropy moves the optimum by 3 K; chosen here.
    assert optimum(activation, deactivation, entropy.low) == pytest.approx(expected + 3.0, abs=0.3)
    assert optimum(activation, deactivation, entropy.high) == pytest.approx(expected - 3.0, abs=0.3)


@pytest.mark.parametrize(("growth", "vcmax", "jmax"), [(15, 31.2, 31.0), (25, 36.2, 34.5), (35, 41.4, 38.1)])
def test_optima_of_the_c3_capacities_follow_growth_temperature(growth, vcmax, jmax):
    kinetics = load_crop("wheat").kinetics
    for process, expected in (("carboxylation", vcmax), ("electron_transport", jmax)):
        parts = ("activation", "deactivation", "entropy_intercept", "entropy_slope")
        activation, deactivation, intercept, slope = (kinetics[f"{process}_{part}"].value for part in parts)
        # Derived here from Kattge & Knorr 2007.
        assert optimum(activation, deactivation, intercept + slope * growth) == pytest.approx(
            expected, abs=0.1
        )


def test_respiration_doubles_by_35_degrees():
    linear, quadratic = (load_crop("rice").number(f"respiration_{term}") for term in ("linear", "quadratic"))
    # Heskel et al. 2016, PNAS 113:3832: R(35)/R(25) = 2.038; derived here.
    assert math.exp(linear * 10.0 + quadratic * (35.0**2 - 25.0**2)) == pytest.approx(2.038, abs=1e-3)


def test_c3_crops_share_one_set_and_c4_crops_the_other():
    assert load_crop("wheat").kinetics == load_crop("rice").kinetics
    assert load_crop("maize").kinetics == load_crop("sugarcane").kinetics
