"""The tasks of a run: each block of days is read once and carried through every tile and crop."""

from __future__ import annotations

import threading
from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace
from typing import Any

import dask
import numpy as np
import xarray as xr

from cropstress.region.account import Account, BlockAccount
from cropstress.region.calendar import TimeAxis
from cropstress.region.entry import Entry
from cropstress.region.plan import Plan
from cropstress.season import layout as at
from cropstress.season.advance import advance
from cropstress.weather import (
    cell_latitude_longitude,
    extraterrestrial_radiation,
    mend_block,
    pressure_from_elevation,
)

BLOCKS_ALIVE = 3  # blocks of weather in memory at once; measured: more let reading race ahead of computing
VARIABLES = ("tmax", "tmin", "vapour_pressure", "radiation", "wind", "pressure")
NEEDED_FOR_GAS_EXCHANGE = ("vapour_pressure", "radiation")
DEFAULT_WIND = 2.0  # m s-1; FAO-56 ch. 4: where no wind data are at hand
SEA_LEVEL_PRESSURE = 101.3  # kPa; FAO-56 Eq. 7 at 0 m


@dataclass
class Block:
    """The weather of a block of days; arrays (days, cells)."""

    first: int
    weather: np.ndarray
    mended: np.ndarray
    account: BlockAccount


@dataclass
class TileState:
    """What a crop entry carries from block to block on one tile; `cells` are numbers of the whole map."""

    cells: np.ndarray
    walk: np.ndarray
    recent: np.ndarray
    bits: np.ndarray
    totals: np.ndarray
    by_stage: np.ndarray
    by_ten_days: np.ndarray
    daily: list[np.ndarray]


@dataclass(frozen=True)
class Ground:
    """What does not change in time, on all cells."""

    latitude: np.ndarray  # [rad]
    longitude: np.ndarray  # [degrees]
    elevation: np.ndarray  # [m]
    pressure: np.ndarray  # [kPa], where the files hold none

    @property
    def latitude_degrees(self) -> np.ndarray:
        """Latitude [degrees]."""
        return np.degrees(self.latitude)


def ground_of(dataset: xr.Dataset) -> Ground:
    """Read latitude, elevation and the pressure that follows from it."""
    latitude, longitude = cell_latitude_longitude(dataset)
    if "elevation" in dataset:
        elevation = np.nan_to_num(np.asarray(dataset["elevation"].values, dtype=float).ravel())
        pressure = np.asarray(pressure_from_elevation(elevation), dtype=float)
    else:
        elevation = np.zeros(latitude.size)
        pressure = np.full(latitude.size, SEA_LEVEL_PRESSURE)
    return Ground(np.radians(latitude.ravel()), longitude.ravel(), elevation, pressure)


def has_gas_exchange(dataset: xr.Dataset) -> bool:
    """Whether the weather holds all that assimilation needs."""
    return all(name in dataset for name in NEEDED_FOR_GAS_EXCHANGE)


def load_block(dataset: xr.Dataset, axis: TimeAxis, ground: Ground, first: int, after: int) -> Block:
    """Read, mend and lay out the weather of a block of days; each chunk is read once."""
    names = [name for name in VARIABLES if name in dataset]
    part = dataset[names].isel(time=slice(first, after))
    with dask.config.set(scheduler="synchronous"):
        loaded = part.load()
    days = after - first
    shape = (days, ground.latitude.size)
    raw = {name: np.asarray(loaded[name].values, dtype=float).reshape((days, -1, 1)) for name in names}
    above = extraterrestrial_radiation(axis.sun_day()[first:after, None, None], ground.latitude_degrees[None, :, None])
    mended = mend_block(raw, np.broadcast_to(above, (days, shape[1], 1)))
    weather = np.empty((len(VARIABLES), *shape))
    for number, name in enumerate(VARIABLES):
        if name in mended.arrays:
            weather[number] = mended.arrays[name].reshape(shape)
        elif name == "wind":
            weather[number] = DEFAULT_WIND
        elif name == "pressure":
            weather[number] = ground.pressure
        else:
            weather[number] = 0.0
    present = np.isfinite(raw["tmax"]).reshape(shape)
    worst = {
        kind: (example.excess, f"{example.words}, {_where(axis, ground, first + example.index[0], example.index[1])}")
        for kind, example in mended.worst.items()
    }
    account = BlockAccount(mended.counts, worst, int(present.sum()), present.any(axis=0))
    return Block(first, weather, mended.mended.reshape(shape), account)


def _where(axis: TimeAxis, ground: Ground, day: int, cell: int) -> str:
    """Return a day and a cell in words."""
    latitude, longitude = ground.latitude_degrees[cell], ground.longitude[cell]
    return f"{axis.iso(day)} at latitude {latitude:.3f}, longitude {longitude:.3f}"


def begin_tile(entry: Entry, cells: np.ndarray) -> TileState:
    """Make the state of a tile before the first day."""
    count, seasons = cells.size, len(entry.years)
    walk = np.zeros((1, at.WALK, count))
    walk[:, at.SEASON] = -1.0
    walk[:, at.SUNSET_BEFORE] = np.nan
    return TileState(
        cells,
        walk,
        np.full((at.RECENT_DAYS, count), np.nan),
        np.zeros((1, at.BITS, count), dtype=np.int64),
        np.full((1, seasons, at.TOTALS, count), np.nan),
        np.zeros((1, seasons, 4, at.SERIES_COUNT, count)),
        np.zeros((1, seasons, entry.steps, at.SERIES_COUNT, count)),
        [],
    )


def without_data_last(state: TileState, block: Block) -> TileState:
    """Return the state of a tile that has not begun, its cells without data in the first block put last.

    The sea then fills blocks of lanes of its own, in which nothing is solved.
    """
    order = np.argsort(~block.account.observed[state.cells], kind="stable")
    return replace(state, cells=state.cells[order])


def advance_tile(
    entry: Entry, state: TileState, block: Block, axis: TimeAxis, ground: Ground, gas: bool, keep_daily: bool
) -> TileState:
    """Carry a tile's seasons through a block of days."""
    cells = state.cells
    days = block.mended.shape[0]
    daily = np.full((1, days if keep_daily else 0, at.DAILY, cells.size), np.nan)
    if cells.size:
        advance(
            entry.leaf, entry.season, entry.co2[None, :], np.ascontiguousarray(entry.sowing[None, :, cells]),
            axis.sun_day()[block.first : block.first + days], axis.ten_days[block.first : block.first + days],
            entry.first_ten_days, block.first, np.ascontiguousarray(block.weather[:, :, cells]),
            np.ascontiguousarray(block.mended[:, cells]), ground.latitude[cells], ground.elevation[cells], gas,
            state.walk, state.recent, state.bits, state.totals, state.by_stage, state.by_ten_days, daily,
        )  # fmt: skip
    if keep_daily:
        state.daily.append(daily)
    return state


def _done(*states: object) -> None:
    """Mark that every tile has used a block, so that a further one may be read."""


@dataclass
class Computed:
    """What the tasks leave: the states of every entry's tiles, counts of mended values, cells with data."""

    tiles: dict[str, list[TileState]]
    counts: dict[str, int]
    observed: np.ndarray


def compute(
    dataset: xr.Dataset,
    entries: Sequence[Entry],
    plan: Plan,
    axis: TimeAxis,
    *,
    threads: int | None = None,
    progress: Callable[[float], None] | None = None,
    keep_daily: bool = False,
) -> Computed:
    """Walk all crops through all days.

    Parameters
    ----------
    dataset : xarray.Dataset
        Canonical weather.
    entries : sequence of Entry
    plan : Plan
    axis : TimeAxis
    threads : int, optional
        Threads to use; all cores by default. Results do not depend on it.
    progress : callable, optional
        Called with the share of the work that is done.
    keep_daily : bool
        Keep what every day gave.

    Returns
    -------
    Computed

    Raises
    ------
    InputError
        When faults in the data are systematic.
    """
    import dask.threaded

    ground = ground_of(dataset)
    gas = has_gas_exchange(dataset)
    columns = dataset.sizes[list(dataset["tmax"].dims)[2]]
    total = len(plan.blocks) * len(plan.tiles) * len(entries)
    finished = 0
    counting = threading.Lock()
    account = Account(ground.latitude.size, axis.length)
    graph: dict[tuple[object, ...], tuple[object, ...]] = {}

    def load(first: int, after: int, _waits: object) -> Block:
        block = load_block(dataset, axis, ground, first, after)
        account.add(block.account)
        return block

    def step(entry: Entry, state: TileState, block: Block) -> TileState:
        nonlocal finished
        if block.first == plan.blocks[0][0]:
            state = without_data_last(state, block)
        state = advance_tile(entry, state, block, axis, ground, gas, keep_daily)
        with counting:
            finished += 1
            if progress:
                progress(finished / total)
        return state

    needed = [entry.grown & (entry.sowing >= 0).any(axis=0) for entry in entries]
    for k, (first, after) in enumerate(plan.blocks):
        brake = ("done", k - BLOCKS_ALIVE) if k >= BLOCKS_ALIVE else None
        graph["load", k] = (load, first, after, brake)
        users: list[tuple[object, ...]] = []
        for e, entry in enumerate(entries):
            for t, tile in enumerate(plan.tiles):
                key = ("tile", e, t, k)
                before: object = ("tile", e, t, k - 1)
                if k == 0:
                    before = begin_tile(entry, _cells_of(tile, columns, needed[e]))
                graph[key] = (step, entry, before, ("load", k))
                users.append(key)
        graph["done", k] = (_done, *users)
    last = len(plan.blocks) - 1
    wanted: list[Any] = [[("tile", e, t, last) for t in range(len(plan.tiles))] for e in range(len(entries))]
    states = dask.threaded.get(graph, wanted, num_workers=threads)
    account.close()
    tiles = {entry.name: list(states[e]) for e, entry in enumerate(entries)}
    return Computed(tiles, account.counts, account.observed)


def _cells_of(tile: tuple[int, int, int, int], columns: int, needed: np.ndarray) -> np.ndarray:
    top, bottom, left, right = tile
    rows, places = np.meshgrid(np.arange(top, bottom), np.arange(left, right), indexing="ij")
    cells = (rows * columns + places).ravel()
    return cells[needed[cells]]
