"""Every measure of a season in one table: its unit, what it means, and how files and maps hold it."""

from __future__ import annotations

from dataclasses import dataclass

#: Within and over days of CF section 7.4; the day's maximum counted, the day's minimum counted.
HIGHEST_COUNTED = "time: maximum within days time: sum over days"
LOWEST_COUNTED = "time: minimum within days time: sum over days"
SUMMED = "time: sum within days time: sum over days"

DAYS_ABOVE = "number_of_days_with_air_temperature_above_threshold"


@dataclass(frozen=True)
class Measure:
    """One measure of a season.

    Attributes
    ----------
    name : str
        Its public name.
    unit : str
        CF unit; a day of the year is the plain number 1 to 366 and has the unit "1".
    long_name : str
        What it is, in plain words.
    kind : str
        "amount" (may be any size), "share" (0 to 1), "count" (whole days), "day_of_year", "temperature" or
        "flag".
    dtype : str
        Type in files: "float32", "int16" for counts and days of the year, "int8" for flags.
    standard_name, cell_methods : str or None
        As CF-1.11 has them, where a standard name exists.
    threshold : str or None
        The scalar coordinate of the result it is counted against.
    series : bool
        Whether it is also summed per growth stage and per ten days.
    drawn : bool
        Whether a map is drawn without being asked for.
    gas_exchange : bool
        Whether it needs humidity and radiation; the others need only tmax and tmin.
    flowering : bool
        Whether it is missing for a crop without a flowering window.
    zero_is_none : bool
        Whether exactly 0 means that there was none of it, which maps show apart.
    """

    name: str
    unit: str
    long_name: str
    kind: str = "amount"
    dtype: str = "float32"
    standard_name: str | None = None
    cell_methods: str | None = None
    threshold: str | None = None
    series: bool = False
    drawn: bool = False
    gas_exchange: bool = False
    flowering: bool = False
    zero_is_none: bool = False


def _amount(name: str, long_name: str, *, series: bool = True, zero_is_none: bool = True) -> Measure:
    return Measure(
        name,
        "mol m-2",
        long_name,
        cell_methods=SUMMED,
        series=series,
        gas_exchange=True,
        zero_is_none=zero_is_none,
    )


def _share(name: str, long_name: str, *, drawn: bool = False) -> Measure:
    return Measure(name, "1", long_name, kind="share", drawn=drawn, gas_exchange=True, zero_is_none=True)


def _count(
    name: str,
    long_name: str,
    threshold: str | None = None,
    *,
    standard_name: str | None = None,
    cell_methods: str | None = None,
    series: bool = False,
    drawn: bool = False,
    gas_exchange: bool = False,
    flowering: bool = False,
) -> Measure:
    return Measure(
        name,
        "1",
        long_name,
        kind="count",
        dtype="int16",
        standard_name=standard_name,
        cell_methods=cell_methods,
        threshold=threshold,
        series=series,
        drawn=drawn,
        gas_exchange=gas_exchange,
        flowering=flowering,
        zero_is_none=True,
    )


def _days_above(
    name: str,
    long_name: str,
    threshold: str,
    *,
    cell_methods: str = HIGHEST_COUNTED,
    series: bool = False,
    drawn: bool = False,
    flowering: bool = False,
) -> Measure:
    return _count(
        name,
        long_name,
        threshold,
        standard_name=DAYS_ABOVE,
        cell_methods=cell_methods,
        series=series,
        drawn=drawn,
        flowering=flowering,
    )


def _day_of_year(name: str, long_name: str, threshold: str | None = None, flowering: bool = False) -> Measure:
    return Measure(
        name, "1", long_name, kind="day_of_year", dtype="int16", threshold=threshold, flowering=flowering
    )


_TABLE = (
    _amount("assimilation", "net carbon dioxide uptake of the leaves, night respiration taken off"),
    _amount("lost_to_heat", "net carbon dioxide uptake lost to air hotter than the crop's heat onset"),
    _share(
        "lost_to_heat_share",
        "share of the possible net carbon dioxide uptake that was lost to heat",
        drawn=True,
    ),
    _amount(
        "lost_to_heat_by_photorespiration",
        "part of the loss to heat because hotter leaves give back more of the carbon they fix",
    ),
    _amount(
        "lost_to_heat_by_stomata",
        "part of the loss to heat because stomata close in the drier air that heat brings",
    ),
    _amount(
        "lost_to_heat_by_enzymes", "part of the loss to heat because enzymes work less well in hotter leaves"
    ),
    _amount("lost_to_heat_by_respiration", "part of the loss to heat because hotter leaves respire more"),
    Measure(
        "leading_cause",
        "1",
        "largest of the four causes of the loss to heat; none where less than 1 % is lost",
        kind="flag",
        dtype="int8",
        drawn=True,
        gas_exchange=True,
    ),
    _amount(
        "lost_to_photorespiration",
        "net carbon dioxide uptake lost to photorespiration, against a leaf without oxygenation; "
        "overlaps with the loss to heat and is never added to it",
    ),
    _share(
        "lost_to_photorespiration_share",
        "share of the net carbon dioxide uptake without oxygenation that was lost to photorespiration",
    ),
    _amount("photorespired_co2", "carbon dioxide released by photorespiration"),
    _days_above(
        "hot_days",
        "days with a highest air temperature above the crop's hot-day limit",
        "hot_day_limit",
        series=True,
        drawn=True,
    ),
    _days_above("hot_days_if_cooler", "hot days if the air were 1 degree cooler", "hot_day_limit_if_cooler"),
    _days_above("hot_days_if_warmer", "hot days if the air were 1 degree warmer", "hot_day_limit_if_warmer"),
    _days_above(
        "hot_days_flowering",
        "days of the flowering window with a highest air temperature above the crop's limit at flowering",
        "flowering_limit",
        drawn=True,
        flowering=True,
    ),
    _days_above(
        "hot_days_flowering_if_cooler",
        "hot days of the flowering window if the air were 1 degree cooler",
        "flowering_limit_if_cooler",
        flowering=True,
    ),
    _days_above(
        "hot_days_flowering_if_warmer",
        "hot days of the flowering window if the air were 1 degree warmer",
        "flowering_limit_if_warmer",
        flowering=True,
    ),
    _count(
        "hot_leaf_days",
        "days with a highest temperature of sunlit leaves above the crop's leaf limit",
        "hot_leaf_limit",
        gas_exchange=True,
    ),
    Measure(
        "hot_hours",
        "h",
        "hours with an air temperature above the crop's hot-day limit",
        threshold="hot_day_limit",
        zero_is_none=True,
    ),
    Measure(
        "degree_days_above_limit",
        "K d",
        "sum over time of the air temperature above the crop's hot-day limit",
        standard_name="integral_wrt_time_of_air_temperature_excess",
        cell_methods=SUMMED,
        threshold="degree_day_threshold",
        zero_is_none=True,
    ),
    Measure(
        "longest_hot_spell",
        "d",
        "longest run of hot days",
        kind="count",
        dtype="int16",
        standard_name="spell_length_of_days_with_air_temperature_above_threshold",
        cell_methods="time: maximum within days time: maximum over days",
        threshold="hot_day_limit",
        zero_is_none=True,
    ),
    _day_of_year("longest_hot_spell_start", "first day of the longest run of hot days", "hot_day_limit"),
    _day_of_year("first_hot_day", "first hot day", "hot_day_limit"),
    _day_of_year("last_hot_day", "last hot day", "hot_day_limit"),
    _day_of_year("hottest_day", "day with the highest air temperature of the season"),
    Measure(
        "hottest_temperature",
        "degC",
        "highest air temperature of the season",
        kind="temperature",
        standard_name="air_temperature",
        cell_methods="time: maximum within days time: maximum over days",
    ),
    _days_above(
        "warm_nights",
        "days with a lowest air temperature above the crop's warm-night limit",
        "warm_night_limit",
        cell_methods=LOWEST_COUNTED,
    ),
    _days_above(
        "warm_nights_flowering",
        "days of the flowering window with a lowest air temperature above the crop's warm-night limit",
        "warm_night_limit",
        cell_methods=LOWEST_COUNTED,
        flowering=True,
    ),
    _count(
        "dry_air_days",
        "days with a mean daytime vapour pressure deficit above the crop's dry-air limit",
        "dry_air_limit",
        gas_exchange=True,
    ),
    Measure(
        "mean_vapour_pressure_deficit",
        "kPa",
        "mean daytime vapour pressure deficit of the season",
        standard_name="water_vapor_saturation_deficit_in_air",
        cell_methods="time: mean within days time: mean over days",
        gas_exchange=True,
    ),
    _day_of_year("sowing_day", "sowing day"),
    _day_of_year("flowering_day", "modelled first day of flowering", flowering=True),
    _day_of_year("maturity_day", "modelled last day of the season"),
    Measure("season_days", "d", "modelled length of the season", kind="count", dtype="int16"),
    Measure("growing_degree_days", "K d", "growing degree days of the season", cell_methods=SUMMED),
    _count("missing_days", "days without weather data, which no sum counts", series=True),
    _count("mended_days", "days on which a small fault of the weather data was mended"),
)

#: Every measure by its name, in the order in which files hold them.
MEASURES: dict[str, Measure] = {measure.name: measure for measure in _TABLE}

#: Names of the measures that are also summed per growth stage and per ten days.
SERIES: tuple[str, ...] = tuple(measure.name for measure in _TABLE if measure.series)

#: Names of the measures that are drawn without being asked for.
DRAWN: tuple[str, ...] = tuple(measure.name for measure in _TABLE if measure.drawn)

#: Growth stages of FAO-56 Table 11, in order.
STAGES: tuple[str, ...] = ("initial", "development", "mid", "late")

#: `last_stage` of a result where there is none: nothing was computed.
NO_STAGE = -1

#: Causes of the loss to heat; `leading_cause` holds 1 for the first, 0 for none.
CAUSES: tuple[str, ...] = ("photorespiration", "stomata", "enzymes", "respiration")
LEADING_CAUSE_NONE = 0
LEADING_CAUSE_MISSING = -1

#: `cell_status` of a result: why a cell was computed or left blank.
CELL_STATUS: dict[str, int] = {
    "computed": 0,
    "no_crop": 1,
    "no_weather_data": 2,
    "no_sowing_date": 3,
    "too_many_missing_days": 4,
}
