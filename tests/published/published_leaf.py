"""A leaf held at a temperature and an intercellular CO2, through the package's own solver.

In saturated air, with no net radiation, a leaf has exactly the temperature of the air; the CO2 of the air is
then searched for the one that gives the wanted intercellular CO2. So what is compared with a published leaf
has gone through the whole program, not through a helper of it.
"""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np

from cropstress.crops import CropProfile, load_crop
from cropstress.leaf import solve
from cropstress.leaf.parameters import leaf_record
from cropstress.leaf.single import leaf_lanes, solve_lanes


def changed(crop: str, source: str, changes: Mapping[str, float]) -> CropProfile:
    """Return a shipped profile with some values of a publication."""
    return load_crop(crop, {name: {"value": value, "source": source} for name, value in changes.items()})


def beyond_range(profile: CropProfile, changes: Mapping[str, float]) -> CropProfile:
    """Return a profile with values outside the range of a crop in the field, such as air of 2 % oxygen."""
    kinetics = {
        name: value.model_copy(update={"value": changes[name]}) if name in changes else value
        for name, value in profile.kinetics.items()
    }
    return profile.model_copy(update={"kinetics": kinetics})


def at_air_co2(
    profile: CropProfile, co2: np.ndarray, temperature: np.ndarray, absorbed: np.ndarray, pressure: float
) -> np.ndarray:
    """Solve leaves that have the temperature of the air."""
    co2, temperature, absorbed = np.broadcast_arrays(co2, temperature, absorbed)
    count = co2.size
    saturated = 0.6108 * np.exp(17.27 * temperature / (temperature + 237.3))  # FAO-56 Eq. 11
    lanes = leaf_lanes(
        temperature,
        saturated,
        np.zeros(count),
        co2,
        np.full(count, 10.0),
        np.full(count, pressure),
        np.zeros(count),
        np.full(count, 25.0),
    )
    lanes[solve.PHOTONS] = absorbed
    return solve_lanes(leaf_record(profile), lanes)


def held(
    profile: CropProfile,
    intercellular_co2: np.ndarray,
    temperature: np.ndarray | float,
    absorbed: np.ndarray | float,
    pressure: float = 101.3,
) -> np.ndarray:
    """Solve leaves at given intercellular CO2 [umol mol-1], temperature [degC] and absorbed photons."""
    wanted, temperature, absorbed = (
        np.array(each, dtype=float) for each in np.broadcast_arrays(intercellular_co2, temperature, absorbed)
    )
    low, high = np.full(wanted.size, 0.1), np.full(wanted.size, 19000.0)
    for _ in range(60):
        middle = 0.5 * (low + high)
        found = at_air_co2(profile, middle, temperature, absorbed, pressure)[solve.INTERCELLULAR_CO2]
        low, high = np.where(found < wanted, middle, low), np.where(found < wanted, high, middle)
    answers = at_air_co2(profile, 0.5 * (low + high), temperature, absorbed, pressure)
    np.testing.assert_allclose(answers[solve.INTERCELLULAR_CO2], wanted, rtol=1e-6)
    np.testing.assert_allclose(answers[solve.LEAF_TEMPERATURE], temperature, atol=1e-6)
    return answers
