"""The run file: what a person asks for, with every default and every fault told."""

from cropstress.runfile.reading import RunFile, load_runfile, read_runfile
from cropstress.runfile.tables import CropEntry

__all__ = ["CropEntry", "RunFile", "load_runfile", "read_runfile"]
