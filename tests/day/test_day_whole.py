"""Whole days: against a plain re-computation, a finer quadrature, and the causes by themselves."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from scipy.integrate import quad

from cropstress.crops import load_crop
from cropstress.day import block, course, worlds

from block_day import block_day, block_sky, random_weather, summer_weather
from plain_day import CAUSES, Crop, Weather, night_respiration, plain_day

AMOUNTS = ("assimilation", "lost_to_heat", "lost_to_photorespiration", "photorespired_co2", *CAUSES)
TEMPERATURES = ("highest_leaf", "largest_leaf_excess", "smallest_leaf_excess", "daytime_deficit")


def random_crop(name: str, seed: int, *, single_leaf: bool = False, co2: float = 421.0) -> Crop:
    """A crop with a leaf area and a growth temperature for each cell."""
    draw = np.random.default_rng(seed)
    leaf_area, growth = draw.uniform(0.02, 7.0, block.CELLS), draw.uniform(11.0, 35.0, block.CELLS)
    return Crop(load_crop(name), leaf_area, growth, co2, single_leaf)


def usual_crop(name: str, leaf_area: float = 4.0) -> Crop:
    """A crop as its profile has it."""
    profile = load_crop(name)
    growth = profile.number("growth_temperature") if profile.pathway == "C3" else 25.0
    return Crop(profile, np.full(block.CELLS, leaf_area), np.full(block.CELLS, growth))


@pytest.mark.parametrize("single_leaf", [False, True], ids=["canopy", "top leaf"])
@pytest.mark.parametrize("name", ["maize", "sugarcane", "wheat", "cotton"])
@pytest.mark.parametrize("day", [15.0, 105.0, 172.0, 260.0])
def test_day_equals_the_plain_computation(name: str, day: float, single_leaf: bool) -> None:
    """Random weather at 65 south to 65 north; 1e-6 of the day's potential and 1e-6 K."""
    crop = random_crop(name, int(day), single_leaf=single_leaf, co2=300.0 + day)
    weather = random_weather(int(day), day)
    found, expected = block_day(crop, weather), plain_day(crop, weather)
    potential = np.abs(expected["assimilation"]) + np.abs(expected["lost_to_heat"])
    for answer in AMOUNTS:
        assert (np.abs(found[answer] - expected[answer]) <= 1e-6 * potential).all(), answer
    for answer in TEMPERATURES:
        np.testing.assert_allclose(found[answer], expected[answer], atol=1e-6)
    assert (expected["lost_to_heat"] > 0.01).any()


@pytest.mark.parametrize("name", ["maize", "soybean"])
def test_day_equals_the_plain_computation_beyond_the_polar_circles(name: str) -> None:
    weather = random_weather(9, 172.0, np.linspace(-85.0, 85.0, block.CELLS))
    crop = random_crop(name, 9)
    found, expected = block_day(crop, weather), plain_day(crop, weather)
    for answer in AMOUNTS:
        np.testing.assert_allclose(found[answer], expected[answer], rtol=1e-6, atol=1e-8)


def test_a_polar_night_is_a_day_of_respiration() -> None:
    """24 h at the mean temperature, in the leaf response of Heskel et al. 2016."""
    latitude = np.linspace(-85.0, -75.0, block.CELLS)
    weather = replace(random_weather(4, 172.0, latitude), radiation=np.zeros(block.CELLS))
    middle = (weather.highest + weather.lowest) / 2.0
    weather = replace(weather, sunset_before=middle)
    crop = replace(usual_crop("wheat"), single_leaf=True)
    relative = np.exp(0.1012 * (middle - 25.0) - 0.0005 * (middle**2 - 625.0))
    number = crop.profile.number
    rate = number("carboxylation_capacity") * number("respiration_ratio") * relative
    np.testing.assert_allclose(block_day(crop, weather)["assimilation"], -rate * 24.0 * 3600.0e-6, rtol=1e-8)


def test_a_polar_day_has_no_night() -> None:
    """The evening before changes nothing where the sun does not set."""
    weather = random_weather(4, 172.0, np.linspace(75.0, 85.0, block.CELLS))
    crop = usual_crop("wheat")
    hotter = replace(weather, sunset_before=weather.sunset_before + 20.0)
    one, other = block_day(crop, weather), block_day(crop, hotter)
    for answer in AMOUNTS:
        np.testing.assert_array_equal(one[answer], other[answer])


@pytest.mark.parametrize(("name", "cooler"), [("maize", 0.0), ("soybean", 0.0), ("cotton", 0.0), ("wheat", 6.0)])
def test_eight_points_are_enough_for_a_summer(name: str, cooler: float) -> None:
    """Against 96 points: assimilation within 0.1 %, heat loss within 1.5 %, at each of 32 places over 23 days."""
    crop = replace(usual_crop(name), leaf_area=np.linspace(1.0, 6.0, block.CELLS))
    coarse, fine = (dict.fromkeys(("assimilation", "lost_to_heat"), 0.0) for _ in range(2))
    for day in np.linspace(152.0, 243.0, 23).round():
        weather = summer_weather(day, cooler)
        eight, many = block_day(crop, weather), plain_day(crop, weather, points=96)
        for answer in coarse:
            coarse[answer] = coarse[answer] + eight[answer]
            fine[answer] = fine[answer] + many[answer]
    assert (fine["lost_to_heat"] > 0.003 * fine["assimilation"]).all()
    error = {answer: np.abs(coarse[answer] / fine[answer] - 1.0).max() for answer in coarse}
    print(f"{name}: largest error of 8 points, " + ", ".join(f"{each} {error[each]:.2e}" for each in error))
    assert error["assimilation"] < 1e-3
    assert error["lost_to_heat"] < 0.015


def test_five_points_are_enough_for_a_night() -> None:
    """Evenings from 5 K below to 25 K above the lowest temperature, against the integral by scipy: within 1e-5."""
    weather = random_weather(6, 100.0)
    weather = replace(weather, sunset_before=weather.lowest + np.linspace(-5.0, 25.0, block.CELLS))
    crop = usual_crop("wheat")
    even = np.full(block.CELLS, 25.0)
    at_25 = night_respiration(crop, replace(weather, lowest=even, sunset_before=even), np.inf)
    relative = night_respiration(crop, weather, np.inf) / at_25
    for lowest, evening, found in zip(weather.lowest, weather.sunset_before, relative, strict=True):

        def respired(share: float, lowest: float = lowest, evening: float = evening) -> float:
            air = lowest + (evening - lowest) * np.exp(-2.2 * share)
            return float(np.exp(0.1012 * (air - 25.0) - 0.0005 * (air**2 - 625.0)))  # Heskel et al. 2016

        assert found == pytest.approx(quad(respired, 0.0, 1.0)[0], rel=1e-5)


@pytest.mark.parametrize("name", ["maize", "sorghum", "wheat", "rice"])
@pytest.mark.parametrize("single_leaf", [False, True], ids=["canopy", "top leaf"])
def test_the_four_causes_add_up_to_the_loss(name: str, single_leaf: bool) -> None:
    for day in (1.0, 60.0, 172.0, 230.0, 300.0):
        found = block_day(random_crop(name, int(day), single_leaf=single_leaf), random_weather(int(day) + 50, day))
        causes = np.array([found[cause] for cause in CAUSES])
        size = np.abs(causes).sum(axis=0) + np.abs(found["lost_to_heat"])
        assert (np.abs(causes.sum(axis=0) - found["lost_to_heat"]) <= 1e-12 * size).all()
        assert (size > 0.01).any()


@pytest.mark.parametrize("name", ["maize", "wheat"])
def test_a_crop_never_above_its_onset_loses_exactly_nothing(name: str) -> None:
    crop = usual_crop(name)
    onset = crop.profile.number("heat_onset")
    weather = random_weather(8, 172.0)
    at_most = np.minimum(weather.highest, onset)
    mild = replace(weather, highest=at_most, lowest=np.minimum(weather.lowest, onset - 3.0), sunset_before=at_most)
    mild.highest[:4], mild.lowest[:4], mild.sunset_before[:4] = onset, onset - 3.0, onset
    found = block_day(crop, mild)
    for answer in ("lost_to_heat", *CAUSES):
        assert (found[answer] == 0.0).all()
    hot = replace(mild, highest=mild.highest + 12.0)
    assert (block_day(crop, hot)["lost_to_heat"] != 0.0).any()


def test_cells_of_a_block_do_not_touch_each_other() -> None:
    """A cool cell beside a hot one loses exactly nothing, and each cell's answers are those it has among others."""
    crop = usual_crop("wheat")
    weather = random_weather(12, 172.0)
    cool = weather.highest <= crop.profile.number("heat_onset")
    cool &= weather.sunset_before <= crop.profile.number("heat_onset")
    found = block_day(crop, weather)
    assert cool.any() and not cool.all()
    assert (found["lost_to_heat"][cool] == 0.0).all()
    backwards = Weather(weather.day_of_year, *(
        getattr(weather, name)[::-1].copy() for name in Weather.__dataclass_fields__ if name != "day_of_year"
    ))  # fmt: skip
    turned = block_day(crop, backwards)
    for answer in AMOUNTS:
        np.testing.assert_array_equal(turned[answer][::-1], found[answer])


def test_hot_nights_cost_respiration_only() -> None:
    """An evening above the onset and a day below it: all of the loss is respiration."""
    crop = usual_crop("maize")
    weather = random_weather(8, 172.0)
    weather = replace(weather, highest=np.full(32, 30.0), lowest=np.full(32, 20.0), sunset_before=np.full(32, 40.0))
    found = block_day(crop, weather)
    assert (found["lost_to_heat"] > 0.0).all()
    np.testing.assert_array_equal(found["lost_to_heat"], found["respiration"])
    expected = night_respiration(crop, weather, np.inf) - night_respiration(crop, weather, 33.0)
    np.testing.assert_allclose(found["lost_to_heat"], expected, rtol=1e-7)


@pytest.mark.parametrize("name", ["maize", "wheat"])
def test_a_dark_hot_day_costs_respiration_only(name: str) -> None:
    """Without light the leaf keeps its whole potential of nothing: f = 1 and three causes are exactly 0."""
    weather = replace(random_weather(8, 172.0), radiation=np.zeros(block.CELLS))
    found = block_day(usual_crop(name), weather)
    for cause in ("photorespiration", "stomata", "enzymes"):
        np.testing.assert_allclose(found[cause], 0.0, atol=1e-15)
    np.testing.assert_allclose(found["lost_to_heat"], found["respiration"], rtol=1e-12)
    assert (found["respiration"] > 0.0).any()


def split(
    kept: tuple[float, float],
    potential: tuple[float, float],
    mixed: tuple[float, float],
    respiration: tuple[float, float],
) -> np.ndarray:
    """The causes of a made-up leaf, each pair (cool, actual); mixed are (dry air, warm leaf)."""
    gross_cool, gross = kept[0] * potential[0], kept[1] * potential[1]
    return np.array(
        worlds.causes(
            gross - respiration[1], respiration[1], gross_cool - respiration[0], respiration[0],
            potential[1], potential[0], mixed[0], mixed[1],
        )
    )  # fmt: skip


def test_causes_by_hand() -> None:
    """Cool: potential 40 of which 0.8 is kept; actual: 30 of which 0.6. Dry air alone 36, a warm leaf alone 33.

    Shapley 1953: photorespiration (40 + 30)/2 (0.8 - 0.6) = 7; stomata 0.7 ((40 - 36) + (33 - 30))/2 = 2.45;
    enzymes 0.7 ((40 - 33) + (36 - 30))/2 = 4.55; respiration 3 - 2 = 1. Together 15 = (32 - 2) - (18 - 3).
    """
    found = split((0.8, 0.6), (40.0, 30.0), (36.0, 33.0), (2.0, 3.0))
    np.testing.assert_allclose(found, [7.0, 2.45, 4.55, 1.0], rtol=1e-13)


def test_causes_have_the_properties_of_shapley_values() -> None:
    """Additive; alike causes get alike shares; what changes nothing gets nothing; turned about, the signs turn."""
    draw = np.random.default_rng(0)
    for _ in range(200):
        kept, potential = draw.uniform(0.1, 1.0, 2), draw.uniform(1.0, 60.0, 2)
        mixed, respiration = draw.uniform(1.0, 60.0, 2), draw.uniform(0.1, 4.0, 2)
        found = split(kept, potential, mixed, respiration)
        loss = kept[0] * potential[0] - respiration[0] - kept[1] * potential[1] + respiration[1]
        assert found.sum() == pytest.approx(loss, abs=1e-12 * np.abs(found).sum())
        swapped = split(kept, potential, mixed[::-1], respiration)
        np.testing.assert_allclose(swapped[[0, 2, 1, 3]], found, rtol=1e-9, atol=1e-12)
        about = split(kept[::-1], potential[::-1], mixed[::-1], respiration[::-1])
        np.testing.assert_allclose(about, -found, rtol=1e-9, atol=1e-12)
        alike = split(kept, potential, (mixed[0], mixed[0]), respiration)
        assert alike[1] == pytest.approx(alike[2], rel=1e-9)
        dummy = split((kept[0], kept[0]), potential, (potential[0], potential[1]), respiration)
        np.testing.assert_allclose(dummy[:2], 0.0, atol=1e-12)


def test_a_leaf_without_potential_keeps_all_of_it() -> None:
    found = split((1.0, 1.0), (0.0, 0.0), (0.0, 0.0), (1.0, 1.5))
    np.testing.assert_array_equal(found, [0.0, 0.0, 0.0, 0.5])


def test_dry_air_of_the_day_is_the_mean_deficit_of_its_points() -> None:
    weather = random_weather(2, 172.0)
    sky = block_sky(weather)
    deficit = np.vectorize(course.saturation)(sky[0]) - sky[1]
    expected = (block.DAY_WEIGHTS[:, None] * deficit).sum(axis=0)
    np.testing.assert_allclose(block_day(usual_crop("wheat"), weather)["daytime_deficit"], expected, rtol=1e-8)
