"""Light and capacity of sunlit and shaded leaves: de Pury & Farquhar 1997, Plant Cell Environ. 20:537-557.

Their closed forms are integrals over the depth of the canopy; here the integrals are taken by scipy.
"""

from __future__ import annotations

import itertools
import math

import numpy as np
import pytest
from scipy.integrate import quad

from cropstress.day import block, canopy

from block_day import block_sky, random_weather
from plain_day import DIFFUSE_EXTINCTION, light_at_depth

VISIBLE, NEAR_INFRARED = 0.15, 0.80
SUN_AND_LEAF_AREA = list(itertools.product([1.0, 0.6, 0.2, 0.05, 0.011], [0.01, 0.3, 2.0, 7.0]))  # sine, 1
DECLINE = 0.713  # over the whole canopy; de Pury & Farquhar 1997 (from memory)


def integral(function, leaf_area: float) -> float:
    """Integral over the depth of the canopy."""
    return quad(function, 0.0, leaf_area, epsabs=0.0, epsrel=1e-11, limit=200)[0]


@pytest.mark.parametrize(("sine", "leaf_area"), SUN_AND_LEAF_AREA)
@pytest.mark.parametrize("scattering", [VISIBLE, NEAR_INFRARED])
@pytest.mark.parametrize(("beam", "diffuse"), [(300.0, 60.0), (0.0, 80.0), (250.0, 0.0)])
def test_absorbed_light_is_the_integral_over_depth(
    sine: float, leaf_area: float, scattering: float, beam: float, diffuse: float
) -> None:
    kb = canopy.beam_extinction(sine)
    assert kb == pytest.approx(0.5 / sine)
    by_all, by_sunlit = canopy.absorbed(beam, diffuse, kb, leaf_area, scattering)

    def sunlit(depth: float) -> float:
        return float(light_at_depth(depth, beam, diffuse, kb, scattering)[0]) * math.exp(-kb * depth)

    def shaded(depth: float) -> float:
        return float(light_at_depth(depth, beam, diffuse, kb, scattering)[1]) * (1.0 - math.exp(-kb * depth))

    by_exponential = 1e-8 * (beam + diffuse)  # the package's own exponential is good to 2e-9
    assert by_sunlit == pytest.approx(integral(sunlit, leaf_area), rel=1e-8, abs=by_exponential)
    expected = integral(sunlit, leaf_area) + integral(shaded, leaf_area)
    assert by_all == pytest.approx(expected, rel=1e-8, abs=by_exponential)


@pytest.mark.parametrize(("sine", "leaf_area"), SUN_AND_LEAF_AREA)
def test_area_capacity_and_longwave_are_integrals_over_depth(sine: float, leaf_area: float) -> None:
    kb, kd = 0.5 / sine, DIFFUSE_EXTINCTION

    def capacity(depth: float) -> float:
        return math.exp(-DECLINE * depth / leaf_area)

    expected = {
        canopy.sunlit_area(kb, leaf_area): lambda depth: math.exp(-kb * depth),
        canopy.sunlit_capacity(kb, leaf_area, DECLINE): lambda depth: capacity(depth) * math.exp(-kb * depth),
        canopy.whole_capacity(leaf_area, DECLINE): capacity,
        canopy.longwave_shares(kb, leaf_area)[0]: lambda depth: kd * math.exp(-kd * depth),
        canopy.longwave_shares(kb, leaf_area)[1]: lambda depth: kd * math.exp(-(kd + kb) * depth),
    }
    for value, function in expected.items():
        assert value == pytest.approx(integral(function, leaf_area), rel=1e-8, abs=1e-8)


@pytest.mark.parametrize("day", [15.0, 100.0, 172.0, 280.0])
def test_sunlit_and_shaded_leaves_are_all_and_never_take_more_than_there_is(day: float) -> None:
    """Random weather at all latitudes: area, light, net radiation and capacity of the two classes add up."""
    weather = random_weather(int(day), day)
    sky = block_sky(weather).reshape(6, -1)
    leaf_areas = np.random.default_rng(int(day)).uniform(0.02, 7.0, sky.shape[1])
    for lane, leaf_area in enumerate(leaf_areas):
        _, _, beam, diffuse, longwave, kb = sky[:, lane]
        classes = [block.leaf_class(sky, lane, leaf_area, DECLINE, sunlit, False) for sunlit in (True, False)]
        area, visible, net, capacity = (
            sum(leaves[0] * (1.0 if part == 0 else leaves[part]) for leaves in classes) for part in range(4)
        )
        longwave_taken = canopy.longwave_shares(kb, leaf_area)[0] * longwave
        half = (0.5 * beam, 0.5 * diffuse)
        by_all = [
            canopy.absorbed(*half, kb, leaf_area, scattering)[0] if kb > 0.0 else 0.0
            for scattering in (VISIBLE, NEAR_INFRARED)
        ]
        assert area == pytest.approx(leaf_area, rel=1e-9)
        assert visible == pytest.approx(by_all[0], rel=1e-9, abs=1e-12)
        assert net == pytest.approx(sum(by_all) + longwave_taken, rel=1e-9, abs=1e-9)
        assert capacity == pytest.approx(canopy.whole_capacity(leaf_area, DECLINE), rel=1e-9)
        assert 0.0 <= visible <= 0.5 * (beam + diffuse)
        assert sum(by_all) <= beam + diffuse
        assert all(leaves[1] >= 0.0 and 0.0 < leaves[3] <= 1.0 + 1e-9 for leaves in classes if leaves[0] > 0.0)


@pytest.mark.parametrize("day", [15.0, 172.0])
def test_the_single_top_leaf_is_the_limit_of_little_leaf_area(day: float) -> None:
    """Halving a small leaf area halves the distance to the top leaf: by Richardson's step it is met."""
    sky = block_sky(random_weather(int(day), day)).reshape(6, -1)
    smallest = canopy.SMALLEST_LEAF_AREA
    for lane in np.flatnonzero((sky[5] > 0.0) & (sky[5] < 2.0)):
        leaf = np.array(block.leaf_class(sky, lane, 5.0, DECLINE, True, True))
        small, twice = (
            np.array(block.leaf_class(sky, lane, leaf_area, 0.0001, True, False))
            for leaf_area in (smallest, 2.0 * smallest)
        )
        assert leaf[0] == 1.0 and leaf[3] == 1.0
        np.testing.assert_allclose(small[1:], leaf[1:], rtol=0.05, atol=0.5)
        np.testing.assert_allclose(2.0 * small[1:3] - twice[1:3], leaf[1:3], rtol=5e-4, atol=0.02)


def test_a_canopy_without_leaves_is_none() -> None:
    sky = block_sky(random_weather(1, 172.0)).reshape(6, -1)
    for sunlit, single in itertools.product((True, False), repeat=2):
        assert block.leaf_class(sky, 120, 0.0099, DECLINE, sunlit, single)[0] == 0.0


def test_in_the_dark_all_leaves_are_one_class() -> None:
    sky = block_sky(random_weather(1, 172.0)).reshape(6, -1)
    sky[2:4], sky[5] = 0.0, 0.0
    area, visible, net, capacity = block.leaf_class(sky, 0, 3.0, DECLINE, True, False)
    assert (area, visible) == (3.0, 0.0)
    assert net == pytest.approx((1.0 - math.exp(-DIFFUSE_EXTINCTION * 3.0)) * sky[4, 0] / 3.0)
    assert capacity == pytest.approx((1.0 - math.exp(-DECLINE)) / DECLINE)
    assert block.leaf_class(sky, 0, 3.0, DECLINE, False, False)[0] == 0.0
