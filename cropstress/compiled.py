"""How the numerical floors are compiled.

A few decorators and one function, so that every kernel is built the same way:

* `inlined` for the small physical relations: they vanish into the loop that calls them;
* `lane_loop` for one straight-line loop over lanes. It reads and writes rows of one workspace, so the compiler
  has only two pointers to tell apart, the workspace's and the crop's; with more it gives up vectors;
* `kernel` for what calls such loops: single-threaded, releasing the global lock, cached on disk;
* `exponential` is written here with plain arithmetic, because the compiler's own `exp` is a
  library call that keeps a loop from being turned into vector instructions.

The cache folder carries a hash of all sources of the package. Numba itself only looks at the file of the
cached function and would miss a change in a function that this one inlines.
"""

from __future__ import annotations

import hashlib
import os
import tempfile
from collections.abc import Callable
from pathlib import Path
from typing import Any

import numba
import numpy as np
from llvmlite import ir
from numba import types
from numba.extending import intrinsic

# Reassociation is left out: a result must not depend on how a loop was split into vectors.
FAST_MATH = {"nnan", "ninf", "nsz", "arcp", "contract"}

LANES = 256  # leaves that a loop takes together: a multiple of every vector width times unrolling
ROW = LANES + 8  # a power of two would put all rows into the same few places of the processor's cache

_PACKAGE = Path(__file__).parent


def _source_hash() -> str:
    """Return a short hash of every Python source of the package and of the compiler's version."""
    digest = hashlib.sha256(numba.__version__.encode())
    for path in sorted(_PACKAGE.rglob("*.py")):
        digest.update(path.relative_to(_PACKAGE).as_posix().encode())
        digest.update(path.read_bytes())
    return digest.hexdigest()[:16]


def _writable_cache_folder() -> str | None:
    """Return a folder for compiled code: beside the package, else the user's, else none."""
    name = f"kernels-{_source_hash()}"
    chosen = os.environ.get("NUMBA_CACHE_DIR")
    local = os.environ.get("LOCALAPPDATA") or os.environ.get("XDG_CACHE_HOME") or str(Path.home() / ".cache")
    candidates = [Path(chosen)] if chosen else [_PACKAGE / "__pycache__", Path(local) / "cropstress"]
    for candidate in candidates:
        folder = candidate / name
        try:
            folder.mkdir(parents=True, exist_ok=True)
            with tempfile.TemporaryFile(dir=folder):
                return str(folder)
        except OSError:
            continue
    return None


CACHE_FOLDER = _writable_cache_folder()


def inlined(function: Callable[..., Any]) -> Any:
    """Compile a small relation so that it is copied into every loop that calls it; no missing values."""
    return numba.njit(forceinline=True, fastmath=FAST_MATH, error_model="numpy")(function)


def lane_loop(function: Callable[..., Any]) -> Any:
    """Compile one loop over lanes as a function of its own; no missing values."""
    return numba.njit(fastmath=FAST_MATH, error_model="numpy", nogil=True)(function)


def exact_inlined(function: Callable[..., Any]) -> Any:
    """Compile a small relation that may meet missing values."""
    return numba.njit(forceinline=True, error_model="numpy")(function)


def kernel(function: Callable[..., Any]) -> Any:
    """Compile a loop over lanes: single-threaded, without the global lock, cached; no missing values."""
    return _cached(function, FAST_MATH)


def exact_kernel(function: Callable[..., Any]) -> Any:
    """Compile a loop over cells that may meet missing values."""
    return _cached(function, False)


def _cached(function: Callable[..., Any], fast_math: set[str] | bool) -> Any:
    before = numba.config.CACHE_DIR
    if CACHE_FOLDER is not None:
        numba.config.CACHE_DIR = CACHE_FOLDER
    try:
        return numba.njit(
            nogil=True, fastmath=fast_math, error_model="numpy", cache=CACHE_FOLDER is not None
        )(function)
    finally:
        numba.config.CACHE_DIR = before


@inlined
def at(row: int, lane: int) -> np.uint64:
    """Return where a lane of a row stands in a workspace of rows of ROW numbers.

    Workspaces are flat, so that the distance between two rows is known when a loop is compiled; unsigned,
    so that no index could mean a place counted from the end.
    """
    return np.uint64(row * ROW + lane)


# 1.5 x 2^52 brings a whole number into the lowest bits of the significand; 1023 is the bias of the exponent.
_WHOLE = 6755399441055744.0 + 1023.0


@intrinsic
def _power_of_two(typing_context, shifted):  # type: ignore[no-untyped-def]
    """Return 2 to a whole number from -1022 to 1023, given as that number + _WHOLE."""

    def generate(context, builder, signature, arguments):  # type: ignore[no-untyped-def]
        integer = ir.IntType(64)
        bits = builder.shl(builder.bitcast(arguments[0], integer), ir.Constant(integer, 52))
        return builder.bitcast(bits, ir.DoubleType())

    return types.float64(types.float64), generate


@inlined
def exponential(x: float) -> float:
    """Return e to the power x, for |x| < 700, with a relative error under 2e-9, without a library call.

    Range reduction to |r| <= ln(2)/2, and there the polynomial of degree 6 with the smallest largest relative
    error (derived here by Remez exchange; a test holds the error).
    """
    shifted = x * 1.4426950408889634 + _WHOLE  # 1 / ln 2; rounds to the nearest whole number
    r = x - (shifted - _WHOLE) * 0.6931471805599453  # ln 2
    p = 0.0013836846134577057
    p = p * r + 0.008374815798301793
    p = p * r + 0.04166822556692284
    p = p * r + 0.16666420169946367
    p = p * r + 0.4999999207982802
    p = p * r + 1.0000000363231765
    p = p * r + 1.0000000005541663
    return p * _power_of_two(shifted)
