"""The summary on screen, in the words it must and must not have."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
import pytest
import xarray as xr

from cropstress.report.summary import place_words, summarise, summary_text
from cropstress.season.measures import CAUSES, CELL_STATUS

Maker = Callable[..., xr.Dataset]


def text_of(*results: xr.Dataset) -> str:
    return summary_text(summarise(results))


def test_what_a_wrong_calendar_shows_by(result_maker: Maker) -> None:
    text = text_of(result_maker())
    for words in (
        "Maize, harvest 2021 (weather as observed)",
        "modelled calendar: sown 20 April 2021, flowering 30 May 2021, end of season 20 June 2021",
        "hottest day: 40.9 °C on 9 June 2021 at 44.",
        "hot days (above 35 °C): median",
        "hot days at flowering (above 35 °C): median",
        "modelled share lost to heat:",
        "leading cause: enzymes",
        "without this crop",
        "without weather data",
        "1 without a sowing date",
        "1 with too many missing days",
        "not yield",
        "extension service",
    ):
        assert words in text, words


@pytest.mark.parametrize("kind", ["all", "no flowering", "small", "none", "temperature only"])
def test_loss_is_never_without_hot_days_at_flowering(result_maker: Maker, kind: str) -> None:
    result = result_maker(3, 3, flowering=kind != "no flowering")
    if kind in ("small", "none"):
        scale = 0.01 if kind == "small" else 0.0
        for name in ("lost_to_heat", "lost_to_heat_share", *(f"lost_to_heat_by_{cause}" for cause in CAUSES)):
            result[name] = result[name] * scale
    if kind == "temperature only":
        gone = [str(name) for name in result.data_vars if "lost" in str(name) or "assimilation" in str(name)]
        result = result.drop_vars(gone)
    lines = text_of(result).splitlines()
    place = next(number for number, line in enumerate(lines) if "share lost to heat" in line)
    assert "hot days at flowering" in lines[place - 1]
    expected = {
        "no flowering": "no flowering window",
        "small": "less than 1 %",
        "none": "none, no moment was hotter than the onset of 33 °C",
        "temperature only": "needs humidity and radiation",
    }
    assert expected.get(kind, "leading cause") in "\n".join(lines)


def test_photorespiration_is_never_blamed_in_a_c4_crop(result_maker: Maker) -> None:
    for pathway, words in (("C4", "no single cause stands out"), ("C3", "leading cause: photorespiration")):
        result = result_maker(3, 3, pathway=pathway)
        result["lost_to_heat_by_photorespiration"] = result["lost_to_heat_by_photorespiration"] * 0 + 50.0
        assert words in text_of(result)
        assert ("photorespiration" in text_of(result)) == (pathway == "C3")


def test_a_season_cut_short_says_so(result_maker: Maker) -> None:
    result = result_maker(3, 3)
    assert "weather data end" not in text_of(result)
    result["maturity_day"].values[...] = np.nan
    assert "the weather data end on 20 June 2021" in text_of(result)
    assert "end of season not reached" in text_of(result)
    result["maturity_day"].values[...] = 200.0
    assert "the weather data end on 20 June 2021" in text_of(result)


def test_nothing_computed_is_a_valid_summary(result_maker: Maker) -> None:
    result = result_maker(2, 2)
    result["cell_status"].values[...] = CELL_STATUS["no_crop"]
    text = text_of(result)
    assert "no cell was computed: 4 without this crop" in text and "nan" not in text


def test_no_nan_is_ever_printed(result_maker: Maker) -> None:
    result = result_maker(2, 2, flowering=False)
    for name in ("flowering_day", "hottest_day", "sowing_day"):
        result[name].values[...] = np.nan
    assert "nan" not in text_of(result).replace("maintenance", "")


def test_places_in_words(result_maker: Maker) -> None:
    assert place_words(result_maker(3, 3), 0, 0) == "44.025° N, 8.025° E"
    # UTM zone 32 N, 450 km east and 5000 km north: 45.152 N 8.364 E (pyproj)
    assert place_words(result_maker(3, 3, projected=True), 0, 0) == "45.152° N, 8.364° E"
    placeless = result_maker(3, 3, projected=True).drop_vars("spatial_ref")
    assert place_words(placeless, 0, 0) == "y 5000000, x 450000"
