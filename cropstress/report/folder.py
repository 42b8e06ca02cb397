"""The output folder: which run it belongs to, and what may be written or removed in it."""

from __future__ import annotations

import json
import os
from collections.abc import Iterable
from pathlib import Path
from typing import Any

from cropstress.errors import fail
from cropstress.report.phrases import phrase
from cropstress.report.record import FILE_NAME, FileRecord, file_record, write_run_record
from cropstress.report.writing import little_room

_OTHER_FOLDER = "Choose an empty folder with --out or with `folder` in [output], or move what is there away."
_MOVE_AWAY = f"Move it away together with its folder. {_OTHER_FOLDER}"


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
    """Raise InputError when a run of this title may not or cannot write to a folder; writes nothing.

    Parameters
    ----------
    folder : path
    title : str
        Title of the run.
    """
    folder = Path(folder)
    try:
        there = _nearest_there(folder)
        found = [] if there != folder else sorted(
            entry.name for entry in folder.iterdir() if not entry.name.startswith(".")
        )  # fmt: skip
    except NotADirectoryError as error:
        raise fail(f"{folder.name} is a file, not a folder", str(folder), _OTHER_FOLDER) from error
    except OSError as error:
        reason = error.strerror or type(error).__name__
        raise fail(f"the output folder cannot be looked into ({reason})", str(folder), _OTHER_FOLDER) from error
    if not there.is_dir():
        what = f"the output folder cannot be made, for {there.name}, which is above it, is a file"
        raise fail(what, str(folder), _OTHER_FOLDER)
    if not os.access(there, os.W_OK | os.X_OK):
        what = "no permission to write to the output folder" + ("" if there == folder else f" or to make it in {there}")
        raise fail(what, str(folder), "Choose a folder you may write to, with --out or with `folder` in [output].")
    if little_room(there):
        remedy = "Free some space, or choose another folder with --out or with `folder` in [output]."
        raise fail("no room is left on the disk of the output folder", str(folder), remedy)
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
    recorded_outputs(folder)


def recorded_outputs(folder: Path | str) -> list[FileRecord]:
    """Return the files that the last run in this folder wrote, as its record has them."""
    if not (Path(folder) / FILE_NAME).is_file():
        return []
    try:
        return [
            FileRecord(str(entry["name"]), int(entry["size"]), str(entry["sha256"]))
            for entry in _read(Path(folder)).get("outputs", [])
        ]
    except (KeyError, TypeError, ValueError) as error:
        raise fail(f"{FILE_NAME} is not the record of a run", str(Path(folder) / FILE_NAME), _MOVE_AWAY) from error


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
        try:
            if file_record(path, entry.name) == entry:
                path.unlink()
                removed += 1
            else:
                kept.append(phrase("folder.kept", name=entry.name))
        except OSError:  # open in another program, or protected
            kept.append(phrase("folder.stuck", name=entry.name))
    return [*([phrase("folder.replaced", count=removed)] if removed else []), *kept]


def _read(folder: Path) -> dict[str, Any]:
    path = folder / FILE_NAME
    try:
        record = json.loads(path.read_text(encoding="utf-8"))
    except (OSError, ValueError) as error:
        raise fail(f"{FILE_NAME} cannot be read ({error})", str(path), _MOVE_AWAY) from error
    if not isinstance(record, dict):
        raise fail(f"{FILE_NAME} is not the record of a run", str(path), _MOVE_AWAY)
    return record


def _nearest_there(folder: Path) -> Path:
    """Return the folder, or the nearest above it that is there; it may be a file."""
    there = folder.absolute()
    while True:
        try:
            there.lstat()
        except (FileNotFoundError, NotADirectoryError):
            there = there.parent
        else:
            return folder if there == folder.absolute() else there
