"""The numbers of a run against each other and against plain counts from the input files, in every cell."""

import numpy as np
import pytest
import xarray as xr
from finished_run import Run

from cropstress.report.netcdf import as_stored
from cropstress.season.measures import CAUSES, CELL_STATUS, MEASURES, SERIES

#: Rounding of limits, so that a limit stored as float32 counts alike [K].
ROUNDING = 1e-3


def temperatures(finished: Run) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """Daily highest and lowest temperature [degC] and day of the year, read from the input file with xarray."""
    (path,) = [each for each in finished.job().weather.paths if each.name.startswith("airtemperature")]
    with xr.open_dataset(path) as dataset:
        celsius = dataset[["tasmax", "tasmin"]].load() - 273.15
        return celsius["tasmax"].values, celsius["tasmin"].values, dataset["time"].dt.dayofyear.values


def season_of(result: xr.Dataset, days: np.ndarray) -> np.ndarray:
    """Which days of which cell lie between sowing and maturity, both included; (days, Y, X)."""
    sown, mature = result["sowing_day"].values[0], result["maturity_day"].values[0]
    return (days[:, None, None] >= sown) & (days[:, None, None] <= mature)


def computed(result: xr.Dataset) -> np.ndarray:
    return result["cell_status"].values[0] == CELL_STATUS["computed"]


def test_every_crop_is_computed_where_it_grows(finished: Run) -> None:
    tmax, _, _ = temperatures(finished)
    for crop in finished.crops:
        result, job = finished.unwritten(crop), finished.job()
        area = job.areas[crop]
        expected = (np.nan_to_num(area) > 0) & np.isfinite(tmax).all(axis=0)
        assert expected.sum() > 10
        assert np.array_equal(computed(result), expected)
        sea = ~np.isfinite(tmax).any(axis=0)
        assert (result["cell_status"].values[0][sea] == CELL_STATUS["no_weather_data"]).all()
        for name in MEASURES:
            values = result[name].values[0]
            assert (np.isnan(values) if name != "leading_cause" else values == -1)[~expected].all()


def test_hot_days_equal_a_plain_count_from_the_input_files(finished: Run) -> None:
    tmax, tmin, days = temperatures(finished)
    for crop in finished.crops:
        result = finished.unwritten(crop)
        within, where = season_of(result, days), computed(result)
        limit, night = float(result["hot_day_limit"]), float(result["warm_night_limit"])
        counts = {
            "hot_days": tmax > limit + ROUNDING,
            "hot_days_if_cooler": tmax > limit + 1.0 + ROUNDING,
            "hot_days_if_warmer": tmax > limit - 1.0 + ROUNDING,
            "warm_nights": tmin > night + ROUNDING,
            "season_days": np.ones_like(tmax, dtype=bool),
        }
        for name, hot in counts.items():
            plain = (within & hot).sum(axis=0)
            assert np.array_equal(result[name].values[0][where], plain[where]), (crop, name)
            with xr.open_dataset(finished.grid(crop), decode_times=False, mask_and_scale=False) as written:
                assert np.array_equal(written[name].values[0][where], plain[where])
        hottest = np.where(within, tmax, -np.inf).max(axis=0)
        assert np.array_equal(result["hottest_temperature"].values[0][where], hottest[where])
        assert result["hot_days"].values[0][where].max() > 0


def test_hot_days_at_flowering_equal_a_plain_count(finished: Run) -> None:
    tmax, _, days = temperatures(finished)
    checked = 0
    for entry in finished.job().entries:
        result = finished.unwritten(entry.name)
        window = entry.profile.flowering_window
        if window is None:
            assert np.isnan(result["hot_days_flowering"].values).all()
            continue
        flowering, where = result["flowering_day"].values[0], computed(result)
        since = days[:, None, None] - flowering
        within = season_of(result, days) & (since >= window[0]) & (since <= window[1])
        plain = (within & (tmax > float(result["flowering_limit"]) + ROUNDING)).sum(axis=0)
        assert np.array_equal(result["hot_days_flowering"].values[0][where], plain[where])
        checked += int(plain[where].max() > 0)
    assert checked > 0


def test_causes_add_up_to_the_loss(finished: Run) -> None:
    """To 1e-9 of the sum of their absolute values, before anything is written."""
    for crop in finished.crops:
        result = finished.unwritten(crop)
        where = computed(result)
        for ending in ("", "_by_stage", "_by_ten_days"):
            parts = np.stack([result[f"lost_to_heat_by_{cause}{ending}"].values for cause in CAUSES])[..., where]
            lost = result[f"lost_to_heat{ending}"].values[..., where]
            assert (np.abs(parts.sum(axis=0) - lost) <= 1e-9 * np.abs(parts).sum(axis=0)).all(), crop
        assert lost.max() > 0


def test_cell_never_above_the_onset_lost_exactly_nothing(finished: Run) -> None:
    tmax, _, days = temperatures(finished)
    never_anywhere = 0
    for crop in finished.crops:
        result = finished.unwritten(crop)
        within = season_of(result, days)
        # The first night of a season still cools down from the evening before
        within[:-1] |= within[1:]
        where = computed(result)
        cool = where & (np.where(within, tmax, -np.inf).max(axis=0) <= float(result["heat_onset"]))
        for name in ("lost_to_heat", *(f"lost_to_heat_by_{cause}" for cause in CAUSES)):
            assert (result[name].values[0][cool] == 0.0).all()
        assert (result["lost_to_heat_share"].values[0][cool] == 0.0).all()
        assert (result["leading_cause"].values[0][cool] == 0).all()
        assert (result["lost_to_heat"].values[0][where & ~cool] != 0.0).mean() > 0.9
        never_anywhere += int(cool.sum())
    assert never_anywhere > 0


def test_sums_of_ten_days_stages_and_season_agree(finished: Run) -> None:
    for crop in finished.crops:
        result = finished.unwritten(crop)
        where = computed(result)
        for name in SERIES:
            season = result[name].values[0][where]
            for step in ("stage", "ten_days"):
                parts = result[f"{name}_by_{step}"].values[0][:, where]
                if MEASURES[name].kind == "count":
                    assert np.array_equal(parts.sum(axis=0), season)
                else:
                    assert (np.abs(parts.sum(axis=0) - season) <= 1e-12 * np.abs(parts).sum(axis=0)).all()


def test_stages_and_ten_days_hold_the_days_that_belong_to_them(finished: Run) -> None:
    """Hot days once more: counted within the dates of each step, by the calendar and by the profile."""
    tmax, _, days = temperatures(finished)
    for entry in finished.job().entries:
        result = finished.unwritten(entry.name)
        where, hot = computed(result), tmax > float(result["hot_day_limit"]) + ROUNDING
        within = season_of(result, days) & hot
        starts = result["ten_days_start"].values[0].astype("datetime64[D]")
        first = (starts - np.datetime64("2021-01-01")).astype(int) + 1
        assert {str(start)[8:] for start in starts} <= {"01", "11", "21"}
        for step, (begin, end) in enumerate(zip(first, [*first[1:], 400], strict=True)):
            plain = (within & ((days >= begin) & (days < end))[:, None, None]).sum(axis=0)
            assert np.array_equal(result["hot_days_by_ten_days"].values[0, step][where], plain[where])
        edges = np.cumsum([0, *entry.profile.days])
        since = days[:, None, None] - result["sowing_day"].values[0]
        for stage in range(4):
            inside = (since >= edges[stage]) & (since < edges[stage + 1])
            plain = (within & inside).sum(axis=0)
            assert np.array_equal(result["hot_days_by_stage"].values[0, stage][where], plain[where])


def test_shares_and_leading_cause_follow_from_the_sums(finished: Run) -> None:
    for crop in finished.crops:
        result = finished.unwritten(crop)
        where = computed(result)
        lost, assimilation = (result[name].values[0][where] for name in ("lost_to_heat", "assimilation"))
        share = lost / (assimilation + lost)
        np.testing.assert_allclose(result["lost_to_heat_share"].values[0][where], share, rtol=1e-14)
        parts = np.stack([result[f"lost_to_heat_by_{cause}"].values[0][where] for cause in CAUSES])
        expected = np.where(share < 0.01, 0, 1 + parts.argmax(axis=0))
        assert np.array_equal(result["leading_cause"].values[0][where], expected)
        assert (assimilation > 0).all()


def test_sowing_is_that_of_the_inputs(finished: Run) -> None:
    """The grid's days for maize and, for wheat, the dates of the districts' table."""
    folder = finished.run_file.parent
    grids = folder / "grids" if (folder / "grids").is_dir() else folder.parent / "sample_grids"
    with xr.open_dataset(grids / "sowing_day.nc") as dataset:
        days = dataset["maize_sowing_day"].values
    maize = finished.unwritten("maize")
    where = computed(maize)
    assert np.array_equal(maize["sowing_day"].values[0][where], days[where])
    rows = (grids / "sowing_by_district.csv").read_text("utf-8").splitlines()[1:]
    dates = {np.datetime64(f"2021-{row.rsplit(',', 1)[1]}") for row in rows}
    expected = {int((date - np.datetime64("2021-01-01")).astype(int)) + 1 for date in dates}
    wheat = finished.unwritten("wheat")
    found = set(np.unique(wheat["sowing_day"].values[0][computed(wheat)]).astype(int).tolist())
    assert found <= expected and len(found) > 3


@pytest.mark.parametrize(
    "name", [*MEASURES, *(f"{each}_by_{step}" for each in SERIES for step in ("stage", "ten_days"))]
)
def test_file_holds_the_unwritten_result_in_its_own_type(finished: Run, name: str) -> None:
    for crop in finished.crops:
        measure = MEASURES[name.partition("_by_stage")[0].partition("_by_ten_days")[0]]
        with xr.open_dataset(finished.grid(crop), decode_times=False, mask_and_scale=False) as written:
            expected = finished.unwritten(crop)[name].transpose(*written[name].dims).values
            assert written[name].dtype == measure.dtype
            assert np.array_equal(written[name].values, as_stored(expected, measure.dtype), equal_nan=True)
