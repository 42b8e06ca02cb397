"""From a run file to finished results."""

from __future__ import annotations

import datetime
import time
from collections.abc import Callable
from dataclasses import dataclass, field, replace
from pathlib import Path
from typing import Any

import numpy as np
import xarray as xr

from cropstress.crops import CropProfile
from cropstress.crops.profile_files import is_profile_path
from cropstress.errors import Fault, InputError, nearest
from cropstress.places import Districts, read_area, read_districts, read_sowing, sowing_faults
from cropstress.region import Entry, Options, TimeAxis, compute_results, make_entry, time_axis
from cropstress.report.classes import known_measure
from cropstress.report.folder import check_folder, claim_folder
from cropstress.report.summary import summarise, summary_text
from cropstress.report.writer import write_report
from cropstress.run_faults import in_run_file, input_records, places_faults, weather_told, with_what_is_kept
from cropstress.runfile import CropEntry, RunFile, read_runfile
from cropstress.weather import Weather, mend_words, read_weather
from cropstress.weather.open import find_files


@dataclass
class Job:
    """A run file with its grids opened and its crops laid on them; nothing computed yet."""

    run_file: RunFile
    weather: Weather
    dataset: xr.Dataset
    axis: TimeAxis
    entries: list[Entry]
    options: Options
    districts: Districts | None
    areas: dict[str, np.ndarray]
    sowing_words: dict[str, str]
    remarks: list[str] = field(default_factory=list)

    def attributes(self) -> dict[str, Any]:
        """Return what every result carries of this run."""
        carried: dict[str, Any] = {"title": self.run_file.title}
        credit = self.run_file.weather.credit or self.weather.dataset.attrs.get("credit")
        if credit:
            carried["credit"] = credit
        if self.weather.not_computed:
            carried["not_computed"] = " ".join(self.weather.not_computed)
        return carried


@dataclass(frozen=True)
class Outcome:
    """What a run left: its folder, what to tell on screen, and the results."""

    folder: Path
    summary: str
    remarks: list[str]
    results: list[xr.Dataset]


def prepare(
    path: str | Path, only: str | None = None, out: str | Path | None = None, *, writes: bool = False
) -> Job:
    """Read a run file, open its grids and lay its crops on them.

    Parameters
    ----------
    path : path
        The run file.
    only : str, optional
        Name of the one crop entry to take.
    out : path, optional
        Folder for the results, instead of the run file's.
    writes : bool
        Whether the output folder is looked at, too.

    Raises
    ------
    InputError
        With all faults of the run file, the profiles, the grids, the places and the output folder.
    """
    run_file, faults = read_runfile(path)
    if run_file is None:
        raise InputError(faults)
    entries = _chosen(run_file, only, faults)
    if writes and not any("output" in fault.where for fault in faults):
        _collect(faults, check_folder, out or run_file.output_folder, run_file.title)
    for measure in run_file.maps.measures:
        _collect(faults, known_measure, measure)
    profiles = _collect(faults, run_file.profiles) or {}
    weather = _collect(
        faults, read_weather, run_file.weather.files, run_file.weather.variable_specs(), run_file.base,
        run_file.places.elevation_spec(),
    )  # fmt: skip
    if weather is None:
        raise InputError(in_run_file(fault, run_file) for fault in [*faults, *places_faults(run_file)])
    remarks = list(weather.remarks)
    dataset = _through(weather.dataset, run_file, faults, remarks)
    axis = time_axis(dataset)
    districts = _districts(run_file, dataset, faults, remarks)
    options = Options(
        run_file.model.canopy, run_file.model.acclimation, run_file.model.least_potential,
        run_file.seasons.allowed_missing,
    )  # fmt: skip
    job = Job(run_file, weather, dataset, axis, [], options, districts, {}, {}, remarks)
    for entry in entries:
        found: list[Fault] = []
        _lay_entry(job, entry, profiles.get(entry.name), found)
        faults += [in_run_file(fault, run_file, entry.name) for fault in found]
    if faults:
        raise InputError(in_run_file(fault, run_file) for fault in faults)
    return job


def _chosen(run_file: RunFile, only: str | None, faults: list[Fault]) -> list[CropEntry]:
    """Return the crop entries to take."""
    if only is None:
        return list(run_file.crops)
    entries = [entry for entry in run_file.crops if entry.name == only]
    if not entries:
        names = [entry.name for entry in run_file.crops]
        near = nearest(only, names)
        remedy = f"Did you mean '{near}'?" if near else f"The entries are {', '.join(names) or 'none'}."
        raise InputError([*faults, Fault(f"there is no crop entry '{only}'", run_file.path.name, remedy)])
    return entries


def _lay_entry(job: Job, entry: CropEntry, profile: CropProfile | None, faults: list[Fault]) -> None:
    """Lay a crop entry on the grid and add it to the job, or note its faults."""
    run_file, dataset = job.run_file, job.dataset
    spec = entry.sowing_spec()
    if not isinstance(spec, str) and "table" in spec and job.districts is None:
        faults += sowing_faults(spec, run_file.base)  # that there are no districts is told already
        sowing = None
    else:
        sowing = _collect(faults, read_sowing, spec, dataset, job.districts, run_file.base)
    where = entry.area_spec()
    area = _collect(faults, read_area, where, dataset, run_file.base) if where is not None else None
    if area is not None:
        job.areas[entry.name] = area
    if sowing is None or profile is None:
        return
    job.sowing_words[entry.name] = sowing.words
    job.remarks += [f"{entry.name}: {remark}" for remark in sowing.remarks]
    made, found = make_entry(
        entry.name, entry.label or profile.label, profile, sowing.dates, job.axis, run_file.seasons.years,
        area=area, co2=run_file.co2, stages=entry.stages, options=job.options,
    )  # fmt: skip
    faults += [replace(fault, what=f"{fault.what} ({sowing.words})") for fault in found]
    if made is None:
        return
    job.entries.append(made)
    job.remarks += made.remarks
    if not (made.grown & (made.sowing >= 0).any(axis=0)).any():
        job.remarks.append(f"{entry.name}: no cell is computed, for where it is sown its crop area is zero")


def _collect(faults: list[Fault], call: Callable[..., Any], *arguments: Any) -> Any:
    """Call, and keep the faults of an InputError with those already found; None then."""
    try:
        return call(*arguments)
    except InputError as error:
        faults += error.faults
        return None


def _through(dataset: xr.Dataset, run_file: RunFile, faults: list[Fault], remarks: list[str]) -> xr.Dataset:
    through = run_file.seasons.through
    if through is None:
        return dataset
    axis = time_axis(dataset)
    remedy = "Give a date within the data, or leave it out."
    try:
        last = axis.number_of(through)
    except ValueError:
        faults.append(Fault(f"there is no day {through} in the calendar of the data", "seasons.through", remedy))
        return dataset
    if last < 0:
        what = f"{through} lies before the first day of the data, {axis.iso(0)}"
        faults.append(Fault(what, "seasons.through", remedy))
        return dataset
    if last >= axis.length:
        remarks.append(f"seasons.through, {through}, lies after the last day of the data, {axis.iso(axis.length - 1)}")
    return dataset.isel(time=slice(0, last + 1))


def _districts(
    run_file: RunFile, dataset: xr.Dataset, faults: list[Fault], remarks: list[str]
) -> Districts | None:
    places = run_file.places
    if places.districts is None:
        return None
    districts = _collect(
        faults, read_districts, places.districts, places.layer, places.id_field, places.name_field, dataset,
        run_file.base,
    )  # fmt: skip
    if districts is not None:
        remarks += districts.remarks
    return districts  # type: ignore[no-any-return]


def run(
    path: str | Path,
    out: str | Path | None = None,
    *,
    threads: int | None = None,
    only: str | None = None,
    progress: Callable[[str, float], None] | None = None,
) -> Outcome:
    """Compute a run file and write its grids, maps, tables and record.

    Parameters
    ----------
    path : path
        The run file.
    out : path, optional
        Folder for the results, instead of the run file's.
    threads : int, optional
        All cores by default; results do not depend on it.
    only : str, optional
        Name of the one crop entry to compute.
    progress : callable, optional
        Called with what is being done and the share that is done.

    Returns
    -------
    Outcome

    Raises
    ------
    InputError
        With all faults of the run file, the profiles, the grids, the places and the output folder; or, when a
        file cannot be written in the end, with what is kept.
    """
    started = datetime.datetime.now(datetime.UTC)
    clock = time.monotonic()
    job = prepare(path, only, out, writes=True)
    run_file = job.run_file
    folder = Path(out) if out is not None else run_file.output_folder
    resolved = run_file.resolved()
    inputs = input_records(input_files(job), run_file.base)
    claim_folder(folder, run_file.title, resolved)
    say = progress or (lambda _what, _share: None)
    with weather_told(job.weather, run_file.base):
        results, computed = compute_results(
            job.dataset, job.entries, job.options, job.attributes(), threads=threads or run_file.compute.threads,
            progress=lambda share: say("computing", share),
        )  # fmt: skip
    remarks = job.remarks + mend_words(computed.counts)
    record = {
        "run_file": resolved,
        "inputs": inputs,
        "counts": computed.counts,
        "remarks": remarks,
        "seconds": round(time.monotonic() - clock, 1),
        "started": started.isoformat(timespec="seconds"),
    }
    drawn: list[str] = []
    expected = len(results) * (4 + 2 * len(run_file.seasons.years) * (4 + len(run_file.maps.measures)))

    def written(name: str) -> None:
        drawn.append(name)
        say("writing", min(len(drawn) / expected, 1.0))

    history = f"{started.date().isoformat()} cropstress run {Path(path).name}"
    try:
        report = write_report(
            results, folder, title=run_file.title, measures=run_file.maps.measures, areas=job.areas, history=history,
            record=record, progress=written,
        )  # fmt: skip
    except InputError as error:
        raise with_what_is_kept(error, results, folder, drawn, history) from error
    return Outcome(folder, summary_text(summarise(results, job.areas)), remarks + report.remarks, results)


def input_files(job: Job) -> list[Path]:
    """Return every file the results depend on, each once: weather, elevation, places, profiles of one's own."""
    run_file = job.run_file
    computed = {entry.name for entry in job.entries}
    named = [run_file.places.districts]
    for entry in run_file.crops:
        if entry.name not in computed:
            continue
        sowing, area = entry.sowing_spec(), entry.area_spec()
        if isinstance(sowing, dict):
            named.append(sowing.get("grid") or sowing.get("table"))
        named.append(area["file"] if isinstance(area, dict) else area)
        named.append(entry.profile if is_profile_path(entry.profile) else None)
    places = [path for name in named if name is not None for path in find_files(name, run_file.base)[0]]
    return list(dict.fromkeys([*job.weather.paths, *places]))
