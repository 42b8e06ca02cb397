"""Files: from names and patterns to lazily opened NetCDF datasets, and what is wrong with them."""

from __future__ import annotations

import glob
import os
import warnings
from collections.abc import Hashable, Iterable
from dataclasses import dataclass
from pathlib import Path

import xarray as xr

from cropstress.errors import Fault, nearest

Names = str | os.PathLike[str] | Iterable[str | os.PathLike[str]]

# First bytes of files; the formats' own specifications (common knowledge).
_NETCDF = (b"CDF\x01", b"CDF\x02", b"CDF\x05", b"\x89HDF")
_OTHER_FORMATS = {
    b"PK\x03\x04": ("a ZIP archive", "Unpack it and name the NetCDF files inside."),
    b"\x1f\x8b": ("compressed with gzip", "Unpack it first."),
    b"GRIB": ("a GRIB file", "Convert it to NetCDF."),
    b"II*\x00": ("a TIFF image", "Convert it to NetCDF."),
    b"MM\x00*": ("a TIFF image", "Convert it to NetCDF."),
    b"<": ("a web page or XML text, perhaps the error page of a download", "Download it again."),
}
#: Files without chunks (NetCDF-3, contiguous NetCDF-4) are read in pieces of at most this size [byte], since
#: a piece is always read whole; chosen here, some days of a large grid.
UNCHUNKED_BYTES = 32 * 2**20
#: Notes of xarray about other people's files that change nothing that is read here.
_HARMLESS = ("Variable\\(s\\) referenced in", ".*has multiple fill values")


@dataclass(frozen=True)
class OpenFile:
    """A NetCDF file, opened.

    Attributes
    ----------
    path : Path
        Where it is.
    label : str
        How messages and results name it; never an absolute path.
    dataset : xarray.Dataset
        Lazy, on the file's own chunks where it has any; scaled and masked, times not decoded.
    """

    path: Path
    label: str
    dataset: xr.Dataset


def find_files(names: Names, base: Path | None = None) -> tuple[list[Path], list[Fault]]:
    """Find the files that names and patterns stand for.

    Parameters
    ----------
    names : str, path or iterable of them
        File names or patterns with `*`, `?`, `[...]`, `**`.
    base : Path, optional
        The folder relative names start from; the current one by default.

    Returns
    -------
    list of Path
        Each file once, those of a pattern sorted by name.
    list of Fault
        Missing files, patterns that fit nothing, folders.
    """
    given = [names] if isinstance(names, str | os.PathLike) else list(names)
    base = Path.cwd() if base is None else Path(base)
    found: dict[Path, None] = {}
    faults: list[Fault] = []
    if not given:
        faults.append(
            Fault("no files are given", "weather.files", "Name at least one NetCDF file or a pattern.")
        )
    for name in given:
        path = base / name
        if path.is_dir():
            remedy = f'Name the files in it, for example "{Path(name).as_posix()}/*.nc".'
            faults.append(Fault("this is a folder, not a file", str(name), remedy))
        elif path.exists():
            found[path] = None
        elif glob.has_magic(str(name)):
            # Only what is a pattern in the name: the folder before it may hold brackets of its own.
            fitting = sorted(glob.glob(os.fspath(name), root_dir=base, recursive=True))
            files = [base / each for each in fitting if (base / each).is_file()]
            found |= dict.fromkeys(files)
            if not files:
                remedy = f"Check the pattern; {_inside(path.parent)}."
                faults.append(Fault("no file fits this pattern", str(name), remedy))
        else:
            faults.append(_missing(path, str(name)))
    return list(found), faults


def open_files(paths: Iterable[Path], base: Path | None = None) -> tuple[list[OpenFile], list[Fault]]:
    """Open files lazily.

    Parameters
    ----------
    paths : iterable of Path
        The files.
    base : Path, optional
        The folder their labels are relative to.

    Returns
    -------
    list of OpenFile
    list of Fault
        Files that may not be read, are not NetCDF, or are damaged.
    """
    opened: list[OpenFile] = []
    faults: list[Fault] = []
    for path in paths:
        label = label_of(path, base)
        fault = _unreadable(path, label)
        if fault is not None:
            faults.append(fault)
            continue
        try:
            opened.append(OpenFile(path, label, _open(path)))
        except (OSError, RuntimeError, ValueError, KeyError) as error:
            reason = str(error).replace(str(path), label)
            remedy = "It is damaged or was cut short: copy or download it again."
            faults.append(Fault(f"the file cannot be opened as NetCDF ({reason})", label, remedy))
    return opened, faults


def label_of(path: Path, base: Path | None) -> str:
    """Return how a file is named in messages and results: relative to the base, or by its last name."""
    base = Path.cwd() if base is None else Path(base)
    try:
        return path.relative_to(base).as_posix()
    except ValueError:
        return path.name


def _open(path: Path) -> xr.Dataset:
    """Open a file on its own chunks; large variables that have none are cut along their first dimension."""
    dataset = _lazy(path, {})
    largest = max(dataset.variables.values(), key=lambda variable: variable.nbytes, default=None)
    has_chunks = any(variable.encoding.get("chunksizes") for variable in dataset.variables.values())
    if largest is None or has_chunks or largest.nbytes <= UNCHUNKED_BYTES or largest.shape[0] < 2:
        return dataset
    dataset.close()
    slices = max(1, UNCHUNKED_BYTES * largest.shape[0] // largest.nbytes)
    return _lazy(path, {largest.dims[0]: slices})


def _lazy(path: Path, chunks: dict[Hashable, int]) -> xr.Dataset:
    with warnings.catch_warnings():
        for text in _HARMLESS:
            warnings.filterwarnings("ignore", message=text)
        return xr.open_dataset(
            path,
            engine="netcdf4",
            chunks=chunks,
            decode_coords="all",
            decode_times=False,
            decode_timedelta=False,
        )


def _missing(path: Path, name: str) -> Fault:
    remedy = f"Check the name; {_inside(path.parent)}."
    if path.parent.is_dir():
        alike = nearest(path.name, (each.name for each in path.parent.iterdir()))
        if alike:
            remedy = f"Did you mean '{alike}'?"
    return Fault("there is no such file", name, remedy)


def _inside(folder: Path) -> str:
    if not folder.is_dir():
        return f"there is no folder '{folder.name}' either"
    count = sum(1 for each in folder.iterdir() if each.suffix.lower() in (".nc", ".nc4"))
    return f"the folder '{folder.name}' holds {count} files that end in .nc"


def _unreadable(path: Path, label: str) -> Fault | None:
    """Return what keeps a file from being read as NetCDF, judged by its first bytes."""
    try:
        with path.open("rb") as file:
            start = file.read(8)
    except PermissionError:
        return Fault(
            "you have no permission to read this file", label, "Ask its owner, or copy one you may read."
        )
    except OSError as error:
        return Fault(
            f"the file cannot be read ({error.strerror})", label, "Check the disk or the connection."
        )
    if start.startswith(_NETCDF):
        return None
    if not start:
        return Fault("the file is empty", label, "Copy or download it again.")
    for sign, (words, remedy) in _OTHER_FORMATS.items():
        if start.startswith(sign):
            return Fault(f"this is not a NetCDF file but {words}", label, remedy)
    return Fault("this is not a NetCDF file", label, "Take it out of `files`, or convert it to NetCDF.")
