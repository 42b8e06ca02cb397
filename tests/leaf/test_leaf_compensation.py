"""Leaves whose net rate is about zero: the stomata's law has a kink there."""

from __future__ import annotations

import numpy as np

from cropstress.crops import load_crop
from cropstress.leaf import solve
from cropstress.leaf.parameters import leaf_record
from cropstress.leaf.single import leaf_lanes, solve_lanes

from oracle import Conditions, LeafOracle


def test_net_rate_just_below_zero_in_hot_moist_air() -> None:
    """Shaded C3 leaves with tight stomata at little CO2 that respire as much as they fix.

    An iteration that steps from one side of zero to the other sees two slopes of the supply, more than a
    hundredfold apart, and may go to and fro for ever; the leaf's temperature does not show it, as the stomata are
    nearly shut on both sides.
    """
    said = {"stomatal_intercept": {"value": 0.0022, "source": "within the promised range"}}
    profile = load_crop("groundnut", said)
    count = 4000
    generator = np.random.default_rng(20210604)
    air = generator.uniform(44.0, 50.0, count)
    humidity = generator.uniform(0.85, 1.0, count) * 0.6108 * np.exp(17.27 * air / (air + 237.3))
    photons = generator.uniform(50.0, 400.0, count)
    wind, pressure = np.full(count, 10.0), np.full(count, 85.0)
    co2 = generator.uniform(200.0, 300.0, count)
    growth = generator.uniform(15.0, 35.0, count)
    lanes = leaf_lanes(air, humidity, photons, co2, wind, pressure, np.zeros(count), growth)
    answers = solve_lanes(leaf_record(profile), lanes)
    conditions = Conditions(
        air, humidity, 0.85 * photons, photons / 4.57 * 1.05, np.ones(count), wind, pressure, co2, growth
    )
    oracle = LeafOracle(profile)
    found = oracle.solutions(conditions)
    assert (found.count(count) == 1).all()
    true = oracle.gas_exchange(found.temperature, conditions)
    assert (true["assimilation"] < 0.0).any() and (true["assimilation"] > 0.0).any()
    wrong = np.abs(answers[solve.ASSIMILATION] - true["assimilation"]) > 1e-3
    assert not wrong.any(), f"{wrong.sum()} of {count} leaves, for example number {np.nonzero(wrong)[0][0]}"
