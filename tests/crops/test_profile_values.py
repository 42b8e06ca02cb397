"""The shipped profiles: complete, within physical sense, and true to the tables they name."""

import pytest

from cropstress.crops import available_crops, load_crop
from cropstress.crops.profile import STATUSES

CROPS = (
    "barley canola common-bean cotton groundnut maize pearl-millet potato rice sorghum soybean sugarcane "
    "sunflower wheat"
).split()
C4_CROPS = {"maize", "sorghum", "pearl-millet", "sugarcane"}

# FAO Irrigation and Drainage Paper 56, Table 11; published.
TABLE_11 = {
    "maize": (30, 40, 50, 30),  # April, Spain, California
    "wheat": (20, 25, 60, 30),  # March/April, 35-45 degrees latitude
    "barley": (20, 25, 60, 30),  # the same row
    "rice": (30, 30, 60, 30),  # December/May, tropics, Mediterranean
    "sorghum": (20, 35, 40, 30),  # May/June, USA, Pakistan, Mediterranean
    "pearl-millet": (15, 25, 40, 25),  # June, Pakistan
    "soybean": (20, 35, 60, 25),  # May, central USA, printed total 140
    "cotton": (30, 50, 60, 55),  # March to May, Egypt, Pakistan, California
    "groundnut": (25, 35, 45, 25),
    "sunflower": (25, 35, 45, 25),  # April/May, Mediterranean, California
}

PUBLISHED_LIMITS = [
    # Fourth US National Climate Assessment 2018, ch. 21, failure of maize reproduction: 95 degF; published.
    ("maize", "flowering_limit", (95.0 - 32.0) / 1.8),
    # The same, optimum of soybean growth: 86 degF; published.
    ("soybean", "heat_onset", (86.0 - 32.0) / 1.8),
    # Schlenker & Roberts 2009, PNAS 106:15594, abstract: cotton yields rise to 32 degC; published.
    ("cotton", "heat_onset", 32.0),
    # Prasad, Craufurd & Summerfield 1999, Ann Bot 84:381, abstract: 34 degC by day; published.
    ("groundnut", "flowering_limit", 34.0),
    # Lizaso et al. 2018, Field Crops Res 216:129, abstract: base 8, optimum 34 degC; published.
    ("maize", "base_temperature", 8.0),
    ("maize", "ceiling_temperature", 34.0),
    # Morrison & Stewart 2002, Crop Sci 42:797; from memory.
    ("canola", "flowering_limit", 29.5),
    # Lin et al. 2015, Nature Clim Change 5:459; from memory.
    ("rice", "stomatal_slope", 5.79),
    ("maize", "stomatal_slope", 1.62),
    # Crafts-Brandner & Salvucci 2002, Plant Physiol 129:1773; from memory.
    ("maize", "hot_leaf_limit", 38.0),
    # de Pury & Farquhar 1997, Plant Cell Environ 20:537; from memory.
    ("potato", "capacity_decline", 0.713),
]


@pytest.fixture(scope="module", params=CROPS)
def crop(request):
    return load_crop(request.param)


def test_the_fourteen_crops_are_there():
    assert available_crops() == CROPS
    assert {name for name in CROPS if load_crop(name).pathway == "C4"} == C4_CROPS


def test_profile_carries_its_file_name(crop):
    assert crop.name in CROPS
    assert crop.changed == ()


def test_every_value_says_unit_range_source_status_and_meaning(crop):
    for name, value in (crop.values | crop.kinetics).items():
        assert value.low <= value.value <= value.high, name
        assert value.unit and len(value.source) > 10 and len(value.meaning) > 10, name
        assert value.status in STATUSES and value.status != "given by user", name
        if value.status in ("from memory", "chosen here"):
            assert value.confidence, name


def test_heat_limits_say_air_or_leaf_and_of_what_time(crop):
    meanings = {name: crop.values[name].meaning for name in crop.values}
    assert "AIR" in meanings["heat_onset"] and "Momentary" in meanings["heat_onset"]
    assert "LEAF" in meanings["hot_leaf_limit"]
    for name in {"hot_day_limit", "flowering_limit"} & set(meanings):
        assert "AIR" in meanings[name] and "MAXIMUM" in meanings[name]


@pytest.mark.parametrize(("name", "days"), TABLE_11.items())
def test_stage_lengths_are_those_of_fao_56_table_11(name, days):
    crop = load_crop(name)
    assert crop.days == days
    assert "Table 11" in crop.values["initial_days"].source
    assert crop.values["initial_days"].status == "read"


@pytest.mark.parametrize("name", sorted(set(CROPS) - set(TABLE_11)))
def test_stage_lengths_not_read_say_so(name):
    assert load_crop(name).values["mid_days"].status in ("from memory", "chosen here")


@pytest.mark.parametrize(("name", "value", "expected"), PUBLISHED_LIMITS)
def test_values_are_the_published_ones(name, value, expected):
    assert load_crop(name).number(value) == pytest.approx(expected)


@pytest.mark.parametrize("name", sorted(set(CROPS) - C4_CROPS))
def test_electron_transport_follows_growth_temperature(name):
    crop = load_crop(name)
    # Kattge & Knorr 2007, Plant Cell Environ 30:1176: 2.59 - 0.035 Tg; from memory.
    expected = 2.59 - 0.035 * crop.number("growth_temperature")
    assert crop.number("electron_transport_ratio") == pytest.approx(expected, abs=0.006)
    # Leuning 2002, Plant Cell Environ 25:1205, abstract: 2.00 +- 0.60; published.
    ratio = crop.values["electron_transport_ratio"]
    assert (ratio.low, ratio.high) == (1.4, 2.6)


@pytest.mark.parametrize("name", ["sugarcane", "potato"])
def test_crops_without_flowers_in_the_harvest_have_no_window(name):
    crop = load_crop(name)
    assert crop.flowering_offset is None and crop.flowering_window is None
    assert "flowering_limit" not in crop.values


def test_flowering_window_lies_in_the_season(crop):
    if crop.flowering_window is not None:
        start, end = crop.flowering_window
        flowering = crop.days[0] + crop.days[1] + crop.flowering_offset
        assert start < end
        assert 0 < flowering + start and flowering + end < sum(crop.days)


def test_flowering_windows_of_the_papers():
    # Prasad 1999, thesis: 6 days before to 15 days after first flower; published (abstract).
    assert load_crop("groundnut").flowering_window == (-6, 15)
    # Prasad et al. 2015, Front Plant Sci 6:820: 10 days before, 5 after anthesis; published (abstract).
    assert load_crop("sorghum").flowering_window == (-10, 5)


THERMAL = {  # sowing to flowering, flowering to maturity [K d]; from memory
    "maize": (900.0, 650.0),
    "wheat": (1200.0, 665.0),
    "rice": (1300.0, 500.0),
    "sorghum": (950.0, 600.0),
    "cotton": (450.0, 900.0),
}


def test_thermal_sums_where_totals_are_known(crop):
    assert (crop.thermal_sums is not None) == (crop.name in THERMAL)


@pytest.mark.parametrize(("name", "totals"), THERMAL.items())
def test_thermal_sums_reach_flowering_with_the_first_total(name, totals):
    crop = load_crop(name)
    initial, development, mid, late = crop.thermal_sums
    assert initial + development + mid + late == pytest.approx(sum(totals), abs=2.0)
    offset, days = crop.flowering_offset, crop.days
    before, after = totals[0] / (days[0] + days[1] + offset), totals[1] / (days[2] - offset + days[3])
    mid_start = totals[0] - offset * (before if offset > 0 else after)
    assert initial + development == pytest.approx(mid_start, abs=1.5)
    assert crop.values["mid_thermal_sum"].status == "derived here"
