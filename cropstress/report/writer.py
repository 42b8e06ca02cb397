"""Everything a run leaves behind: grids, maps, tables and the record, laid out in one folder."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np
import xarray as xr

from cropstress.errors import Fault, InputError, fail
from cropstress.report import statistics
from cropstress.report.classes import known_measure
from cropstress.report.figure import map_figure
from cropstress.report.folder import claim_folder, recorded_outputs, remove_leftovers
from cropstress.report.geotiff import georeferenced, write_geotiff
from cropstress.report.netcdf import write_netcdf
from cropstress.report.phrases import phrase
from cropstress.report.record import FILE_NAME, file_record, write_run_record
from cropstress.report.tables import write_season_table, write_stage_table, write_ten_day_table
from cropstress.season.measures import DRAWN


@dataclass(frozen=True)
class Report:
    """What was written.

    Attributes
    ----------
    files : list of pathlib.Path
        Within the output folder, the record last.
    remarks : list of str
        What a reader should know, as a GeoTIFF that could not be made.
    """

    files: list[Path]
    remarks: list[str]


def write_report(
    results: Sequence[xr.Dataset],
    folder: Path | str,
    *,
    title: str,
    measures: Sequence[str] = (),
    areas: Mapping[str, np.ndarray] | None = None,
    notes: Mapping[str, str] | None = None,
    history: str = "",
    record: Mapping[str, Any] | None = None,
    progress: Callable[[str], None] | None = None,
) -> Report:
    """Write the grids, maps, tables and the record of a run.

    Parameters
    ----------
    results : sequence of xarray.Dataset
        Finished results, one for each crop entry and scenario.
    folder : path
        New, empty, or of an earlier run of the same title.
    title : str
        Title of the run.
    measures : sequence of str
        Measures to draw beside the usual four; those that need what the grids did not hold are left out.
    areas : mapping of numpy.ndarray (Y, X), optional
        Crop area of each cell by crop entry, a share or hectares, to weigh means with.
    notes : mapping of str, optional
        Further tags of the GeoTIFF files.
    history : str
        What was run and when, for the NetCDF files; no path of this machine.
    record : mapping, optional
        Keywords of `write_run_record`: run_file, inputs, counts, remarks, seconds, started.
    progress : callable, optional
        Called with the name of each file that is finished.

    Returns
    -------
    Report

    Raises
    ------
    InputError
        When a measure is unknown, two results have one name, the folder holds something else, or a file
        cannot be written.
    """
    folder = Path(folder)
    drawn = _drawn(measures)
    _check_names(results)
    record = dict(record or {})
    claim_folder(folder, title, record.get("run_file"))
    earlier = recorded_outputs(folder)
    files: list[Path] = []
    remarks: list[str] = []

    def finished(path: Path) -> None:
        files.append(path.relative_to(folder))
        if progress is not None:
            progress(path.name)

    for result in results:
        result = statistics.loaded(result)
        area = (areas or {}).get(_crop(result))
        _write_grid_and_tables(result, folder, history, area, finished)
        _draw_maps(result, folder, drawn, notes or {}, finished, remarks)
    remarks += remove_leftovers(folder, earlier, (path.as_posix() for path in files))
    record["remarks"] = [*record.get("remarks", ()), *remarks]
    outputs = [file_record(folder / path, path.as_posix()) for path in files]
    write_run_record(folder / FILE_NAME, title=title, outputs=outputs, **({"run_file": {}} | record))
    return Report([*files, Path(FILE_NAME)], remarks)


def _write_grid_and_tables(
    result: xr.Dataset, folder: Path, history: str, area: np.ndarray | None, finished: Callable[[Path], None]
) -> None:
    grid = folder / "grids" / f"{_stem(result)}.nc"
    write_netcdf(result, grid, history)
    finished(grid)
    tables = {"seasons": write_season_table}
    if "stage" in result.dims:
        tables["stages"] = write_stage_table
    if "ten_days_start" in result.coords:
        tables["ten_days"] = write_ten_day_table
    for name, write in tables.items():
        path = folder / "tables" / f"{_stem(result)}-{name}.csv"
        write(result, path, area)
        finished(path)


def _draw_maps(
    result: xr.Dataset,
    folder: Path,
    drawn: Sequence[str],
    notes: Mapping[str, str],
    finished: Callable[[Path], None],
    remarks: list[str],
) -> None:
    missing = statistics.missing_measures(result, drawn)
    reason = georeferenced(result)
    if reason is not None:
        remarks.append(phrase("folder.no_geotiff", crop=_crop(result), reason=reason))
    for measure in drawn:
        if measure in missing:
            if measure not in DRAWN:
                remarks.append(phrase("folder.not_computed", measure=measure, crop=_crop(result)))
            continue
        for season in result["season"].values:
            stem = f"{_crop(result)}-{season}-{_scenario(result)}-{measure}"
            if reason is None:
                path = folder / "maps" / f"{stem}.tif"
                write_geotiff(result, measure, int(season), path, notes)
                finished(path)
            path = folder / "maps" / f"{stem}.png"
            map_figure(result, measure, int(season), path)
            finished(path)


def _drawn(measures: Sequence[str]) -> list[str]:
    faults: list[Fault] = []
    for name in measures:
        try:
            known_measure(name)
        except InputError as error:
            faults += error.faults
    if faults:
        raise InputError(faults)
    return list(dict.fromkeys((*DRAWN, *measures)))


def _check_names(results: Sequence[xr.Dataset]) -> None:
    # Some disks do not tell capitals from small letters
    stems = [_stem(result).casefold() for result in results]
    for result, stem in zip(results, stems, strict=True):
        if stems.count(stem) > 1:
            raise fail(
                f'two results would be written to one file, "{_stem(result)}.nc"',
                "[[crops]] name",
                "Give each crop entry and scenario a name of its own; capitals do not count.",
            )


def _crop(result: xr.Dataset) -> str:
    return str(result.attrs["crop"])


def _scenario(result: xr.Dataset) -> str:
    return str(result.attrs.get("scenario") or "observed")


def _stem(result: xr.Dataset) -> str:
    return f"{_crop(result)}-{_scenario(result)}"
