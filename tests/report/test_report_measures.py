"""The table of measures: complete, and its standard names are real ones with fitting units."""

from __future__ import annotations

import xml.etree.ElementTree as ElementTree
from pathlib import Path

import cf_units
import compliance_checker
import pytest

from cropstress.report import phrases
from cropstress.report.phrases import title_of, unit_of
from cropstress.season.measures import CAUSES, DRAWN, MEASURES, SERIES

# The measures of the design, in its order
NAMES = [
    "assimilation",
    "lost_to_heat",
    "lost_to_heat_share",
    "lost_to_heat_by_photorespiration",
    "lost_to_heat_by_stomata",
    "lost_to_heat_by_enzymes",
    "lost_to_heat_by_respiration",
    "leading_cause",
    "lost_to_photorespiration",
    "lost_to_photorespiration_share",
    "photorespired_co2",
    "hot_days",
    "hot_days_if_cooler",
    "hot_days_if_warmer",
    "hot_days_flowering",
    "hot_days_flowering_if_cooler",
    "hot_days_flowering_if_warmer",
    "hot_leaf_days",
    "hot_hours",
    "degree_days_above_limit",
    "longest_hot_spell",
    "longest_hot_spell_start",
    "first_hot_day",
    "last_hot_day",
    "hottest_day",
    "hottest_temperature",
    "warm_nights",
    "warm_nights_flowering",
    "dry_air_days",
    "mean_vapour_pressure_deficit",
    "sowing_day",
    "flowering_day",
    "maturity_day",
    "season_days",
    "growing_degree_days",
    "missing_days",
    "mended_days",
]


def test_every_measure_of_the_design_is_in_the_table() -> None:
    assert list(MEASURES) == NAMES


def test_series_and_default_maps() -> None:
    causes = [f"lost_to_heat_by_{cause}" for cause in CAUSES]
    rest = ["lost_to_photorespiration", "photorespired_co2", "hot_days", "missing_days"]
    assert list(SERIES) == ["assimilation", "lost_to_heat", *causes, *rest]
    assert set(DRAWN) == {"lost_to_heat_share", "hot_days", "hot_days_flowering", "leading_cause"}


@pytest.mark.parametrize("name", [name for name, measure in MEASURES.items() if measure.standard_name])
def test_standard_name_is_in_the_table_of_cf_with_a_fitting_unit(name: str) -> None:
    table = Path(compliance_checker.__file__).parent / "data" / "cf-standard-name-table.xml"
    entries = {entry.get("id"): entry for entry in ElementTree.parse(table).getroot().iter("entry")}
    measure = MEASURES[name]
    canonical = entries[measure.standard_name].findtext("canonical_units")
    assert cf_units.Unit(measure.unit).is_convertible(canonical)


@pytest.mark.parametrize("name", NAMES)
def test_every_measure_has_a_title_and_a_unit_in_plain_words(name: str) -> None:
    measure = MEASURES[name]
    assert name in phrases._phrases()["titles"] and title_of(measure)
    assert measure.unit == "degC" or unit_of(measure) != measure.unit
    assert measure.dtype == {"flag": "int8", "count": "int16", "day_of_year": "int16"}.get(
        measure.kind, "float32"
    )
