"""How the numerical floors are compiled.

Three decorators and one function, so that every kernel is built the same way:

* `inlined` for the small physical relations: they vanish into the loop that calls them;
* `kernel` for the loops over lanes: single-threaded, releasing the global lock, cached on disk;
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
from llvmlite import ir
from numba import types
from numba.extending import intrinsic

# Reassociation is left out: a result must not depend on how a loop was split into vectors.
FAST_MATH = {"nnan", "ninf", "nsz", "arcp", "contract"}

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


@intrinsic
def _nearest_whole(typing_context, value):  # type: ignore[no-untyped-def]
    """Round to the nearest whole number, ties to even."""

    def generate(context, builder, signature, arguments):  # type: ignore[no-untyped-def]
        double = ir.DoubleType()
        rint = builder.module.declare_intrinsic("llvm.rint", [double])
        return builder.call(rint, arguments)

    return types.float64(types.float64), generate


@intrinsic
def _power_of_two(typing_context, whole):  # type: ignore[no-untyped-def]
    """Return 2 to a whole number between -1022 and 1023, by writing it into the exponent's bits."""

    def generate(context, builder, signature, arguments):  # type: ignore[no-untyped-def]
        double, integer = ir.DoubleType(), ir.IntType(64)
        # 1.5 x 2^52 puts a whole number into the lowest bits of the significand; 1023 is the exponent's bias.
        shifted = builder.fadd(arguments[0], ir.Constant(double, 6755399441055744.0 + 1023.0))
        bits = builder.shl(builder.bitcast(shifted, integer), ir.Constant(integer, 52))
        return builder.bitcast(bits, double)

    return types.float64(types.float64), generate


@inlined
def exponential(x: float) -> float:
    """Return e to the power x, for |x| < 700, with a relative error under 5e-11, without a library call.

    Range reduction to |r| <= ln(2)/2, and there the polynomial of degree 7 with the smallest largest
    relative error (derived here by Lawson's reweighted least squares; a test holds the error).
    """
    whole = _nearest_whole(x * 1.4426950408889634)  # 1 / ln 2
    r = x - whole * 0.6931471805599453  # ln 2
    p = 0.0001977515849290681
    p = p * r + 0.001394819513978724
    p = p * r + 0.00833356118111822
    p = p * r + 0.04166622525002668
    p = p * r + 0.16666665125214536
    p = p * r + 0.5000000104598433
    p = p * r + 1.0000000002432898
    p = p * r + 0.9999999999616521
    return p * _power_of_two(whole)
