"""Many cells: cutting up a run, its tasks, and putting the results together."""

from cropstress.region.assess import assess, compute_results, make_plan
from cropstress.region.calendar import TimeAxis, time_axis
from cropstress.region.entry import Entry, Options, co2_of, make_entry

__all__ = [
    "Entry", "Options", "TimeAxis", "assess", "co2_of", "compute_results", "make_entry", "make_plan", "time_axis",
]  # fmt: skip
