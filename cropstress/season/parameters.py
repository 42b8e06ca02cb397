"""The numbers of one crop's season, as the kernel reads them."""

from __future__ import annotations

import numpy as np

from cropstress.crops import CropProfile

SEASON_CROP = np.dtype(
    [
        (name, np.float64)
        for name in (
            "heat_onset",
            "hot_day_limit",
            "flowering_limit",
            "hot_leaf_limit",
            "warm_night_limit",
            "dry_air_limit",
            "base_temperature",
            "ceiling_temperature",
            "leaf_area_maximum",
            "leaf_area_end_share",
            "capacity_decline",
            "growth_temperature",
            "initial_end",  # days since sowing, or K d since sowing with thermal time
            "development_end",
            "mid_end",
            "late_end",
            "flowering_offset",  # d from the start of mid-season
            "window_start",  # d from flowering
            "window_end",
            "flowers",  # 1, or 0 for crops grown for leaf, stem or tuber
            "thermal_time",  # 1 where stages end by K d, 0 where they end by days
            "acclimates",  # 1 where growth temperature is the mean of the last 30 days
            "lowest_growth_temperature",
            "highest_growth_temperature",
            "single_leaf",  # 1 for one top leaf instead of the canopy
        )
    ]
)


def season_record(
    profile: CropProfile, stages: str = "days", canopy: str = "sunlit_shaded", acclimation: bool = False
) -> np.ndarray:
    """Turn a crop profile into the record the season reads.

    Parameters
    ----------
    profile : CropProfile
    stages : str
        "days" or "thermal_time".
    canopy : str
        "sunlit_shaded" or "leaf".
    acclimation : bool
        Whether the growth temperature follows the last 30 days (C3 only).

    Returns
    -------
    numpy.ndarray
        Shape (1,), dtype `SEASON_CROP`.
    """
    record = np.zeros(1, dtype=SEASON_CROP)
    for name in (
        "heat_onset hot_day_limit hot_leaf_limit warm_night_limit dry_air_limit base_temperature "
        "ceiling_temperature leaf_area_maximum leaf_area_end_share capacity_decline"
    ).split():
        record[name] = profile.number(name)
    lengths = profile.thermal_sums if stages == "thermal_time" else profile.days
    assert lengths is not None
    for name, end in zip(
        ("initial_end", "development_end", "mid_end", "late_end"), np.cumsum(lengths), strict=True
    ):
        record[name] = end
    record["thermal_time"] = stages == "thermal_time"
    record["single_leaf"] = canopy == "leaf"
    if profile.flowering_window is not None and profile.flowering_offset is not None:
        record["flowers"] = 1.0
        record["flowering_limit"] = profile.number("flowering_limit")
        record["flowering_offset"] = profile.flowering_offset
        record["window_start"], record["window_end"] = profile.flowering_window
    if profile.pathway == "C3":
        record["growth_temperature"] = profile.number("growth_temperature")
        record["acclimates"] = acclimation
        record["lowest_growth_temperature"] = profile.number("acclimation_lowest")
        record["highest_growth_temperature"] = profile.number("acclimation_highest")
    return record
