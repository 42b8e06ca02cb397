"""The canonical dataset: its variables, attributes and CRS."""

from __future__ import annotations

from collections.abc import Iterable
from typing import Any

import rioxarray  # noqa: F401  (adds the accessor that writes the CRS)
import xarray as xr

from cropstress.weather.grids import Grid
from cropstress.weather.open import OpenFile
from cropstress.weather.quantities import QUANTITIES
from cropstress.weather.times import Days, time_coordinate

#: Variables in the order of the dataset.
ORDER = ("tmax", "tmin", "vapour_pressure", "radiation", "wind", "pressure", "rain", "elevation")


def empty_dataset(grid: Grid, days: Days) -> xr.Dataset:
    """Make the canonical dataset of a grid and all days from the first to the last, without variables yet."""
    time = time_coordinate(days.first, days.last, days.calendar)
    frame = xr.Dataset(coords={"time": time, **grid.coordinates})
    return frame.rio.write_crs(grid.crs.to_wkt(), grid_mapping_name="spatial_ref")


def variable(name: str, data: Any, grid: Grid) -> xr.Variable:
    """Make a variable of the canonical dataset, with CF attributes.

    Radiation and rain are sums over the day (MJ m-2, mm), the same numbers as MJ m-2 d-1 and mm d-1.
    """
    quantity = QUANTITIES[name]
    attributes = {
        "standard_name": quantity.standard_names[0],
        "long_name": quantity.meaning,
        "units": quantity.unit,
        "cell_methods": f"time: {quantity.cell_methods[0]}",
    } | _PARTICULAR.get(name, {})
    if not quantity.is_timed:
        del attributes["cell_methods"]
    dimensions = ("time", grid.row, grid.column) if quantity.is_timed else (grid.row, grid.column)
    return xr.Variable(dimensions, data, {**attributes, "grid_mapping": "spatial_ref"})


_PARTICULAR = {
    "radiation": {
        "standard_name": "integral_wrt_time_of_surface_downwelling_shortwave_flux_in_air",
        "units": "MJ m-2",
        "cell_methods": "time: sum",
    },
    "rain": {
        "standard_name": "lwe_thickness_of_precipitation_amount",
        "units": "mm",
        "cell_methods": "time: sum",
    },
    "wind": {"long_name": "wind speed at 2 m above the ground"},
}


def credit(files: Iterable[OpenFile]) -> dict[str, str]:
    """Return whom to credit as the files say it (`credit`, else `institution`), as an attribute."""
    said = [
        str(file.dataset.attrs.get("credit") or file.dataset.attrs.get("institution") or "").strip()
        for file in files
    ]
    words = "; ".join(dict.fromkeys(each for each in said if each))
    return {"credit": words} if words else {}
