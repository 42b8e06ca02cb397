"""What single days gave adds up to the season, exactly: the same numbers in the same order."""

from __future__ import annotations

import numpy as np
import xarray as xr

from cropstress.region import Entry, make_plan, time_axis
from cropstress.region.compute import compute
from cropstress.season import layout as at
from cropstress.season.measures import SERIES


def in_order(values: np.ndarray) -> float:
    """Add one after the other; NumPy's own sum pairs them."""
    return float(np.cumsum(values)[-1]) if values.size else 0.0


def test_days_add_up_to_season_stages_and_ten_days(weather: xr.Dataset, entries: list[Entry]) -> None:
    axis = time_axis(weather)
    states = compute(weather, entries, make_plan(weather, block_days=10), axis, keep_daily=True).tiles
    for entry in entries:
        (state,) = states[entry.name]
        daily = np.concatenate(state.daily, axis=1)[0]
        steps = axis.ten_days - entry.first_ten_days[0]
        checked = 0
        for cell in range(state.cells.size):
            growing = np.flatnonzero(np.isfinite(daily[:, at.DAILY_STAGE, cell]))
            counted = [day for day in growing if np.isfinite(daily[day, 0, cell])]
            for row in range(at.GAS_SERIES):
                assert in_order(daily[counted, row, cell]) == state.totals[0, 0, row, cell], SERIES[row]
                for stage in range(4):
                    days = [day for day in counted if daily[day, at.DAILY_STAGE, cell] == stage]
                    assert in_order(daily[days, row, cell]) == state.by_stage[0, 0, stage, row, cell]
                for step in range(entry.steps):
                    days = [day for day in counted if steps[day] == step]
                    assert in_order(daily[days, row, cell]) == state.by_ten_days[0, 0, step, row, cell]
            checked += bool(counted)
        assert checked > 50
