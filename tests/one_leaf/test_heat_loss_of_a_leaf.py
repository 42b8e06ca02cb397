"""What heat costs one leaf, and that the README says what the program computes."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest

import cropstress as cs
from cropstress.crops import load_crop
from cropstress.one_leaf import heat_loss
from cropstress.season.measures import CAUSES

README = Path(__file__).parents[2] / "README.md"


def saturated(air: np.ndarray) -> np.ndarray:
    """FAO-56 Eq. 11 [kPa]."""
    return 0.6108 * np.exp(17.27 * air / (air + 237.3))


def rows_of_the_readme() -> list[tuple[str, float, list[str]]]:
    """Return crop, air temperature and the cells after them of the table of causes."""
    rows, crop = [], ""
    for line in README.read_text(encoding="utf-8").splitlines():
        cells = [cell.strip() for cell in line.strip("|").split("|")]
        if len(cells) == 8 and cells[1].endswith("°C"):
            crop = cells[0].split(" ")[0] or crop
            rows.append((crop, float(cells[1].split(" ")[0]), cells[2:]))
    return rows


@pytest.mark.parametrize(("crop", "air", "cells"), rows_of_the_readme())
def test_the_readme_shows_what_is_computed(crop: str, air: float, cells: list[str]) -> None:
    loss = heat_loss(crop, air, 0.4 * saturated(np.array(air)), 1500.0)
    lost = float(loss["lost_to_heat"])
    assert f"{lost:.1f}" == cells[0]
    if lost == 0.0:
        assert set(cells[1:5]) == {""}
        return
    shares = {cause: 100.0 * float(loss[f"lost_to_heat_by_{cause}"]) / lost for cause in CAUSES}
    assert [str(round(shares[cause])) for cause in CAUSES] == cells[1:5]
    leading = max(shares, key=lambda cause: shares[cause])
    small_in_c4 = leading == "photorespiration" and load_crop(crop).pathway == "C4"
    assert cells[5].startswith("no single one" if small_in_c4 else leading)


def test_the_readme_shows_a_c3_and_a_c4_leaf_at_four_temperatures() -> None:
    shown = {(load_crop(crop).pathway, air) for crop, air, _ in rows_of_the_readme()}
    assert shown == {(pathway, air) for pathway in ("C3", "C4") for air in (33.0, 36.0, 39.0, 42.0)}


@pytest.mark.parametrize("crop", ["wheat", "rice", "sorghum"])
def test_loss_is_the_difference_of_two_leaves(crop: str) -> None:
    """In air that the cool world can hold as vapour, its leaf is that of the onset's temperature."""
    onset = load_crop(crop).number("heat_onset")
    air = np.array([onset - 5.0, onset, onset + 0.5, onset + 6.0])
    vapour_pressure = 0.5 * saturated(np.array(onset))
    loss = heat_loss(crop, air, vapour_pressure, 1200.0)
    actual = cs.gas_exchange(crop, air, vapour_pressure, 1200.0)["assimilation"].values
    cool = cs.gas_exchange(crop, np.minimum(air, onset), vapour_pressure, 1200.0)["assimilation"].values
    assert (loss["lost_to_heat"].values[:2] == 0.0).all()
    np.testing.assert_allclose(loss["lost_to_heat"].values, cool - actual, atol=1e-9)
    parts = sum(loss[f"lost_to_heat_by_{cause}"].values for cause in CAUSES)
    np.testing.assert_allclose(parts, loss["lost_to_heat"].values, rtol=1e-12, atol=1e-12)
