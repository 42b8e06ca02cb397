"""Tables: hand-checked means, totals over totals, dates over New Year."""

from __future__ import annotations

import csv
from collections.abc import Callable
from pathlib import Path

import cftime
import numpy as np
import pytest
import xarray as xr

from cropstress.report import statistics
from cropstress.report.tables import largest_cause, write_season_table, write_stage_table, write_ten_day_table

Maker = Callable[..., xr.Dataset]


def rows_of(path: Path) -> list[dict[str, str]]:
    with path.open(encoding="utf-8", newline="") as file:
        return list(csv.DictReader(file))


@pytest.fixture
def two_cells(result_maker: Maker) -> xr.Dataset:
    """Two cells: 90 taken up and 10 lost; 50 taken up and nothing lost."""
    result = result_maker(1, 2)
    for name, values in {
        "assimilation": [90.0, 50.0],
        "lost_to_heat": [10.0, 0.0],
        "lost_to_heat_share": [0.1, 0.0],
        "lost_to_heat_by_photorespiration": [2.0, 0.0],
        "lost_to_heat_by_stomata": [1.0, 0.0],
        "lost_to_heat_by_enzymes": [6.0, 0.0],
        "lost_to_heat_by_respiration": [1.0, 0.0],
        "hot_days": [8.0, 0.0],
        "flowering_day": [150.0, 154.0],
    }.items():
        result[name].values[...] = np.array(values)
    for step, parts in (("stage", [0.1, 0.3, 0.5, 0.1]), ("ten_days", [0.0, 0.1, 0.2, 0.3, 0.3, 0.1])):
        for name in ("assimilation", "lost_to_heat", "hot_days"):
            whole = result[name].values[:, None]
            result[f"{name}_by_{step}"].values[...] = whole * np.array(parts)[None, :, None, None]
    return result


def test_season_table_by_hand(tmp_path: Path, two_cells: xr.Dataset) -> None:
    write_season_table(two_cells, tmp_path / "seasons.csv")
    (row,) = rows_of(tmp_path / "seasons.csv")
    assert (row["crop"], row["scenario"], row["season"]) == ("maize", "observed", "2021")
    assert (row["first_day"], row["last_day"]) == ("2021-04-20", "2021-06-20")
    assert row["cells_computed [1]"] == "2"
    assert float(row["assimilation mean [mol m-2]"]) == 70.0
    # 10 lost of 150 possible, not the mean of 0.1 and 0
    assert float(row["lost_to_heat_share total [1]"]) == pytest.approx(10.0 / 150.0, rel=1e-6)
    assert float(row["lost_to_heat_share median [1]"]) == 0.05
    assert float(row["hot_days median [1]"]) == 4.0 and float(row["hot_days highest [1]"]) == 8.0
    assert row["flowering_day median [date]"] == "2021-06-01"
    assert row["leading_cause"] == "enzymes"
    assert "not yield" in row["notes"] and "enough soil water" in row["notes"]


def test_area_weighs_the_means(tmp_path: Path, two_cells: xr.Dataset) -> None:
    write_season_table(two_cells, tmp_path / "seasons.csv", np.array([[1.0, 3.0]]))
    (row,) = rows_of(tmp_path / "seasons.csv")
    assert float(row["assimilation mean [mol m-2]"]) == 60.0
    assert float(row["lost_to_heat_share total [1]"]) == pytest.approx(10.0 / 250.0, rel=1e-6)


def test_steps_add_up_to_the_season(tmp_path: Path, two_cells: xr.Dataset) -> None:
    write_ten_day_table(two_cells, tmp_path / "ten_days.csv")
    write_stage_table(two_cells, tmp_path / "stages.csv")
    ten_days, stages = rows_of(tmp_path / "ten_days.csv"), rows_of(tmp_path / "stages.csv")
    assert [row["stage"] for row in stages] == ["initial", "development", "mid", "late"]
    assert [row["first_day"] for row in ten_days] == [
        "2021-04-20",
        "2021-05-01",
        "2021-05-11",
        "2021-05-21",
        "2021-06-01",
        "2021-06-11",
    ]
    assert [row["last_day"] for row in ten_days][::5] == ["2021-04-30", "2021-06-20"]
    for rows in (ten_days, stages):
        assert sum(float(row["assimilation [mol m-2]"]) for row in rows) == pytest.approx(70.0)
        assert sum(float(row["hot_days [1]"]) for row in rows) == pytest.approx(4.0)
    # Nothing was possible in the first ten days: the share is empty there, not 0 and not nan
    assert ten_days[0]["lost_to_heat_share [1]"] == "" and "nan" not in (tmp_path / "ten_days.csv").read_text(
        "utf-8"
    )


def test_blank_cells_do_not_count(tmp_path: Path, result_maker: Maker) -> None:
    result = result_maker(10, 10)
    write_season_table(result, tmp_path / "seasons.csv")
    (row,) = rows_of(tmp_path / "seasons.csv")
    computed = result["cell_status"].values == 0
    assert int(row["cells_computed [1]"]) == computed.sum() < 100
    expected = result["assimilation"].values[0][computed].mean()
    assert float(row["assimilation mean [mol m-2]"]) == pytest.approx(expected, rel=1e-6)


def test_steps_that_a_season_does_not_have_are_left_out(tmp_path: Path, result_maker: Maker) -> None:
    result = result_maker(2, 2)
    starts = result["ten_days_start"].values.copy()
    starts[0, -1] = np.datetime64("NaT")
    result = result.assign_coords(ten_days_start=(("season", "ten_days"), starts))
    write_ten_day_table(result, tmp_path / "ten_days.csv")
    rows = rows_of(tmp_path / "ten_days.csv")
    assert len(rows) == 5 and rows[-1]["last_day"] == "2021-06-20"


def test_median_date_over_new_year(result_maker: Maker) -> None:
    result = result_maker(1, 3)
    result = result.assign_coords(
        season_start=("season", np.array(["2020-10-01"], dtype="datetime64[ns]")),
        season_end=("season", np.array(["2021-06-30"], dtype="datetime64[ns]")),
    )
    # 30 December, 2 January, 4 January: the median is in January, where a median of 365, 2 and 4 is not
    result["flowering_day"].values[...] = np.array([365.0, 2.0, 4.0])
    assert str(statistics.median_date(result, 2021, "flowering_day")) == "2021-01-02"
    assert str(statistics.date_of(result, 2021, 366.0)) == "2020-12-31"
    assert statistics.date_of(result, 2021, np.nan) is None


def test_a_day_just_before_the_first_day_counted_stays_before_it(result_maker: Maker) -> None:
    assert str(statistics.date_of(result_maker(1, 1), 2021, 109.0)) == "2021-04-19"
    assert str(statistics.date_of(result_maker(1, 1), 2021, 175.0)) == "2021-06-24"


def test_dates_of_another_calendar(result_maker: Maker) -> None:
    result = result_maker(1, 1)
    first, last = cftime.Datetime360Day(2021, 2, 30), cftime.Datetime360Day(2021, 8, 30)
    result = result.assign_coords(
        season_start=("season", np.array([first])), season_end=("season", np.array([last]))
    )
    # Day 61 of a year of 30-day months is 1 March
    assert statistics.date_of(result, 2021, 61.0) == cftime.Datetime360Day(2021, 3, 1)
    assert statistics.season_length(result, 2021) == 181


def test_leading_cause_of_a_total() -> None:
    causes = {"photorespiration": 1.0, "stomata": -2.0, "enzymes": 3.0, "respiration": 0.5}
    assert largest_cause(causes, 0.02) == "enzymes"
    assert largest_cause(causes, 0.0099) == "none"
    assert largest_cause(causes, float("nan")) == ""
