"""Small faults are mended or masked and counted; systematic ones are told."""

from __future__ import annotations

import numpy as np
import pytest

from cropstress.weather import judge_mends, mend_block, mend_words
from cropstress.weather.humidity import mean_saturation_vapour_pressure

TOP = 40.0  # MJ m-2 d-1
SATURATION = float(mean_saturation_vapour_pressure(30.0, 15.0))


def block(**values: float) -> dict[str, np.ndarray]:
    """Make a block of one day, one row, two columns: the first as said, the second without fault."""
    usual = {"tmax": 30.0, "tmin": 15.0, "vapour_pressure": 1.5, "radiation": 20.0, "wind": 2.0}
    usual |= {name: {"pressure": 100.0, "rain": 0.0}[name] for name in values if name not in usual}
    return {name: np.array([[[values.get(name, usual[name]), usual[name]]]]) for name in usual}


@pytest.mark.parametrize(
    ("values", "kind", "expected"),
    [
        ({"tmin": 30.4}, "tmin_above_tmax_mended", {"tmin": 30.2, "tmax": 30.2}),
        ({"radiation": -1e-11}, "radiation_below_zero_mended", {"radiation": 0.0}),
        ({"radiation": 40.05}, "radiation_just_above_top_of_air_mended", {"radiation": 40.0}),
        ({"radiation": 41.9}, "radiation_above_top_of_air_mended", {"radiation": 40.0}),
        (
            {"vapour_pressure": SATURATION * 1.04},
            "vapour_pressure_above_saturation_mended",
            {"vapour_pressure": SATURATION},
        ),
        ({"rain": -0.05}, "rain_below_zero_mended", {"rain": 0.0}),
    ],
)
def test_mended(values: dict[str, float], kind: str, expected: dict[str, float]) -> None:
    done = mend_block(block(**values), np.full((1, 1, 2), TOP))
    assert done.counts == {kind: 1}
    assert done.mended.tolist() == [[[1, 0]]]
    for name, value in expected.items():
        assert done.arrays[name][0, 0, 0] == pytest.approx(value)
    assert not any(np.isnan(each).any() for each in done.arrays.values())
    assert done.worst[kind].index == (0, 0, 0)


@pytest.mark.parametrize(
    ("values", "kind"),
    [
        ({"tmin": 30.6}, "tmin_above_tmax_masked"),
        ({"tmax": 400.0}, "temperature_impossible_masked"),
        ({"tmin": -91.0}, "temperature_impossible_masked"),
        ({"radiation": -0.2}, "radiation_below_zero_masked"),
        ({"radiation": 42.1}, "radiation_above_top_of_air_masked"),
        ({"vapour_pressure": -0.1}, "vapour_pressure_below_zero_masked"),
        ({"vapour_pressure": SATURATION * 1.06}, "vapour_pressure_above_saturation_masked"),
        ({"wind": -1.0}, "wind_below_zero_masked"),
        ({"pressure": 10.0}, "pressure_impossible_masked"),
        ({"rain": -1.0}, "rain_below_zero_masked"),
    ],
)
def test_masked(values: dict[str, float], kind: str) -> None:
    given = block(**values)
    done = mend_block(given, np.full((1, 1, 2), TOP))
    assert done.counts == {kind: 1}
    assert done.mended.sum() == 0
    for name, array in done.arrays.items():
        assert np.isnan(array[0, 0, 0])
        assert array[0, 0, 1] == given[name][0, 0, 1]


def test_missing_in_one_is_missing_in_all_and_not_counted() -> None:
    done = mend_block(block(radiation=np.nan), np.full((1, 1, 2), TOP))
    assert done.counts == {}
    assert np.isnan(done.arrays["tmax"][0, 0, 0])


def test_temperatures_alone() -> None:
    done = mend_block(
        {"tmax": np.full((2, 1, 1), 30.0), "tmin": np.full((2, 1, 1), 10.0)}, np.zeros((2, 1, 1))
    )
    assert done.counts == {}
    assert set(done.arrays) == {"tmax", "tmin"}


def test_saturated_air_is_no_fault() -> None:
    """100 % in float32 is a rounding error above saturation."""
    given = block(vapour_pressure=float(np.float32(SATURATION)) * (1.0 + 1e-7))
    assert mend_block(given, np.full((1, 1, 2), TOP)).counts == {}


def test_block_is_not_changed_and_cuts_do_not_matter() -> None:
    random = np.random.default_rng(1)
    given = {
        "tmax": random.normal(20.0, 10.0, (12, 3, 3)),
        "tmin": random.normal(15.0, 10.0, (12, 3, 3)),
        "radiation": random.normal(20.0, 15.0, (12, 3, 3)),
        "vapour_pressure": random.normal(1.5, 1.0, (12, 3, 3)),
    }
    before = {name: values.copy() for name, values in given.items()}
    top = np.full((12, 3, 3), 38.0)
    whole = mend_block(given, top)
    parts = [
        mend_block({name: values[day : day + 1] for name, values in given.items()}, top[:1])
        for day in range(12)
    ]
    for name in given:
        np.testing.assert_array_equal(given[name], before[name])
        np.testing.assert_array_equal(
            whole.arrays[name], np.concatenate([part.arrays[name] for part in parts])
        )
    assert whole.counts == {kind: sum(part.counts.get(kind, 0) for part in parts) for kind in whole.counts}


def test_systematic_faults() -> None:
    counts = {"tmin_above_tmax_masked": 30, "radiation_below_zero_mended": 500, "wind_below_zero_masked": 4}
    worst = {"tmin_above_tmax_masked": "tmin 40 above tmax 20 degC on 2021-06-01 at 40.0 N"}
    (fault,) = judge_mends(counts, 1000, worst)
    assert "30 of 1000 cell-days (3.0 %)" in fault.what
    assert "tmin 40 above tmax 20" in fault.what
    assert "unit" in fault.remedy
    assert judge_mends(counts, 3001) == []
    # a handful in a small grid is not systematic
    assert judge_mends({"tmin_above_tmax_masked": 5}, 20) == []


def test_words() -> None:
    words = mend_words({"wind_below_zero_masked": 1, "radiation_below_zero_mended": 7})
    assert words == ["radiation below zero: 7 cell-days mended", "wind speed below zero: 1 cell-day masked"]
