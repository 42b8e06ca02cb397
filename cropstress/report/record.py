"""The record of a run: what was run, on what, with which versions; it names no machine and no person."""

from __future__ import annotations

import getpass
import hashlib
import json
import platform
import re
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import asdict, dataclass
from importlib.metadata import PackageNotFoundError, version
from pathlib import Path, PurePosixPath, PureWindowsPath
from typing import Any

import numpy as np

from cropstress.report.version import package_version
from cropstress.report.writing import written_aside

FILE_NAME = "run.json"

#: Packages whose version can change a number or a file.
PACKAGES = (
    "numpy",
    "numba",
    "xarray",
    "dask",
    "netCDF4",
    "rioxarray",
    "rasterio",
    "pyproj",
    "geopandas",
    "matplotlib",
)

_ABSOLUTE = re.compile(r"(?<![\w.:/\\])(?:~?/|[A-Za-z]:[\\/]|\\\\)[^\s\"'<>|,;()\[\]]*[^\s\"'<>|,;()\[\].:]")


_QUOTED = re.compile(r"""(["'])((?:~?/|[A-Za-z]:[\\/]|\\\\)[^"']+)\1""")


@dataclass(frozen=True)
class FileRecord:
    """A file by its name, size [byte] and SHA-256 hash; never by its folder."""

    name: str
    size: int
    sha256: str


def file_record(path: Path | str, name: str | None = None) -> FileRecord:
    """Return the record of a file.

    Parameters
    ----------
    path : path
    name : str, optional
        How it is called in the record; its own name by default.
    """
    path = Path(path)
    with path.open("rb") as file:
        digest = hashlib.file_digest(file, "sha256").hexdigest()
    return FileRecord(name or path.name, path.stat().st_size, digest)


def versions() -> dict[str, str]:
    """Return the versions of this package, of Python and of what it computes with."""
    found = {"cropstress": package_version(), "python": platform.python_version()}
    for package in PACKAGES:
        try:
            found[package] = version(package)
        except PackageNotFoundError:
            found[package] = "not installed"
    return found


def write_run_record(
    path: Path | str,
    *,
    title: str,
    run_file: Mapping[str, Any],
    inputs: Sequence[FileRecord] = (),
    counts: Mapping[str, Any] | None = None,
    remarks: Sequence[str] = (),
    seconds: float | None = None,
    started: str = "",
    outputs: Sequence[FileRecord] = (),
    finished: bool = True,
) -> None:
    """Write the record of a run as JSON.

    Absolute paths are cut to the last name and names of the user's folders are left out, wherever they
    stand.

    Parameters
    ----------
    path : path
        Its final name.
    title : str
        Title of the run, which the output folder belongs to.
    run_file : mapping
        The run file as resolved, defaults included.
    inputs : sequence of FileRecord
    counts : mapping
        What was mended, skipped or left blank, by crop or by file.
    remarks : sequence of str
        What was told on screen.
    seconds : float, optional
        Time taken [s].
    started : str
        When the run started, ISO 8601.
    outputs : sequence of FileRecord
        The files written, named by their path within the output folder.
    finished : bool
        False while the run is under way.

    Raises
    ------
    InputError
        When the file cannot be written.
    """
    record = {
        "title": title,
        "finished": finished,
        "started": started,
        "seconds": seconds,
        "versions": versions(),
        "run_file": run_file,
        "inputs": [asdict(entry) for entry in inputs],
        "counts": counts or {},
        "remarks": list(remarks),
        "outputs": [asdict(entry) for entry in outputs],
    }
    text = json.dumps(without_places(record), indent=2, ensure_ascii=False, allow_nan=False)
    with written_aside(path) as aside:
        aside.write_text(text + "\n", encoding="utf-8")


def without_places(value: Any) -> Any:
    """Return a value as JSON can hold it, with no absolute path and no user name in it.

    Parameters
    ----------
    value : object
        Dictionaries, lists, texts, numbers, paths, arrays and dates, nested at will.

    Examples
    --------
    >>> without_places({"files": ["/home/someone/grids/tmax_*.nc", "grids/tmin.nc"]})
    {'files': ['tmax_*.nc', 'grids/tmin.nc']}
    """
    if isinstance(value, Mapping):
        return {_cleaned(str(key)): without_places(part) for key, part in value.items()}
    if isinstance(value, str | Path):
        return _cleaned(str(value))
    if isinstance(value, np.ndarray):
        return without_places(value.tolist())
    if isinstance(value, Iterable):
        return [without_places(part) for part in value]
    if isinstance(value, np.generic):
        value = value.item()
    if isinstance(value, float) and not np.isfinite(value):
        return None
    if value is None or isinstance(value, bool | int | float):
        return value
    return _cleaned(str(value))


def _cleaned(text: str) -> str:
    if PurePosixPath(text).is_absolute() or PureWindowsPath(text).is_absolute() or text.startswith("~"):
        # As a fault is printed: the place, then what is wrong there
        path, colon, rest = text.partition(": ")
        return _last_name(path) + colon + (_cleaned(rest) if colon else "")
    text = _QUOTED.sub(lambda found: found.group(1) + _last_name(found.group(2)) + found.group(1), text)
    text = _ABSOLUTE.sub(lambda found: _last_name(found.group()), text)
    return _without_user(text)


def _last_name(path: str) -> str:
    return re.split(r"[\\/]", path.rstrip("\\/"))[-1]


def _without_user(text: str) -> str:
    """Leave out the user's name where it is a folder of a relative path."""
    parts = re.split(r"([\\/])", text)
    names = {name for name in (_user_name(), Path.home().name) if name}
    if len(parts) == 1 or not names.intersection(parts):
        return text
    last = max(position for position, part in enumerate(parts) if part in names)
    return "".join(parts[last + 2 :])


def _user_name() -> str:
    try:
        return getpass.getuser()
    except (OSError, KeyError, ImportError):
        return ""
