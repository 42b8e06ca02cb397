"""What the model costs: run as `python tests/benchmarks/speed.py`.

Prints, all measured side by side in one run on one core: nanoseconds per leaf solution of the compiled solver and
of the same solution in plain vectorised NumPy (`numpy_leaf.py`) to the same accuracy, on the whole array and cut by
hand into blocks that fit the cache; their ratios; and microseconds per cell, day and crop of the whole engine. Only
ratios carry from one machine to another.
"""

from __future__ import annotations

import tempfile
import time
from collections.abc import Callable
from pathlib import Path

import numpy as np
import xarray as xr

import cropstress as cs
from cropstress.leaf import solve
from cropstress.leaf.parameters import leaf_record
from cropstress.leaf.single import in_blocks, leaf_lanes, solve_blocks, solve_lanes

from numpy_leaf import solve_with_numpy

LEAVES = 400 * solve.LANES
REPEATS = 5
NUMPY_BLOCKS = (1024, 4096)  # leaves at once, where NumPy is helped by arrays that fit into the cache
ENGINE_DAYS = 60


def leaves(mild: bool, seed: int = 1) -> np.ndarray:
    """Return random leaves: of a mild summer, or of the whole range that the solver must master."""
    random = np.random.default_rng(seed)

    def between(low: float, high: float) -> np.ndarray:
        return random.uniform(low, high, LEAVES)

    air = between(12, 42) if mild else between(-5, 50)
    relative = between(20, 90) if mild else between(5, 100)
    vapour_pressure = relative / 100 * 0.6108 * np.exp(17.27 * air / (air + 237.3))
    constant = np.ones(LEAVES)
    wind, pressure, co2 = (
        (2.0 * constant, 100.0 * constant, 400.0 * constant)
        if mild
        else (between(0.5, 15), between(55, 105), between(200, 1200))
    )
    return leaf_lanes(
        air, vapour_pressure, between(0, 2200), co2, wind, pressure, between(-100, 0), 25.0 * constant
    )


def seconds(call: Callable[[], object]) -> float:
    """Return the processor time of a call."""
    start = time.process_time()
    call()
    return time.process_time() - start


def compare(crop: str, mild: bool) -> None:
    """Print solver and NumPy on the same leaves."""
    record = leaf_record(cs.load_crop(crop))
    lanes = leaves(mild)
    solved = solve_lanes(record, lanes)
    with np.errstate(all="ignore"):
        net, temperature = solve_with_numpy(record, lanes)

        def plainly(size: int) -> None:
            for first in range(0, LEAVES, size):
                solve_with_numpy(record, lanes[:, first : first + size])

        blocks = in_blocks(lanes)
        answers = np.empty((len(blocks), solve.LEAF_OUTPUTS, solve.LANES))
        compiled, plain, helped = [], [], []
        for _ in range(REPEATS):
            compiled.append(seconds(lambda: solve_blocks(record, blocks, 1.0, answers)))
            plain.append(seconds(lambda: plainly(LEAVES)))
            helped += [seconds(lambda size=size: plainly(size)) for size in NUMPY_BLOCKS]  # type: ignore[misc]
    fast, slow, better = (min(times) / LEAVES * 1e9 for times in (compiled, plain, helped))
    # A leaf with several solutions may be solved for another of them; the oracle of the tests looks at those.
    apart = np.abs(net - solved[solve.ASSIMILATION])
    same = np.abs(temperature - solved[solve.LEAF_TEMPERATURE]) < 0.1
    print(
        f"{cs.load_crop(crop).pathway} {'mild' if mild else 'full'} range: {fast:5.0f} ns a leaf solution, "
        f"NumPy {slow:5.0f} ns, ratio {slow / fast:4.1f} (NumPy in blocks that fit the cache {better:.0f} ns, "
        f"{better / fast:.1f}); they differ by {apart[same].max():.0e} umol m-2 s-1 at most "
        f"({(~same).sum()} of {LEAVES} leaves in another solution)"
    )


def whole_engine(crop: str, hot: bool, folder: Path) -> None:
    """Print the cost of a cell's day, courses, canopy, both losses and causes included."""
    days, rows, columns = ENGINE_DAYS, 16, 32
    random = np.random.default_rng(2)
    shape = (days, rows, columns)
    highest = random.uniform(32, 40, shape) if hot else random.uniform(18, 24, shape)
    day = np.arange(days) + np.datetime64("2021-06-01")
    fields = {
        "tasmax": (highest, "air_temperature", "degC", "time: maximum"),
        "tasmin": (highest - 12.0, "air_temperature", "degC", "time: minimum"),
        "vapour": (random.uniform(1.0, 1.5, shape), "water_vapor_partial_pressure_in_air", "kPa", "time: mean"),
        "rsds": (
            random.uniform(170, 320, shape), "surface_downwelling_shortwave_flux_in_air", "W m-2", "time: mean",
        ),
    }  # fmt: skip
    grid = xr.Dataset(
        {
            name: (
                ("time", "lat", "lon"),
                values,
                {"standard_name": standard_name, "units": unit, "cell_methods": method},
            )
            for name, (values, standard_name, unit, method) in fields.items()
        },
        {
            "time": day.astype("datetime64[ns]"),
            "lat": ("lat", np.linspace(44, 41, rows), {"standard_name": "latitude", "units": "degrees_north"}),
            "lon": ("lon", np.linspace(10, 16.2, columns), {"standard_name": "longitude", "units": "degrees_east"}),
        },
    )
    path = folder / f"{crop}-{'hot' if hot else 'cool'}.nc"
    grid.to_netcdf(path)
    weather = cs.open_weather(str(path)).load()

    def season() -> None:
        cs.assess(weather, crop, sowing="06-01", co2=421).compute(scheduler="synchronous")

    season()
    fastest = min(seconds(season) for _ in range(3))
    cost = fastest / (days * rows * columns) * 1e6
    print(f"{crop}, {'every' if hot else 'no'} day above the onset: {cost:5.1f} us a cell, day and crop")


if __name__ == "__main__":
    for crop in ("soybean", "maize"):
        for mild in (True, False):
            compare(crop, mild)
    with tempfile.TemporaryDirectory() as temporary:
        for crop in ("soybean", "maize"):
            for hot in (False, True):
                whole_engine(crop, hot, Path(temporary))
