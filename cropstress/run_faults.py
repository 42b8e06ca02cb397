"""What is wrong with a run, in one list with one way of naming places, and what is kept when it stops on the way."""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Sequence
from contextlib import contextmanager
from dataclasses import replace
from pathlib import Path

import xarray as xr

from cropstress.errors import Fault, InputError, count_of
from cropstress.places import grid_file_faults, read_district_codes, sowing_faults
from cropstress.report.netcdf import write_netcdf
from cropstress.report.record import FileRecord, file_record
from cropstress.runfile import RunFile
from cropstress.weather import READING, Weather, damage_in_files
from cropstress.weather.open import label_of


def in_run_file(fault: Fault, run_file: RunFile, crop: str = "") -> Fault:
    """Return a fault with the run file's name before a place that is a key of it.

    Examples of such places: "weather.variables.tmax", "crop maize", "[maps] measures", and "sowing", which is that of
    a crop entry.
    """
    where = fault.where.replace("[maps] measures", "maps.measures")
    if where == "sowing" and crop:
        where = f"crop {crop}: sowing"
    if where.startswith(("weather.", "seasons.", "maps.", "crop ")):
        where = f"{run_file.path.name}: {where}"
    return replace(fault, where=where)


def places_faults(run_file: RunFile) -> list[Fault]:
    """Return what is wrong with the places by themselves, where there is no weather grid to lay them on."""
    places, codes = run_file.places, None
    faults: list[Fault] = []
    if places.districts is not None:
        try:
            codes = read_district_codes(
                places.districts, places.layer, places.id_field, places.name_field, run_file.base
            )
        except InputError as error:
            faults += error.faults
    for entry in run_file.crops:
        faults += [
            in_run_file(each, run_file, entry.name) for each in sowing_faults(entry.sowing_spec(), run_file.base, codes)
        ]
        area = entry.area_spec()
        if area is not None:
            faults += grid_file_faults(area if isinstance(area, str) else area["file"], run_file.base)
    return faults


@contextmanager
def weather_told(weather: Weather, base: Path) -> Iterator[None]:
    """Tell what goes wrong with the weather while it is computed from: damaged files, and faults in many cells.

    Raises
    ------
    InputError
        With the files and variables at fault.
    """
    try:
        yield
    except InputError as error:
        raise InputError(_with_files(fault, weather) for fault in error.faults) from error
    except READING as error:
        faults = damage_in_files(weather.paths, base, {each.name for each in weather.found})
        if not faults:
            raise
        raise InputError(faults) from error


def _with_files(fault: Fault, weather: Weather) -> Fault:
    """Name the files and variables instead of the quantities, as in "weather: tmax, tmin"."""
    kind, _, names = fault.where.partition(": ")
    found = [each for each in weather.found if each.canonical in names.split(", ")]
    if kind != "weather" or not found:
        return fault
    files: dict[str, list[str]] = {}
    for each in found:
        more = f" and {count_of(len(each.files) - 1, 'more file')}" if len(each.files) > 1 else ""
        files.setdefault(f"{each.files[0]}{more}", []).append(each.name)
    return replace(fault, where="; ".join(f"{label}: {', '.join(held)}" for label, held in files.items()))


def input_records(paths: Iterable[Path], base: Path) -> list[FileRecord]:
    """Return names, sizes and hashes of the files that are read; taken before anything is computed.

    Raises
    ------
    InputError
        When a file has gone or cannot be read.
    """
    records, faults = [], []
    for path in paths:
        try:
            records.append(file_record(path))
        except OSError as error:
            what = f"the file can no longer be read ({error.strerror or type(error).__name__})"
            faults.append(Fault(what, label_of(path, base), "Check the disk or the connection."))
    if faults:
        raise InputError(faults)
    return records


def with_what_is_kept(
    error: InputError, results: Sequence[xr.Dataset], folder: Path, written: Sequence[str], history: str
) -> InputError:
    """Save what was computed when writing stopped on the way, and tell what is whole.

    The grid files hold every measure, so those not yet written are tried, each by itself.

    Parameters
    ----------
    error : InputError
        Why writing stopped.
    results : sequence of xarray.Dataset
        What was computed.
    folder : path
        The output folder.
    written : sequence of str
        Names of the files that are finished.
    history : str
        As for `write_netcdf`.

    Returns
    -------
    InputError
        The same faults, those of the grids that could not be saved either, and what is kept.
    """
    faults, kept, lost = list(error.faults), list(written), []
    failed = {Path(fault.where).name for fault in faults}
    for result in results:
        name = f"{result.attrs['crop']}-{result.attrs.get('scenario') or 'observed'}.nc"
        if name in kept:
            continue
        if name in failed:
            lost.append(name)
            continue
        try:
            write_netcdf(result, folder / "grids" / name, history)
            kept.append(name)
        except InputError as further:
            faults += further.faults
            lost.append(name)
    return InputError(faults, _kept_words(kept, lost))


def _kept_words(kept: Sequence[str], lost: Sequence[str]) -> str:
    grids = [name for name in kept if name.endswith(".nc")]
    if not kept:
        return "Nothing could be kept of this run; run the same command again."
    others = count_of(len(kept) - len(grids), "table or map", "tables and maps")
    words = f"Kept, each file whole: {', '.join(f'grids/{name}' for name in grids) or 'no grid'}; {others}."
    if lost:
        words += f" Not kept: {', '.join(f'grids/{name}' for name in lost)}."
    else:
        words += " The grids hold all that was computed."
    return f"{words} Run the same command again to make the rest."
