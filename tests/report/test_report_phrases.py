"""The phrase file: no sentence is missing, and dates and numbers read well."""

from __future__ import annotations

import datetime
import re
from pathlib import Path

import cftime
import numpy as np
import pandas as pd
import pytest

from cropstress.report import phrases
from cropstress.report.phrases import iso_date, number, phrase, printed_date

PACKAGE = Path(phrases.__file__).parent


def test_every_phrase_that_is_asked_for_exists() -> None:
    for module in PACKAGE.glob("*.py"):
        for table, name in re.findall(r'phrase\(\s*"(\w+)\.(\w+)"', module.read_text(encoding="utf-8")):
            assert name in phrases._phrases()[table], (module.name, table, name)


def test_an_unknown_phrase_is_an_error() -> None:
    with pytest.raises(KeyError):
        phrase("words.no_such_phrase")


@pytest.mark.parametrize("caution", ["line", "full"])
def test_the_caution_has_all_its_points(caution: str) -> None:
    text = phrase(f"caution.{caution}")
    for words in (
        "not yield",
        "pests, disease, nutrients, frost",
        "failed grain set",
        "harvest, insurance, relief, irrigation or spraying",
        "extension service",
        "licensed advice",
        "shade at 2 m",
        "working hours in heat",
        "occupational rules",
    ):
        assert words in text, words


def test_dates_of_any_kind() -> None:
    assert printed_date(np.datetime64("2021-02-03")) == "3 February 2021"
    assert printed_date(cftime.Datetime360Day(2021, 2, 30)) == "30 February 2021"
    assert iso_date(cftime.DatetimeNoLeap(2021, 12, 1)) == "2021-12-01"
    assert iso_date(datetime.date(2021, 1, 2)) == "2021-01-02"
    for nothing in (None, np.datetime64("NaT"), pd.NaT, float("nan")):
        assert printed_date(nothing) == "" == iso_date(nothing)


def test_numbers() -> None:
    assert [number(value) for value in (0.0, 2.0, 0.1, 35.0, 35.25, 421.0, 421.37, 1234.0, -0.5)] == [
        "0",
        "2",
        "0.1",
        "35",
        "35.2",
        "421",
        "421.4",
        "1234",
        "-0.5",
    ]


def test_no_module_of_the_report_uses_pyplot_or_computes_a_season() -> None:
    for module in PACKAGE.glob("*.py"):
        text = module.read_text(encoding="utf-8")
        assert "pyplot" not in text, module.name
        for floor in ("weather", "crops", "leaf", "day", "region", "places"):
            assert f"cropstress.{floor}" not in text, (module.name, floor)
