"""A whole run in a folder of the test's own, and ways to spoil it."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path

import numpy as np
import xarray as xr

AIR, HUMIDITY = "grids/airtemperature_2021.nc", "grids/humidity_2021.nc"
RADIATION, WIND = "grids/radiation_2021.nc", "grids/wind_2021.nc"
ELEVATION, AREA, SOWING = "places/elevation.nc", "places/crop_area.nc", "places/sowing_day.nc"
TABLE, DISTRICTS = "places/sowing_by_district.csv", "places/districts.geojson"


@dataclass(frozen=True)
class Said:
    """What a command left.

    Attributes
    ----------
    code : int
        Exit code.
    out, err : str
        What it printed.
    """

    code: int
    out: str
    err: str


@dataclass(frozen=True)
class Season:
    """A folder with a run file `season.toml`, its `grids` and `places`."""

    folder: Path

    @property
    def run_file(self) -> Path:
        """The run file."""
        return self.folder / "season.toml"

    @property
    def results(self) -> Path:
        """The output folder."""
        return self.folder / "results"

    def rewrite(self, old: str, new: str, file: str = "season.toml") -> None:
        """Replace a text in the run file, or in another text file; it must be there once."""
        path = self.folder / file
        text = path.read_text(encoding="utf-8")
        assert text.count(old) == 1, f"{old!r} is there {text.count(old)} times"
        path.write_text(text.replace(old, new), encoding="utf-8")

    def change(self, file: str, change: Callable[[xr.Dataset], xr.Dataset | None]) -> None:
        """Change a grid file by a function of its dataset, times not decoded."""
        path = self.folder / file
        with xr.open_dataset(path, decode_times=False, decode_coords=False) as dataset:
            loaded = dataset.load()
        changed = change(loaded)
        (loaded if changed is None else changed).to_netcdf(path)

    def final_files(self) -> set[str]:
        """Return every file in the output folder."""
        if not self.results.is_dir():
            return set()
        return {path.relative_to(self.results).as_posix() for path in self.results.rglob("*") if path.is_file()}


def set_values(name: str, change: Callable[[np.ndarray], np.ndarray]) -> Callable[[xr.Dataset], None]:
    """Return a change of a dataset that computes new values of a variable; its attributes stay."""

    def change_dataset(dataset: xr.Dataset) -> None:
        dataset[name] = dataset[name].copy(data=change(dataset[name].values.copy()))

    return change_dataset


def set_attributes(name: str, **attributes: str | None) -> Callable[[xr.Dataset], None]:
    """Return a change of a dataset that sets attributes of a variable, or takes those off that are None."""

    def change_dataset(dataset: xr.Dataset) -> None:
        for key, value in attributes.items():
            dataset[name].attrs.pop(key, None)
            if value is not None:
                dataset[name].attrs[key] = value

    return change_dataset


Stops = Callable[..., str]
Command = Callable[..., Said]
