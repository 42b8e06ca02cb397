"""What the tests of the whole job share: the run file of the thinned grids, and a run that is finished."""

from __future__ import annotations

import os
import subprocess
from collections.abc import Callable
from dataclasses import dataclass, field
from pathlib import Path

import xarray as xr

import cropstress
from cropstress.job import Job, prepare
from cropstress.region import compute_results

ROOT = Path(__file__).resolve().parents[2]
SAMPLE = ROOT / "sample_grids"

#: A user's name that must not turn up in anything a run writes.
USER = "someone-unmistakable"

RUN_FILE = """\
title = "Thinned sample grids"
seasons = { years = 2021, through = 2021-10-10 }
weather = { files = "grids/*_2021.nc", credit = "Invented for tests" }
air.co2 = 416.4
places = { districts = "grids/districts.geojson", id_field = "code", elevation = "grids/elevation.nc" }

[[crops]]
name = "maize"
sowing = { grid = "grids/sowing_day.nc", name = "maize_sowing_day" }
area = { file = "grids/crop_area.nc", name = "maize" }

[[crops]]
name = "wheat"
label = "Wheat of the districts"
sowing = { table = "grids/sowing_by_district.csv" }
area = { file = "grids/crop_area.nc", name = "wheat" }

[[crops]]
name = "potato"
sowing = "15 April"
area = { file = "grids/crop_area.nc", name = "potato" }

[maps]
measures = ["hottest_temperature"]
"""

#: What the run file above says in the order of its crops.
CROPS = ("maize", "wheat", "potato")


@dataclass
class Run:
    """A finished run: its run file, its folder, what the command said, and its unwritten results."""

    run_file: Path
    folder: Path
    crops: tuple[str, ...]
    process: subprocess.CompletedProcess[str]
    _found: dict[str, tuple[Job, xr.Dataset]] = field(default_factory=dict)

    def grid(self, crop: str) -> Path:
        """The NetCDF file of a crop entry."""
        return self.folder / "grids" / f"{crop}-observed.nc"

    def unwritten(self, crop: str) -> xr.Dataset:
        """The float64 result of a crop entry as it is before writing, computed once more in this process."""
        return self._all()[crop][1]

    def job(self) -> Job:
        """The prepared job."""
        return next(iter(self._all().values()))[0]

    def _all(self) -> dict[str, tuple[Job, xr.Dataset]]:
        if not self._found:
            job = prepare(self.run_file)
            results, _ = compute_results(job.dataset, job.entries, job.options, job.attributes(), threads=2)
            self._found |= {str(result.attrs["crop"]): (job, result) for result in results}
        return self._found


def environment(home: Path | None = None) -> dict[str, str]:
    """Variables under which the command finds this package wherever it is started."""
    variables = dict(os.environ)
    package = str(Path(cropstress.__file__).resolve().parents[1])
    variables["PYTHONPATH"] = os.pathsep.join([package, *filter(None, [variables.get("PYTHONPATH")])])
    if home is not None:
        variables |= {"HOME": str(home), "USERPROFILE": str(home), "USER": USER, "LOGNAME": USER, "USERNAME": USER}
    return variables


Command = Callable[..., subprocess.CompletedProcess[str]]
