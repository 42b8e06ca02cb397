"""From a run file to finished results: everything the commands `run`, `check` and `trace` do."""

from __future__ import annotations

import datetime
import time
from collections.abc import Callable
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

import numpy as np
import xarray as xr

from cropstress.crops.profile_files import is_profile_path
from cropstress.errors import Fault, InputError, fail, nearest
from cropstress.places import Districts, read_area, read_districts, read_sowing
from cropstress.region import Entry, Options, TimeAxis, compute_results, make_entry, make_plan, time_axis
from cropstress.report.classes import known_measure
from cropstress.report.folder import check_folder, claim_folder
from cropstress.report.record import file_record
from cropstress.report.summary import summarise, summary_text
from cropstress.report.writer import write_report
from cropstress.runfile import RunFile, load_runfile
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


def prepare(path: str | Path, only: str | None = None) -> Job:
    """Read a run file, open its grids and lay its crops on them.

    Parameters
    ----------
    path : path
        The run file.
    only : str, optional
        Name of the one crop entry to take.

    Raises
    ------
    InputError
        With all faults of the run file, the profiles, the grids and the places.
    """
    run_file = load_runfile(path)
    entries = list(run_file.crops)
    if only is not None:
        entries = [entry for entry in entries if entry.name == only]
        if not entries:
            names = [entry.name for entry in run_file.crops]
            near = nearest(only, names)
            raise fail(
                f"there is no crop entry '{only}'", str(path),
                f"Did you mean '{near}'?" if near else f"The entries are {', '.join(names)}.",
            )  # fmt: skip
    faults: list[Fault] = []
    for measure in run_file.maps.measures:
        _collect(faults, known_measure, measure)
    profiles = _collect(faults, run_file.profiles) or {}
    weather = _collect(
        faults, read_weather, run_file.weather.files, run_file.weather.variable_specs(), run_file.base,
        run_file.places.elevation_spec(),
    )  # fmt: skip
    if weather is None:
        raise InputError(faults)
    dataset = _through(weather.dataset, run_file, faults)
    axis = time_axis(dataset)
    remarks = list(weather.remarks)
    districts = _districts(run_file, dataset, faults, remarks)
    options = Options(
        run_file.model.canopy, run_file.model.acclimation, run_file.model.least_potential,
        run_file.seasons.allowed_missing,
    )  # fmt: skip
    job = Job(run_file, weather, dataset, axis, [], options, districts, {}, {}, remarks)
    for entry in entries:
        sowing = _collect(faults, read_sowing, entry.sowing_spec(), dataset, districts, run_file.base)
        spec = entry.area_spec()
        area = _collect(faults, read_area, spec, dataset, run_file.base) if spec is not None else None
        if area is not None:
            job.areas[entry.name] = area
        if sowing is None or entry.name not in profiles:
            continue
        job.sowing_words[entry.name] = sowing.words
        remarks += [f"{entry.name}: {remark}" for remark in sowing.remarks]
        profile = profiles[entry.name]
        made, found = make_entry(
            entry.name, entry.label or profile.label, profile, sowing.dates, axis, run_file.seasons.years,
            area=area, co2=run_file.co2, stages=entry.stages, options=options,
        )  # fmt: skip
        faults += found
        if made is not None:
            job.entries.append(made)
            remarks += made.remarks
    if faults:
        raise InputError(faults)
    return job


def _collect(faults: list[Fault], call: Callable[..., Any], *arguments: Any) -> Any:
    """Call, and keep the faults of an InputError with those already found; None then."""
    try:
        return call(*arguments)
    except InputError as error:
        faults += error.faults
        return None


def _through(dataset: xr.Dataset, run_file: RunFile, faults: list[Fault]) -> xr.Dataset:
    through = run_file.seasons.through
    if through is None:
        return dataset
    axis = time_axis(dataset)
    last = axis.number_of(through)
    if last < 0:
        faults.append(
            Fault(
                f"{through} lies before the first day of the data, {axis.iso(0)}", "[seasons] through",
                "Give a date within the data, or leave it out.",
            )  # fmt: skip
        )
        return dataset
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
        With all faults of the run file, the profiles, the grids, the places and the output folder.
    """
    started = datetime.datetime.now(datetime.UTC)
    clock = time.monotonic()
    job = prepare(path, only)
    run_file = job.run_file
    folder = Path(out) if out is not None else run_file.output_folder
    resolved = run_file.resolved()
    claim_folder(folder, run_file.title, resolved)
    say = progress or (lambda _what, _share: None)
    results, computed = compute_results(
        job.dataset, job.entries, job.options, job.attributes(), threads=threads or run_file.compute.threads,
        progress=lambda share: say("computing", share),
    )  # fmt: skip
    remarks = job.remarks + mend_words(computed.counts)
    record = {
        "run_file": resolved,
        "inputs": [file_record(file) for file in input_files(job)],
        "counts": computed.counts,
        "remarks": remarks,
        "seconds": round(time.monotonic() - clock, 1),
        "started": started.isoformat(timespec="seconds"),
    }
    drawn = 0
    expected = len(results) * (4 + 2 * len(run_file.seasons.years) * (4 + len(run_file.maps.measures)))

    def written(_name: str) -> None:
        nonlocal drawn
        drawn += 1
        say("writing", min(drawn / expected, 1.0))

    report = write_report(
        results, folder, title=run_file.title, measures=run_file.maps.measures, areas=job.areas,
        history=f"{started.date().isoformat()} cropstress run {Path(path).name}", record=record,
        progress=written,
    )  # fmt: skip
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


def check(path: str | Path) -> list[str]:
    """Say what a run file would compute, without computing it.

    Returns
    -------
    list of str
        Lines for the screen.

    Raises
    ------
    InputError
        With everything that is wrong.
    """
    job = prepare(path)
    check_folder(job.run_file.output_folder, job.run_file.title)
    lines = [job.run_file.title, "", "Found"]
    for variable in job.weather.found:
        low, high = variable.sample_range
        lines.append(
            f"  {variable.canonical}: {variable.name} in {', '.join(variable.files)} ({variable.reason}); "
            f"unit {variable.unit}, {variable.conversion}; {low:.4g} to {high:.4g} on the days looked at"
        )
    rows, columns = job.dataset["tmax"].shape[1:]
    lines += [
        f"  {rows} x {columns} cells, {job.axis.length} days from {job.axis.iso(0)} to "
        f"{job.axis.iso(job.axis.length - 1)} ({job.axis.calendar} calendar)",
        "",
        "To be computed",
    ]
    for entry in job.entries:
        lines += _entry_lines(job, entry)
    plan = make_plan(job.dataset)
    threads = job.run_file.compute.threads
    lines += [
        "",
        f"The map is cut into {len(plan.tiles)} tiles and {len(plan.blocks)} blocks of days; "
        + ("all cores work." if threads is None else f"{threads} threads work."),
        f"Results go to {job.run_file.resolved()['output']['folder']}.",
    ]
    if job.weather.not_computed:
        lines += ["", "Not computed", *(f"  {reason}" for reason in job.weather.not_computed)]
    if job.remarks:
        lines += ["", "Remarks", *(f"  {remark}" for remark in job.remarks)]
    lines += ["", "All settings", *_setting_lines(job.run_file.resolved())]
    return lines


def _entry_lines(job: Job, entry: Entry) -> list[str]:
    crop = entry.profile
    computed = int((entry.grown & (entry.sowing >= 0).any(axis=0)).sum())
    lines = [
        f"  {entry.name} ({entry.label}, {crop.pathway}): {computed} cells; {job.sowing_words[entry.name]}",
        f"    heat onset {crop.number('heat_onset'):g} degC (air, momentary), "
        f"hot day above {crop.number('hot_day_limit'):g} degC, "
        + (
            f"at flowering above {crop.number('flowering_limit'):g} degC"
            if crop.flowering_window is not None
            else "no flowering window"
        ),
    ]
    for season, year in enumerate(entry.years):
        sown = entry.sowing[season][(entry.sowing[season] >= 0) & entry.grown]
        if not sown.size:
            lines.append(f"    season {year}: sown in no cell where the crop is grown")
            continue
        first, last = int(sown.min()), int(sown.max())
        end = last + sum(crop.days) - 1
        if entry.stages == "thermal_time":
            until = "until its thermal time is reached"
        elif end < job.axis.length:
            until = f"until {job.axis.iso(end)} at the latest"
        else:
            until = f"cut short by the end of the data on {job.axis.iso(job.axis.length - 1)}"
        between = job.axis.iso(first) if first == last else f"{job.axis.iso(first)} to {job.axis.iso(last)}"
        lines.append(f"    season {year}: sown {between}, {until}; CO2 {entry.co2[season]:g} umol/mol")
    lines.append("    soil water is assumed plentiful")
    return lines


def _setting_lines(resolved: dict[str, Any], prefix: str = "") -> list[str]:
    lines = []
    for key, value in resolved.items():
        if isinstance(value, dict) and value:
            lines += _setting_lines(value, f"{prefix}{key}.")
        elif isinstance(value, list) and value and isinstance(value[0], dict):
            for number, part in enumerate(value, 1):
                lines += _setting_lines(part, f"{prefix}{key}[{number}].")
        else:
            shown = "not set" if value is None else str(value).lower() if isinstance(value, bool) else value
            lines.append(f"  {prefix}{key} = {shown}")
    return lines
