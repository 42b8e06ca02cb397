"""The same numbers, bit for bit, however the map and the days are cut up and whoever computes them."""

from __future__ import annotations

import itertools
from collections.abc import Callable
from dataclasses import replace

import numpy as np
import pytest
import xarray as xr

from cropstress.errors import InputError
from cropstress.region import Entry, Options, compute_results
from cropstress.region.plan import Plan, plan_blocks, plan_tiles
from cropstress.season.measures import CELL_STATUS, STAGES


def differing(one: xr.Dataset, other: xr.Dataset) -> list[str]:
    """Names of the variables of which any bit differs."""
    assert set(one.variables) == set(other.variables)
    return [
        str(name)
        for name in one.variables
        if one[name].shape != other[name].shape
        or one[name].dtype != other[name].dtype
        or one[name].values.tobytes() != other[name].values.tobytes()
    ]


def test_cut_out_has_all_that_could_go_wrong(uncut: list[xr.Dataset]) -> None:
    """Without these the tests below would show little."""
    wheat, maize = uncut
    for result in uncut:
        status = result["cell_status"].values
        for reason in ("computed", "no_crop", "no_weather_data"):
            assert (status == CELL_STATUS[reason]).any()
        assert np.nanmax(result["missing_days"]) == 3
        assert np.nanmax(result["mended_days"]) == 1
        assert np.nanmin(result["hot_days"]) == 0
        assert np.nanmax(result["hot_days"]) > 5
        assert np.nanmax(result["lost_to_heat"]) > 0
    assert np.nanmin(wheat["lost_to_heat"]) == 0
    grown = wheat["assimilation_by_stage"].max(["season", "lat", "lon"]).values
    assert grown.shape == (len(STAGES),) and (grown > 0).all()
    assert np.unique(maize["season_days"].values[np.isfinite(maize["season_days"])]).size > 3


@pytest.mark.parametrize(
    ("tile", "block_days", "threads"),
    [
        *itertools.product([None, (7, 5)], [1, 10, None], [1, 2]),
        # A tile of one cell fills all lanes with it: the dearest way, so not every combination
        ((1, 1), 1, 2),
        ((1, 1), 10, 1),
        ((1, 1), None, 2),
    ],
)
def test_result_does_not_depend_on_the_cutting(
    computed: Callable[..., list[xr.Dataset]],
    uncut: list[xr.Dataset],
    tile: tuple[int, int] | None,
    block_days: int | None,
    threads: int,
) -> None:
    for cut, whole in zip(computed(tile, block_days, threads), uncut, strict=True):
        assert differing(cut, whole) == []


def test_a_cell_does_not_see_its_neighbours(weather: xr.Dataset, entries: list[Entry], uncut: list[xr.Dataset]) -> None:
    computed = np.argwhere(uncut[0]["cell_status"].values[0] == CELL_STATUS["computed"])
    for row, column in computed[[0, len(computed) // 2, -1]]:
        place = {"lat": [row], "lon": [column]}
        cell = row * weather.sizes["lon"] + column
        alone = [replace(entry, sowing=entry.sowing[:, [cell]], grown=entry.grown[[cell]]) for entry in entries]
        results, _ = compute_results(weather.isel(place), alone, Options(), {})
        for result, whole in zip(results, uncut, strict=True):
            whole = whole.isel(place)
            for name in whole.data_vars:
                np.testing.assert_array_equal(result[name].values, whole[name].values, err_msg=str(name))


@pytest.mark.parametrize("block_days", [1, 10, 70])
@pytest.mark.parametrize(("more", "stops"), [(-5, False), (5, True)])
def test_faults_are_judged_over_the_whole_run(
    weather: xr.Dataset, entries: list[Entry], block_days: int, more: int, stops: bool
) -> None:
    """1 % of the cell-days that have data is the limit; here all of them lie on one day."""
    bad = weather.copy(deep=True)
    there = int(np.isfinite(weather["tmax"]).sum())
    land = np.argwhere(np.isfinite(weather["tmax"].values[30]))
    spoilt = int(0.01 * there) + more
    assert spoilt < len(land)
    for row, column in land[:spoilt]:
        bad["tmin"][30, row, column] = bad["tmax"][30, row, column] + 0.2
    plan = Plan(plan_blocks(70, [], block_days), plan_tiles(14, 10))
    if stops:
        with pytest.raises(InputError, match="too many to be mended") as caught:
            compute_results(bad, entries, Options(), {}, plan=plan, threads=2)
        assert "2021-07-01 at latitude" in str(caught.value)
    else:
        _, computed = compute_results(bad, entries, Options(), {}, plan=plan, threads=2)
        assert spoilt <= computed.counts["tmin_above_tmax_mended"] <= spoilt + 1
