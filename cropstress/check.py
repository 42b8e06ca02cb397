"""What a run file would compute, in words: the command `check`."""

from __future__ import annotations

from pathlib import Path
from typing import Any

from cropstress.errors import count_of
from cropstress.job import Job, prepare
from cropstress.region import Entry, make_plan


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
    job = prepare(path, writes=True)
    lines = [job.run_file.title, "", "Found"]
    for variable in job.weather.found:
        low, high = variable.sample_range
        looked_at = "" if variable.canonical == "elevation" else " on the days looked at"
        lines.append(
            f"  {variable.canonical}: {variable.name} in {', '.join(variable.files)} ({variable.reason}); "
            f"unit {variable.conversion}; {low:.4g} to {high:.4g}{looked_at}"
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
        f"The map is cut into {count_of(len(plan.tiles), 'tile')} and {count_of(len(plan.blocks), 'block')} of days; "
        + ("all cores work." if threads is None else f"{threads} threads work."),
        f"Results go to {job.run_file.resolved()['output']['folder']}, seen from the run file.",
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
        f"  {entry.name} ({entry.label}, {crop.pathway}): {count_of(computed, 'cell')}; {job.sowing_words[entry.name]}",
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
