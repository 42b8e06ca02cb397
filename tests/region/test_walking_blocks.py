"""How the weather is read: lazily, each block once, and never far ahead of the computing."""

from __future__ import annotations

import threading
import time

import numpy as np
import pytest
import xarray as xr

import cropstress as cs
from cropstress.region import compute as compute_module


@pytest.fixture
def reads(monkeypatch: pytest.MonkeyPatch) -> list[tuple[int, int]]:
    """Return the blocks that were read, in order."""
    seen: list[tuple[int, int]] = []
    read = compute_module.load_block

    def counted(dataset, axis, ground, first, after):  # type: ignore[no-untyped-def]
        seen.append((first, after))
        return read(dataset, axis, ground, first, after)

    monkeypatch.setattr(compute_module, "load_block", counted)
    return seen


def test_nothing_is_computed_until_it_is_asked_for(weather: xr.Dataset, reads: list[tuple[int, int]]) -> None:
    result = cs.assess(weather, "wheat", sowing="5 April", block_days=50)
    assert result["assimilation"].dims[0] == "season"
    assert not reads


def test_one_walk_serves_all_measures(weather: xr.Dataset, reads: list[tuple[int, int]]) -> None:
    cs.assess(weather, "wheat", sowing="5 April", block_days=50, tile=(2, 9)).load()
    assert sorted(reads) == [(0, 50), (50, 100), (100, 150)]


def test_reading_waits_for_the_computing(
    weather: xr.Dataset, reads: list[tuple[int, int]], monkeypatch: pytest.MonkeyPatch
) -> None:
    """With slow computing and two threads, at most three blocks are read before the first is used up."""
    advance_tile = compute_module.advance_tile
    used: list[int] = []
    ahead: list[int] = []
    lock = threading.Lock()

    def slow(entry, state, block, *rest):  # type: ignore[no-untyped-def]
        time.sleep(0.05)
        with lock:
            ahead.append(len(reads) - len(used))
            used.append(1)
        return advance_tile(entry, state, block, *rest)

    monkeypatch.setattr(compute_module, "advance_tile", slow)
    cs.assess(weather, "wheat", sowing="5 April", block_days=10, tile=(10, 9), threads=2).load()
    assert len(used) == len(reads) == 15
    assert max(ahead) <= compute_module.BLOCKS_ALIVE


def test_where_the_crop_is_not_grown_nothing_is_computed(
    weather: xr.Dataset, monkeypatch: pytest.MonkeyPatch
) -> None:
    area = np.zeros(weather["tmax"].shape[1:])
    area[3:5, 4:6] = 0.2
    cells: list[int] = []
    begin_tile = compute_module.begin_tile

    def counted(entry, chosen):  # type: ignore[no-untyped-def]
        cells.append(chosen.size)
        return begin_tile(entry, chosen)

    monkeypatch.setattr(compute_module, "begin_tile", counted)
    result = cs.assess(weather, "wheat", sowing="5 April", area=area).load()
    assert sum(cells) == 4
    assert np.isfinite(result["assimilation"].values).sum() == 4
    assert (result["cell_status"].values[:, area == 0.0] == 1).all()
