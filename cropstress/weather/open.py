"""Files: from names and patterns to lazily opened NetCDF datasets, and what is wrong with them."""

from __future__ import annotations

import glob
import os
import warnings
from collections.abc import Hashable, Iterable
from dataclasses import dataclass
from pathlib import Path

import numpy as np
import xarray as xr

from cropstress.errors import Fault, count_of, nearest

Names = str | os.PathLike[str] | Iterable[str | os.PathLike[str]]

# First bytes of files; the formats' own specifications (common knowledge).
_NETCDF = (b"CDF\x01", b"CDF\x02", b"CDF\x05", b"\x89HDF")
_OTHER_FORMATS = {
    b"PK\x03\x04": ("a ZIP archive", "Unpack it and name the NetCDF files inside."),
    b"\x1f\x8b": ("compressed with gzip", "Unpack it first."),
    b"GRIB": ("a GRIB file", "Convert it to NetCDF."),
    b"II*\x00": ("a TIFF image", "Convert it to NetCDF."),
    b"II+\x00": ("a TIFF image", "Convert it to NetCDF."),
    b"MM\x00*": ("a TIFF image", "Convert it to NetCDF."),
    b"MM\x00+": ("a TIFF image", "Convert it to NetCDF."),
    b"<": ("a web page or XML text, perhaps the error page of a download", "Download it again."),
}
_ZARR = (".zgroup", ".zarray", "zarr.json")  # one of them marks a Zarr store; the format's own specification
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
        try:
            fitting, fault = _fitting(name, base)
        except OSError as error:
            remedy = "Check the name and the permissions of the folders in it."
            faults.append(Fault(f"this file cannot be looked for ({error.strerror})", str(name), remedy))
            continue
        found |= dict.fromkeys(fitting)
        faults += [fault] if fault else []
    return list(found), faults


def find_one_file(name: str | os.PathLike[str], base: Path | None = None) -> tuple[Path | None, list[Fault]]:
    """Find the one file that a name stands for.

    Parameters
    ----------
    name : str or path
        A file name, or a pattern that one file fits.
    base : Path, optional
        The folder a relative name starts from; the current one by default.

    Returns
    -------
    Path or None
    list of Fault
        Missing, a folder, or several that fit.
    """
    paths, faults = find_files(name, base)
    if len(paths) > 1:
        labels = ", ".join(label_of(path, base) for path in paths)
        faults.append(Fault(f"one file is needed here, and {len(paths)} fit: {labels}", str(name), "Name one of them."))
    return (None if faults else paths[0]), faults


def _fitting(name: str | os.PathLike[str], base: Path) -> tuple[list[Path], Fault | None]:
    """Return the files that a name or a pattern stands for, or why there are none."""
    path = base / name
    if path.is_dir():
        if any((path / sign).exists() for sign in _ZARR):
            return [], Fault("this is a Zarr store, not a NetCDF file", str(name), "Convert it to NetCDF.")
        remedy = f'Name the files in it, for example "{Path(name).as_posix()}/*.nc".'
        return [], Fault("this is a folder, not a file", str(name), remedy)
    if path.exists():
        return [path], None
    if not glob.has_magic(str(name)):
        return [], _missing(path, str(name), base)
    # Only what is a pattern in the name: the folder before it may hold brackets of its own.
    fitting = sorted(glob.glob(os.fspath(name), root_dir=base, recursive=True))
    files = [base / each for each in fitting if (base / each).is_file()]
    if files:
        return files, None
    remedy = _slashes(str(name), base) or f"Check the pattern; {_inside(path.parent)}."
    return [], Fault("no file fits this pattern", str(name), remedy)


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
            dataset = _open(path)
        except Exception as error:  # whatever the libraries raise at other people's files
            reason = str(getattr(error, "strerror", None) or error).replace(str(path), label)
            remedy = "It is damaged or was cut short: copy or download it again."
            if not isinstance(error, OSError | RuntimeError):
                remedy = "An attribute in it is not as CF wants it: look at its header and write the file anew."
            faults.append(Fault(f"the file cannot be opened as NetCDF ({reason})", label, remedy))
            continue
        odd = _odd_packing(dataset, label)
        faults += odd
        opened += [] if odd else [OpenFile(path, label, dataset)]
    return opened, faults


def _odd_packing(dataset: xr.Dataset, label: str) -> list[Fault]:
    """Return a fault for each variable that is packed by something else than numbers."""
    return [
        Fault(f"its {key} is no number: {value!r}", f"{label}: {name}", f"Write {key} as a number.")
        for name, variable in dataset.variables.items()
        for key, value in variable.encoding.items()
        if key in ("scale_factor", "add_offset") and not _is_number(value)
    ]


def _is_number(value: object) -> bool:
    array = np.asarray(value)
    return array.size == 1 and array.dtype.kind in "fiu"


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


def _missing(path: Path, name: str, base: Path) -> Fault:
    remedy = _slashes(name, base) or f"Check the name; {_inside(path.parent)}."
    if path.parent.is_dir():
        alike = nearest(path.name, (each.name for each in path.parent.iterdir()))
        if alike:
            remedy = f"Did you mean '{alike}'?"
    return Fault("there is no such file", name, remedy)


def _slashes(name: str, base: Path) -> str:
    """Return what to do where backslashes, which separate folders on Windows only, keep a file from being found."""
    turned = name.replace("\\", "/")
    if turned == name or not (glob.glob(turned, root_dir=base, recursive=True) or (base / turned).exists()):
        return ""
    return f'Write it with forward slashes: "{turned}".'


def _inside(folder: Path) -> str:
    if not folder.is_dir():
        return f"there is no folder '{folder.name}' either"
    count = sum(1 for each in folder.iterdir() if each.suffix.lower() in (".nc", ".nc4"))
    return f"the folder '{folder.name}' holds {count_of(count, 'file that ends', 'files that end')} in .nc"


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
