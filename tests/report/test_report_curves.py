"""Figures of one place through a season and of one leaf."""

from __future__ import annotations

import itertools
from pathlib import Path

import numpy as np
import pandas as pd
import pytest
from PIL import Image

from cropstress.report import curves
from cropstress.report.curves import leaf_figure, trace_figure
from cropstress.report.page import SMALL, Page


@pytest.fixture
def pages(monkeypatch: pytest.MonkeyPatch) -> list[Page]:
    """The pages that were saved."""
    saved: list[Page] = []
    save = Page.save

    def keep(page: Page, path: Path | str, words: dict[str, str]) -> None:
        saved.append(page)
        save(page, path, words)

    monkeypatch.setattr(Page, "save", keep)
    return saved


def days(count: int, with_uptake: bool = True) -> pd.DataFrame:
    """Invented days with a hot spell and two missing days."""
    day = np.arange(count)
    highest = 24.0 + 8.0 * np.sin(np.pi * day / count) + 6.0 * ((day > 0.5 * count) & (day < 0.6 * count))
    highest[5:7] = np.nan
    table = pd.DataFrame({"date": pd.date_range("2021-04-20", periods=count).strftime("%Y-%m-%d")})
    table["tmax"], table["tmin"] = highest, highest - 12.0
    table["stage"] = "mid"
    if with_uptake:
        heat = np.maximum(highest - 33.0, 0.0)
        table["highest_leaf_temperature"] = highest + 1.0
        table["assimilation"] = 1.0 - 0.02 * heat
        for weight, cause in (
            (0.02, "photorespiration"),
            (0.01, "stomata"),
            (-0.01, "enzymes"),
            (0.01, "respiration"),
        ):
            table[f"lost_to_heat_by_{cause}"] = weight * heat
        table["lost_to_heat"] = 0.03 * heat
    return table


@pytest.mark.parametrize(("count", "with_uptake"), [(150, True), (150, False), (3 * 7, True), (400, True)])
def test_trace_is_drawn_within_its_page(
    tmp_path: Path, pages: list[Page], count: int, with_uptake: bool
) -> None:
    trace_figure(
        days(count, with_uptake),
        tmp_path / "trace.png",
        label="Maize $1",
        place="44.5° N, 8.2° E",
        heat_onset=33.0,
        hot_day_limit=35.0,
        flowering_window=(10, 15),
        notes=["CO₂ 421 ppm."],
    )
    (page,) = pages
    paper = page.figure.bbox
    for text in page.paper.texts:
        box = text.get_window_extent()
        assert text.get_fontsize() >= SMALL and box.x0 >= 0 and box.x1 <= paper.x1 and box.y0 >= 0
    for axes in page.figure.axes[1:]:
        assert all(
            label.get_fontsize() >= SMALL for label in (*axes.get_xticklabels(), *axes.get_yticklabels())
        )
        assert axes.yaxis.label.get_window_extent().x0 >= 0
        names = [label for label in axes.get_xticklabels() if label.get_text()]
        boxes = [label.get_window_extent() for label in names]
        assert all(left.x1 < right.x0 for left, right in itertools.pairwise(boxes))
    words = " ".join(text.get_text() for text in page.paper.texts).replace("\N{NO-BREAK SPACE}", " ")
    assert "flowering window" in words and "no weather data" in words and "not yield" in words
    assert Image.open(tmp_path / "trace.png").size[0] == 1340


def test_causes_are_stacked_away_from_zero(tmp_path: Path, pages: list[Page]) -> None:
    table = days(150)
    trace_figure(table, tmp_path / "trace.png")
    bars = [patch for patch in pages[0].figure.axes[3].patches if abs(patch.get_height()) > 0.0]
    # The same total above and below zero as the table has
    assert sum(bar.get_height() for bar in bars) == pytest.approx(table["lost_to_heat"].sum())
    hottest = table["lost_to_heat"].max()
    assert max(bar.get_y() + bar.get_height() for bar in bars) == pytest.approx(hottest * 4.0 / 3.0)
    assert min(bar.get_y() + bar.get_height() for bar in bars) == pytest.approx(-hottest / 3.0)


@pytest.mark.parametrize("over", ["air_temperature", "leaf_temperature"])
def test_leaf_curves(tmp_path: Path, pages: list[Page], over: str) -> None:
    temperature = np.linspace(5.0, 45.0, 30)
    parts = [
        pd.DataFrame(
            {
                over: temperature,
                "co2": co2,
                "assimilation": 15.0 - 0.02 * (temperature - 28.0) ** 2,
                "assimilation_without_oxygenation": 20.0 - 0.02 * (temperature - 30.0) ** 2,
            }
        )
        for co2 in (280.0, 421.0, 700.0)
    ]
    leaf_figure(
        pd.concat(parts), tmp_path / "leaf.png", label="Soybean", heat_onset=33.0, notes=["Light 1500."]
    )
    (page,) = pages
    words = " ".join(text.get_text() for text in page.paper.texts).replace("\N{NO-BREAK SPACE}", " ")
    assert "421 ppm" in words and "without oxygenation" in words
    assert ("heat onset" in words) == (over == "air_temperature")
    shares = page.figure.axes[2].lines[0].get_ydata()
    assert np.nanmin(shares) >= 0.0 and np.nanmax(shares) <= 100.0
    assert Image.open(tmp_path / "leaf.png").size[0] == 1340


def test_the_module_keeps_no_global_figure_state() -> None:
    assert "pyplot" not in Path(str(curves.__file__)).read_text(encoding="utf-8")
