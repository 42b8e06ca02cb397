"""The version of the package, which every file names."""

from __future__ import annotations

from importlib.metadata import PackageNotFoundError, version


def package_version() -> str:
    """Return the installed version of cropstress, or "from a checkout" when it runs from a checkout."""
    try:
        return version("cropstress")
    except PackageNotFoundError:
        return "from a checkout"
