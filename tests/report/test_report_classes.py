"""Classes of the maps and the colours they are printed in.

Dichromacy: matrices of Machado, Oliveira & Fernandes 2009, IEEE Trans Vis Comput Graph 15:1291-1298,
severity 1.0, and of Vienot, Brettel & Mollon 1999, Color Res Appl 24:243-252, on linear RGB (both from
memory; each row adds up to 1, which is checked). CIE 1976 lightness from the luminance of linear sRGB,
IEC 61966-2-1 (common practice).
"""

from __future__ import annotations

import itertools

import numpy as np
import pytest

from cropstress.errors import InputError
from cropstress.report import colours
from cropstress.report.classes import LIMITS, classes_for
from cropstress.season.measures import MEASURES

DICHROMACY = {
    "none": np.eye(3),
    "protanopia, Machado": np.array(
        [[0.152286, 1.052583, -0.204868], [0.114503, 0.786281, 0.099216], [-0.003882, -0.048116, 1.051998]]
    ),
    "deuteranopia, Machado": np.array(
        [[0.367322, 0.860646, -0.227968], [0.280085, 0.672501, 0.047413], [-0.011820, 0.042940, 0.968881]]
    ),
    "tritanopia, Machado": np.array(
        [[1.255528, -0.076749, -0.178779], [-0.078411, 0.930809, 0.147602], [0.004733, 0.691367, 0.303900]]
    ),
    "protanopia, Vienot": np.array(
        [[0.11238, 0.88762, 0.0], [0.11238, 0.88762, 0.0], [0.00401, -0.00401, 1.0]]
    ),
    "deuteranopia, Vienot": np.array(
        [[0.29275, 0.70725, 0.0], [0.29275, 0.70725, 0.0], [-0.02234, 0.02234, 1.0]]
    ),
}
LEAST_STEP = 15.0


def linear(colour: str) -> np.ndarray:
    encoded = np.array([int(colour[start : start + 2], 16) for start in (1, 3, 5)]) / 255.0
    return np.where(encoded <= 0.04045, encoded / 12.92, ((encoded + 0.055) / 1.055) ** 2.4)


def lightness(rgb: np.ndarray) -> float:
    luminance = float(np.array([0.2126, 0.7152, 0.0722]) @ np.clip(rgb, 0.0, 1.0))
    return 116.0 * luminance ** (1.0 / 3.0) - 16.0 if luminance > 216.0 / 24389.0 else 903.3 * luminance


@pytest.mark.parametrize("name", DICHROMACY)
def test_the_matrices_keep_white(name: str) -> None:
    np.testing.assert_allclose(DICHROMACY[name].sum(axis=1), 1.0, atol=2e-6)


@pytest.mark.parametrize("sight", DICHROMACY)
@pytest.mark.parametrize("palette", ["LOSS", "HEAT", "NEUTRAL"])
def test_classes_in_order_are_15_lightness_units_apart(palette: str, sight: str) -> None:
    steps = [lightness(DICHROMACY[sight] @ linear(colour)) for colour in getattr(colours, palette)]
    assert len(steps) == 5
    assert min(-np.diff(steps)) >= LEAST_STEP
    if palette != "NEUTRAL":
        assert lightness(linear(colours.NONE)) - steps[0] >= LEAST_STEP


def test_causes_are_15_lightness_units_apart_in_grey() -> None:
    shades = sorted(lightness(linear(colour)) for colour in (colours.NONE, *colours.CAUSE))
    assert min(np.diff(shades)) >= LEAST_STEP


@pytest.mark.parametrize("sight", DICHROMACY)
def test_causes_stay_apart_in_lightness_or_hatching(sight: str) -> None:
    looks = [
        (lightness(DICHROMACY[sight] @ linear(colour)), hatch)
        for colour, hatch in zip(colours.CAUSE, colours.CAUSE_HATCH, strict=True)
    ]
    for (one, one_hatch), (other, other_hatch) in itertools.combinations(looks, 2):
        assert abs(one - other) >= 10.0 and one_hatch != other_hatch


def test_every_measure_but_flags_has_fixed_rising_limits() -> None:
    assert set(LIMITS) == {name for name, measure in MEASURES.items() if measure.kind != "flag"}
    for limits in LIMITS.values():
        assert len(limits) == 4 and list(limits) == sorted(set(limits))


@pytest.mark.parametrize("name", MEASURES)
def test_a_label_and_a_colour_for_each_class(name: str) -> None:
    classes = classes_for(name)
    assert len(classes.labels) == len(classes.colours) == len(classes.hatches) == 5
    assert len(set(classes.labels)) == 5 and len(set(classes.colours)) == 5


def test_a_share_under_one_percent_is_too_small_to_tell() -> None:
    classes = classes_for("lost_to_heat_share")
    assert classes.labels == (
        "less than 1 %: too small to tell",
        "1 – 5 %",
        "5 – 10 %",
        "10 – 20 %",
        "20 % and more",
    )
    found = classes.index(np.array([-0.004, 0.0099, 0.01, 0.049, 0.05, 0.2, 0.9]))
    assert list(found) == [0, 0, 1, 1, 2, 4, 4]


def test_counts_and_months_read_as_people_count() -> None:
    assert classes_for("hot_days").labels == ("1 to 4", "5 to 9", "10 to 19", "20 to 39", "40 and more")
    assert classes_for("hot_days_flowering").labels[:2] == ("1", "2 to 3")
    assert classes_for("season_days").labels[0] == "less than 90"
    assert classes_for("sowing_day").labels[2] == "May – June"
    assert list(classes_for("sowing_day").index(np.array([1.0, 59.0, 60.0, 243.0, 244.0, 366.0]))) == [
        0,
        0,
        1,
        3,
        4,
        4,
    ]
    assert classes_for("lost_to_heat_by_enzymes").labels[0] == "below 0: warmth helped"


def test_unknown_measure() -> None:
    with pytest.raises(InputError, match='Did you mean "leading_cause"'):
        classes_for("leading_couse")
