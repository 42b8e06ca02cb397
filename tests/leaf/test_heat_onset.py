"""The heat onset of every shipped crop fits the physiology of its own profile.

The state is the usual one for such a curve (chosen here): top leaf, 1500 umol m-2 s-1, relative humidity 50 %,
2 m/s, 101.3 kPa, 421 umol/mol.
"""

from __future__ import annotations

import numpy as np
import pytest

from cropstress import gas_exchange
from cropstress.crops import available_crops, load_crop

AIR = np.arange(5.0, 50.001, 0.05)


def saturation(temperature: np.ndarray | float) -> np.ndarray:
    """FAO-56 Eq. 11 [kPa]."""
    return np.asarray(0.6108 * np.exp(17.27 * temperature / (temperature + 237.3)))


def net_rate(crop: str, air: np.ndarray, vapour_pressure: np.ndarray) -> np.ndarray:
    """Net rate in the usual state."""
    return np.asarray(gas_exchange(crop, air, vapour_pressure, 1500.0).assimilation.values)


@pytest.mark.parametrize("crop", available_crops())
def test_onset_lies_at_the_upper_end_of_the_optimum(crop: str) -> None:
    """Between the optimum less 1 K and the highest air temperature with 95 % of it."""
    rate = net_rate(crop, AIR, 0.5 * saturation(AIR))
    optimum = AIR[rate.argmax()]
    highest = AIR[rate >= 0.95 * rate.max()].max()
    onset = load_crop(crop).number("heat_onset")
    print(f"\n{crop}: optimum {optimum:.1f}, onset {onset:g}, 95 % up to {highest:.1f} degC")
    assert optimum - 1.0 <= onset <= highest


@pytest.mark.parametrize("crop", available_crops())
def test_no_warmer_air_gains_more_than_2_percent(crop: str) -> None:
    """Against air at the onset with the same vapour pressure, saturated at most."""
    onset = load_crop(crop).number("heat_onset")
    air = AIR[AIR > onset]
    humidity = 0.5 * saturation(air)
    cool = net_rate(crop, np.full(air.size, onset), np.minimum(humidity, saturation(onset)))
    gain = net_rate(crop, air, humidity) / cool - 1.0
    assert gain.max() <= 0.02
