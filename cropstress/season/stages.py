"""Growth stages and leaf area."""

from __future__ import annotations

from typing import Any

from cropstress.compiled import inlined

LEAF_AREA_AT_INITIAL_END = 0.1  # of the maximum: about 10 % ground cover; FAO-56 ch. 6 (initial stage)


@inlined
def stage_at(crop: Any, progress: float) -> int:
    """Return the stage, 0 to 3, at a progress since sowing [d or K d]."""
    if progress < crop.initial_end:
        return 0
    if progress < crop.development_end:
        return 1
    return 2 if progress < crop.mid_end else 3


@inlined
def leaf_area_at(crop: Any, progress: float) -> float:
    """Return leaf area [1]: 0 at sowing, straight lines between the ends of the stages."""
    start = LEAF_AREA_AT_INITIAL_END
    if progress < crop.initial_end:
        share = start * progress / crop.initial_end
    elif progress < crop.development_end:
        share = start + (1.0 - start) * (progress - crop.initial_end) / (
            crop.development_end - crop.initial_end
        )
    elif progress < crop.mid_end:
        share = 1.0
    else:
        late = min((progress - crop.mid_end) / (crop.late_end - crop.mid_end), 1.0)
        share = 1.0 - (1.0 - crop.leaf_area_end_share) * late
    return share * crop.leaf_area_maximum


@inlined
def degree_days(crop: Any, mean: float) -> float:
    """Return a day's growing degree days [K d]: mean temperature between base and ceiling, above base."""
    return max(min(mean, crop.ceiling_temperature) - crop.base_temperature, 0.0)
