"""Each block is read once, never more than three are in memory, and only cells with the crop are computed."""

from __future__ import annotations

import threading
import weakref
from typing import Any

import dask.array
import numpy as np
import pytest
import xarray as xr

from cropstress.region import Entry, compute, make_plan, time_axis
from cropstress.region.plan import Plan, plan_blocks, plan_tiles


class Watch:
    """Counts blocks: how often each is loaded, how many are alive, whether loading runs ahead."""

    def __init__(self, monkeypatch: pytest.MonkeyPatch, steps_per_block: int) -> None:
        self.loads: list[int] = []
        self.most_alive = 0
        self.ran_ahead: list[int] = []
        self._alive = 0
        self._steps: dict[int, int] = {}
        self._lock = threading.Lock()
        load, advance = compute.load_block, compute.advance_tile

        def loading(dataset: Any, axis: Any, ground: Any, first: int, after: int) -> Any:
            with self._lock:
                unfinished = [each for each in self.loads if self._steps.get(each, 0) < steps_per_block]
                if len(unfinished) >= compute.BLOCKS_ALIVE:
                    self.ran_ahead.append(first)
                self.loads.append(first)
            block = load(dataset, axis, ground, first, after)
            with self._lock:
                self._alive += 1
                self.most_alive = max(self.most_alive, self._alive)
            weakref.finalize(block, self._freed)
            return block

        def advancing(entry: Any, state: Any, block: Any, *rest: Any) -> Any:
            state = advance(entry, state, block, *rest)
            with self._lock:
                self._steps[block.first] = self._steps.get(block.first, 0) + 1
            return state

        monkeypatch.setattr(compute, "load_block", loading)
        monkeypatch.setattr(compute, "advance_tile", advancing)

    def _freed(self) -> None:
        with self._lock:
            self._alive -= 1


@pytest.mark.parametrize("threads", [1, 2])
def test_each_block_is_loaded_once_and_at_most_three_are_alive(
    weather: xr.Dataset, entries: list[Entry], monkeypatch: pytest.MonkeyPatch, threads: int
) -> None:
    plan = Plan(plan_blocks(70, [], 4), plan_tiles(14, 10, (7, 10)))
    watch = Watch(monkeypatch, len(plan.tiles) * len(entries))
    compute.compute(weather, entries, plan, time_axis(weather), threads=threads)
    assert sorted(watch.loads) == [first for first, _ in plan.blocks]
    assert watch.ran_ahead == []
    assert watch.most_alive <= compute.BLOCKS_ALIVE


def counted(weather: xr.Dataset, days: int) -> tuple[xr.Dataset, dict[tuple[str, int], int]]:
    """The weather in chunks of some days, each of which counts how often it is read."""
    reads: dict[tuple[str, int], int] = {}
    lazy = {}
    for name, variable in weather.data_vars.items():
        if "time" not in variable.dims:
            continue
        values = variable.values

        def read(block_info: Any, values: np.ndarray = values, name: str = str(name)) -> np.ndarray:
            (first, after), *_ = block_info[None]["array-location"]
            reads[name, first] = reads.get((name, first), 0) + 1
            return values[first:after]

        chunks = (tuple(min(days, len(values) - first) for first in range(0, len(values), days)), *values.shape[1:])
        array = dask.array.map_blocks(read, chunks=chunks, dtype=values.dtype, meta=np.empty((0, 0, 0)))
        lazy[name] = variable.copy(data=array)
    return weather.assign(lazy), reads


def test_each_chunk_of_the_files_is_read_once(weather: xr.Dataset, entries: list[Entry]) -> None:
    lazy, reads = counted(weather, 12)
    plan = make_plan(lazy, tile=(4, 10))
    assert len(plan.tiles) > 1 and len(plan.blocks) > 1
    compute.compute(lazy, entries, plan, time_axis(lazy), threads=2)
    expected = {(str(name), first) for name in lazy.data_vars if lazy[name].chunks for first in range(0, 70, 12)}
    assert set(reads) == expected
    assert set(reads.values()) == {1}


def test_cells_without_the_crop_are_not_computed(
    weather: xr.Dataset, entries: list[Entry], area: np.ndarray, monkeypatch: pytest.MonkeyPatch
) -> None:
    handed: set[int] = set()
    advance = compute.advance_tile

    def advancing(entry: Any, state: Any, *rest: Any) -> Any:
        handed.update(int(cell) for cell in state.cells)
        return advance(entry, state, *rest)

    monkeypatch.setattr(compute, "advance_tile", advancing)
    compute.compute(weather, entries, make_plan(weather), time_axis(weather))
    assert handed == set(np.flatnonzero(area > 0))


def test_sea_fills_lanes_of_its_own(weather: xr.Dataset, entries: list[Entry]) -> None:
    """In a block of lanes without any weather nothing is solved, so the cells without come last."""
    plan = make_plan(weather)
    tile = compute.compute(weather, entries, plan, time_axis(weather)).tiles["wheat"][0]
    there = np.isfinite(weather["tmax"].values).any(axis=0).ravel()[tile.cells]
    assert there.any() and not there.all()
    assert np.array_equal(there, np.sort(there)[::-1])
