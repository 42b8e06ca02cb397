"""What one oxygenation costs: facts of biochemistry that the program's own outputs must show."""

from __future__ import annotations

import numpy as np
import pytest

from cropstress import gas_exchange
from cropstress.crops import available_crops, load_crop

C3 = [name for name in available_crops() if load_crop(name).pathway == "C3"]
AIR = np.array([5.0, 12.0, 20.0, 28.0, 34.0, 40.0])


def saturation(temperature: np.ndarray | float) -> np.ndarray:
    """FAO-56 Eq. 11 [kPa]."""
    return np.asarray(0.6108 * np.exp(17.27 * temperature / (temperature + 237.3)))


@pytest.mark.parametrize("crop", available_crops())
def test_half_a_co2_is_released_per_oxygenation(crop: str) -> None:
    """2 glycine -> 1 serine + 1 CO2, so 0.5 CO2 per oxygenation (textbook chemistry, common practice)."""
    leaf = gas_exchange(crop, AIR[:, None], 0.5 * saturation(AIR)[:, None], np.array([0.0, 80.0, 600.0, 1800.0]))
    released = leaf["carboxylation"] - leaf["assimilation"] - leaf["respiration"]
    np.testing.assert_allclose(released, 0.5 * leaf["oxygenation"], atol=1e-9)
    assert float(leaf["oxygenation"].max()) > 0.0


@pytest.mark.parametrize("crop", C3)
def test_electrons_of_a_dim_leaf(crop: str) -> None:
    """2 NADPH, that is 4 electrons, per carboxylation and per oxygenation (from memory, common practice).

    So a leaf that light limits takes 4 (Vc + Vo) electrons, which is J. In dim light J is the useful light, 0.5
    (1 - f) of what is absorbed, less some per cent for the curve towards Jmax; the oracle of the leaf holds it
    exactly.
    """
    light = np.array([30.0, 60.0, 90.0])
    leaf = gas_exchange(crop, 22.0, 0.6 * float(saturation(22.0)), light)
    used = 4.0 * (leaf["carboxylation"] + leaf["oxygenation"]).values
    useful = 0.5 * (1.0 - 0.15) * 0.85 * light
    assert (used < useful).all()
    np.testing.assert_allclose(used, useful, rtol=0.12)


@pytest.mark.parametrize("crop", C3)
def test_oxygenation_grows_with_temperature_and_gives_way_to_co2(crop: str) -> None:
    """Photorespiration is over 25 % of photosynthesis above 30-35 degC at today's CO2, minor above 1000 ppm.

    Sage, Sage & Kocacinar 2012, Annu Rev Plant Biol 63:19-47 (read in a secondary source). "Minor" is taken as
    less than half of today's, chosen here.
    """

    def share(air: float, co2: float) -> float:
        leaf = gas_exchange(crop, air, 0.6 * float(saturation(air)), 1200.0, co2)
        return float(0.5 * leaf["oxygenation"] / (leaf["carboxylation"] - 0.5 * leaf["oxygenation"]))

    assert share(20.0, 400.0) < 0.25 < share(35.0, 400.0)
    assert share(35.0, 1200.0) < 0.5 * share(35.0, 400.0)


@pytest.mark.parametrize("crop", available_crops())
def test_no_oxygenation_is_never_worse(crop: str) -> None:
    """A leaf that gives nothing back fixes at least as much in light (common practice)."""
    leaf = gas_exchange(crop, AIR[:, None], 0.5 * saturation(AIR)[:, None], np.array([80.0, 600.0, 1800.0]))
    assert (leaf["assimilation_without_oxygenation"] >= leaf["assimilation"]).all()
