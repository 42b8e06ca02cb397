"""The output folder: which run it belongs to, and what may be written or removed in it."""

from __future__ import annotations

import json
from collections.abc import Iterable
from pathlib import Path
from typing import Any

from cropstress.errors import fail
from cropstress.report.phrases import phrase
from cropstress.report.record import FILE_NAME, FileRecord, file_record, write_run_record

_OTHER_FOLDER = "Choose an empty folder with --out or with `folder` in [output], or move what is there away."


def claim_folder(folder: Path | str, title: str, run_file: dict[str, Any] | None = None) -> None:
    """Take an output folder for a run, before anything is computed.

    A folder belongs to the run whose title stands in its `run.json`. A new, an empty and an own folder may
    be used; names that start with a dot are not looked at. Running the same title again replaces its files.

    Parameters
    ----------
    folder : path
    title : str
        Title of the run.
    run_file : dict, optional
        The run file as resolved.

    Raises
    ------
    InputError
        When the folder holds another run or anything else, or cannot be written to.
    """
    folder = Path(folder)
    check_folder(folder, title)
    earlier = recorded_outputs(folder)
    write_run_record(
        folder / FILE_NAME, title=title, run_file=run_file or {}, outputs=earlier, finished=False
    )


def check_folder(folder: Path | str, title: str) -> None:
    """Raise InputError when a folder does not belong to a run of this title; writes nothing.

    Parameters
    ----------
    folder : path
    title : str
        Title of the run.
    """
    folder = Path(folder)
    if folder.exists() and not folder.is_dir():
        raise fail(f"{folder.name} is a file, not a folder", str(folder), _OTHER_FOLDER)
    if not folder.exists():
        return
    try:
        found = sorted(entry.name for entry in folder.iterdir() if not entry.name.startswith("."))
    except PermissionError as error:
        raise fail("no permission to look into the output folder", str(folder), _OTHER_FOLDER) from error
    if not found:
        return
    if FILE_NAME not in found:
        raise fail(
            f"the output folder holds something else ({', '.join(found[:3])})", str(folder), _OTHER_FOLDER
        )
    other = _read(folder).get("title")
    if other != title:
        raise fail(
            f'the output folder holds another run, "{other}"; this one is "{title}"',
            str(folder),
            _OTHER_FOLDER,
        )


def recorded_outputs(folder: Path | str) -> list[FileRecord]:
    """Return the files that the last run in this folder wrote, as its record has them."""
    if not (Path(folder) / FILE_NAME).is_file():
        return []
    return [
        FileRecord(str(entry["name"]), int(entry["size"]), str(entry["sha256"]))
        for entry in _read(Path(folder)).get("outputs", [])
    ]


def remove_leftovers(folder: Path | str, earlier: Iterable[FileRecord], written: Iterable[str]) -> list[str]:
    """Remove files of the earlier run that this one no longer makes, unless they were changed by hand.

    Parameters
    ----------
    folder : path
    earlier : iterable of FileRecord
        What the earlier run wrote.
    written : iterable of str
        What this run wrote, by path within the folder.

    Returns
    -------
    list of str
        What was done, in words.
    """
    folder, kept, removed = Path(folder), [], 0
    current = set(written)
    for entry in earlier:
        path = folder / entry.name
        inside = path.resolve().is_relative_to(folder.resolve())
        if entry.name in current or not inside or not path.is_file():
            continue
        if file_record(path, entry.name) == entry:
            path.unlink()
            removed += 1
        else:
            kept.append(phrase("folder.kept", name=entry.name))
    return [*([phrase("folder.replaced", count=removed)] if removed else []), *kept]


def _read(folder: Path) -> dict[str, Any]:
    path = folder / FILE_NAME
    remedy = f"Move it away together with its folder. {_OTHER_FOLDER}"
    try:
        record = json.loads(path.read_text(encoding="utf-8"))
    except (OSError, ValueError) as error:
        raise fail(f"{FILE_NAME} cannot be read ({error})", str(path), remedy) from error
    if not isinstance(record, dict):
        raise fail(f"{FILE_NAME} is not the record of a run", str(path), remedy)
    return record
