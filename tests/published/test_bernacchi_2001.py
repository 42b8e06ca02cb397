"""C3 leaves against Bernacchi et al. 2001, Plant Cell Environ 24:253-259, Table 1 (from memory)."""

from __future__ import annotations

from math import exp

import numpy as np
import pytest

from cropstress.crops import CropProfile
from cropstress.leaf import solve

from published_leaf import changed, held

SOURCE = "Bernacchi et al. 2001, Table 1"
R = 0.008314  # kJ mol-1 K-1, as there
TEMPERATURES = np.array([15.0, 20.0, 25.0, 30.0, 35.0, 40.0])
# Name: c, activation energy [kJ mol-1], value at 25 degC; Bernacchi et al. 2001, Table 1, from memory.
TABLE = {
    "Kc": (38.05, 79.43, 404.9),  # umol mol-1
    "Ko": (20.30, 36.38, 278.4),  # mmol mol-1
    "star": (19.02, 37.83, 42.75),  # umol mol-1
    "Vcmax": (26.35, 65.33, 1.0),
    "Rd": (18.72, 46.39, 1.0),
}
SATURATING = 1e5  # umol m-2 s-1 absorbed, so that only Rubisco limits


def printed(name: str, temperature: float) -> float:
    """exp(c - Ea / (R TK)), the form of the table, with c of two decimals."""
    c, activation, _ = TABLE[name]
    return exp(c - activation / (R * (temperature + 273.15)))


def normalised(name: str, temperature: float) -> float:
    """The same response through the value at 25 degC."""
    _, activation, at_25 = TABLE[name]
    return at_25 * exp(activation * (temperature - 25.0) / (298.15 * R * (temperature + 273.15)))


@pytest.fixture
def leaf() -> CropProfile:
    """Return a C3 leaf with Vcmax25 100, without deactivation, that neither light nor phosphate limits."""
    return changed(
        "wheat",
        SOURCE,
        {
            "carboxylation_capacity": 100.0,
            "respiration_ratio": 0.01,
            "carboxylation_activation": 65.33,
            "carboxylation_deactivation": 400.0,
            "carboxylation_entropy_intercept": 300.0,  # deactivation far above every temperature
            "carboxylation_entropy_slope": 0.0,
            "electron_transport_ratio": 12.0,
            "triose_phosphate_ratio": 0.5,
        },
    )


def test_rubisco_at_25_degrees(leaf: CropProfile) -> None:
    """Constants as the whole leaf shows them: from Vo/Vc the compensation point, from Vc Kc (1 + O/Ko)."""
    answers = held(leaf, np.array([100.0, 280.0, 500.0]), 25.0, SATURATING)
    co2, fixed = answers[solve.INTERCELLULAR_CO2], answers[solve.CARBOXYLATION]
    star = 0.5 * co2 * answers[solve.OXYGENATION] / fixed
    np.testing.assert_allclose(star, 42.75, atol=1e-3)
    # 404.9 (1 + 210 / 278.4) = 710.32; derived here
    np.testing.assert_allclose(co2 * (100.0 / fixed - 1.0), 710.32, atol=0.02)


@pytest.mark.parametrize("form", [normalised, printed])
def test_rubisco_with_temperature(leaf: CropProfile, form) -> None:
    """Both forms of the table, derived here; half a unit of the last digit of each c is 0.5 %, of three 1.5 %."""
    answers = held(leaf, np.full(6, 280.0), TEMPERATURES, SATURATING)
    tolerance = 1e-5 if form is normalised else 0.015
    for temperature, fixed, oxygenated in zip(
        TEMPERATURES, answers[solve.CARBOXYLATION], answers[solve.OXYGENATION], strict=True
    ):
        assert 0.5 * 280.0 * oxygenated / fixed == pytest.approx(form("star", temperature), rel=tolerance)
        constant = form("Kc", temperature) * (1.0 + 210.0 / form("Ko", temperature))
        capacity = 100.0 * form("Vcmax", temperature)
        assert fixed == pytest.approx(capacity * 280.0 / (280.0 + constant), rel=tolerance)


def test_net_rate_of_the_set_as_a_leaf(leaf: CropProfile) -> None:
    """Ci 280, Vcmax25 100, Rd25 1 with Ea 46.39: derived here, from the table's 25 degC values.

    Our own respiration has another shape (Heskel et al. 2016), so the gross rate is taken from the leaf.
    """
    expected = [17.07, 20.53, 22.96, 23.94, 23.32, 21.17]  # derived here, once by hand
    answers = held(leaf, np.full(6, 280.0), TEMPERATURES, SATURATING)
    gross = answers[solve.ASSIMILATION] + answers[solve.RESPIRATION]
    for temperature, rate, by_hand in zip(TEMPERATURES, gross, expected, strict=True):
        star = normalised("star", temperature)
        constant = normalised("Kc", temperature) * (1.0 + 210.0 / normalised("Ko", temperature))
        rubisco = 100.0 * normalised("Vcmax", temperature) * (280.0 - star) / (280.0 + constant)
        respired = normalised("Rd", temperature)
        assert rubisco - respired == pytest.approx(by_hand, abs=0.006)
        assert rate - respired == pytest.approx(by_hand, abs=0.006)


@pytest.mark.parametrize(
    ("temperature", "star", "oxygenated", "released", "of_gross"),
    [  # regression only: what the table implies at Ci 280, derived here
        (15, 25.17, 0.180, 0.090, 0.099),
        (20, 32.95, 0.235, 0.118, 0.133),
        (25, 42.75, 0.305, 0.153, 0.180),
        (30, 54.99, 0.393, 0.196, 0.244),
        (35, 70.15, 0.501, 0.251, 0.334),
        (40, 88.80, 0.634, 0.317, 0.464),
    ],
)
def test_photorespiration_of_the_set(
    leaf: CropProfile, temperature: float, star: float, oxygenated: float, released: float, of_gross: float
) -> None:
    answers = held(leaf, np.array([280.0]), temperature, SATURATING)[:, 0]
    ratio = answers[solve.OXYGENATION] / answers[solve.CARBOXYLATION]
    assert 0.5 * 280.0 * ratio == pytest.approx(star, abs=0.01)
    assert ratio == pytest.approx(oxygenated, abs=6e-4)
    assert 0.5 * ratio == pytest.approx(released, abs=6e-4)
    assert 0.5 * ratio / (1.0 - 0.5 * ratio) == pytest.approx(of_gross, abs=6e-4)


def test_constants_are_partial_pressures(leaf: CropProfile) -> None:
    """Rubisco sees partial pressures: as mole fractions Kc (1 + O/Ko) has Kc and Ko at 101.3 kPa; derived here."""
    high_up = held(leaf, np.array([280.0]), 25.0, SATURATING, pressure=55.0)[:, 0]
    thinner = 101.3 / 55.0
    constant = 404.9 * thinner * (1.0 + 210.0 / (278.4 * thinner))
    assert high_up[solve.CARBOXYLATION] == pytest.approx(100.0 * 280.0 / (280.0 + constant), rel=1e-6)
    assert 0.5 * 280.0 * high_up[solve.OXYGENATION] / high_up[solve.CARBOXYLATION] == pytest.approx(42.75, abs=1e-3)
