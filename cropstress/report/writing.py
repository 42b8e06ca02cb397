"""Files are written aside and renamed when whole, so nothing half-written carries a final name."""

from __future__ import annotations

import errno
import os
import shutil
from collections.abc import Iterator
from contextlib import contextmanager, suppress
from pathlib import Path

from cropstress.errors import InputError, fail

#: Below this a failed write is put down to a full disk [byte]: libraries do not pass the reason on.
LITTLE_ROOM = 4 * 1024 * 1024


@contextmanager
def written_aside(path: Path | str) -> Iterator[Path]:
    """Give a name to write to, which becomes `path` when the block ends well.

    Parameters
    ----------
    path : path
        The final name; its folder is made when it is missing.

    Yields
    ------
    pathlib.Path
        A name beside it, of the same suffix.

    Raises
    ------
    InputError
        When there is no permission or no room, or another program holds the final file open.
    """
    path = Path(path)
    aside = path.with_name(f".{path.stem}.unfinished{path.suffix}")
    try:
        path.parent.mkdir(parents=True, exist_ok=True)
        yield aside
        _rename(aside, path)
    except (OSError, RuntimeError) as error:
        raise _explained(error, path) from error
    finally:
        with suppress(OSError):
            aside.unlink(missing_ok=True)


def _rename(aside: Path, path: Path) -> None:
    if path.is_dir():
        raise fail(f"a folder has the name of the file {path.name}", str(path), "Move that folder away.")
    beside = path.with_name(f"{path.stem}.new{path.suffix}")
    try:
        os.replace(aside, path)
    except PermissionError as error:
        if not path.exists():
            raise
        what = f"{path.name} cannot be replaced; it is open in another program or protected"
        with suppress(OSError):
            os.replace(aside, beside)
            what += f"; the new one is whole beside it, as {beside.name}"
        remedy = "Close it there (a map viewer, a spreadsheet) and run the same command again."
        raise fail(what, str(path), remedy) from error
    with suppress(OSError):
        beside.unlink(missing_ok=True)  # of an earlier run that met the file open


def _explained(error: OSError | RuntimeError, path: Path) -> InputError:
    where, number = str(path), getattr(error, "errno", None)
    folder = path.parent
    if number in (errno.ENOSPC, errno.EDQUOT) or little_room(folder):
        return fail(
            f"no room left on the disk for {path.name}",
            where,
            "Free some space, or write to another folder with --out.",
        )
    if isinstance(error, PermissionError) or number in (errno.EROFS, errno.EACCES, errno.EPERM):
        return fail(
            f"no permission to write {path.name}", where, "Choose a folder you may write to with --out."
        )
    if isinstance(error, FileExistsError | NotADirectoryError):
        return fail(
            f"the folder {folder.name} cannot be made, for a file has its name or one above it",
            where,
            "Move that file away, or write to another folder with --out.",
        )
    return fail(
        f"{path.name} could not be written ({error})",
        where,
        "Check the disk and the folder, or write to another folder with --out.",
    )


def little_room(folder: Path) -> bool:
    """Tell whether the disk of a folder is as good as full."""
    try:
        return shutil.disk_usage(folder).free < LITTLE_ROOM
    except OSError:
        return False
