"""Printed maps: places, lengths, kinds of cells and letters."""

from __future__ import annotations

import itertools
from collections.abc import Callable
from pathlib import Path

import matplotlib.text
import numpy as np
import pyproj
import pytest
import xarray as xr
from PIL import Image

from cropstress.report import categories as kinds
from cropstress.report.classes import classes_for
from cropstress.report.figure import map_figure, map_page
from cropstress.report.grid import map_grid
from cropstress.report.map_panel import round_below, scale_bar
from cropstress.report.page import SMALL, Page, broken, text_width
from cropstress.season.measures import MEASURES

Maker = Callable[..., xr.Dataset]


def words_of(page: Page) -> list[matplotlib.text.Text]:
    axes = page.figure.axes
    texts = [text for one in axes for text in one.findobj(matplotlib.text.Text)]
    return [text for text in texts if text.get_text().strip() and text.get_visible()]


def printed(page: Page) -> str:
    return " ".join(text.get_text() for text in page.paper.texts).replace("\N{NO-BREAK SPACE}", " ")


def with_axes(result: xr.Dataset, y: np.ndarray, x: np.ndarray, crs: str) -> xr.Dataset:
    moved = result.assign_coords(y=("y", y), x=("x", x)).drop_vars("spatial_ref")
    return moved.rio.write_crs(crs)


@pytest.mark.parametrize(
    ("ny", "nx", "projected"),
    [(12, 16, False), (12, 16, True), (1, 1, False), (1, 1, True), (1, 40, False), (40, 1, True)],
)
@pytest.mark.parametrize("measure", ["lost_to_heat_share", "leading_cause", "hot_days_flowering"])
def test_letters_are_large_enough_and_nothing_is_cut_or_overlaps(
    result_maker: Maker, ny: int, nx: int, projected: bool, measure: str
) -> None:
    long_name = "Winter barley of the upper hills, second variety, sown late and irrigated twice"
    page = map_page(result_maker(ny, nx, projected=projected, label=long_name), measure, 2021)
    page.figure.canvas.draw()
    paper = page.figure.bbox
    boxes = []
    for text in words_of(page):
        assert text.get_fontsize() >= SMALL >= 9.0
        box = text.get_window_extent()
        assert box.x0 >= 0 and box.y0 >= 0 and box.x1 <= paper.x1 and box.y1 <= paper.y1, text.get_text()
        boxes.append((box, text.get_text()))
    for (one, one_text), (other, other_text) in itertools.combinations(boxes, 2):
        apart = one.x1 <= other.x0 or other.x1 <= one.x0 or one.y1 <= other.y0 + 4 or other.y1 <= one.y0 + 4
        assert apart, (one_text, other_text)
    # A4 less its margins [inch]
    assert page.height <= 11.0


def test_the_page_says_what_it_must(result_maker: Maker) -> None:
    text = printed(map_page(result_maker(), "lost_to_heat_share", 2021))
    for words in (
        "Maize: share of the leaves' carbon uptake lost to heat",
        "harvest 2021 (20 April 2021 to 20 June 2021)",
        "% of the possible net uptake",
        "less than 1 %: too small to tell",
        "none: exactly 0",
        "crop not grown here",
        "no weather data",
        "no sowing date",
        "highest air temperature above 35 °C",
        "33 °C air (onset)",
        "421 ppm",
        "acclimation: none",
        "enough soil water",
        "weather data to 20 June 2021",
        "not yield",
        "extension service",
        "occupational rules",
        "Data: invented for tests",
        "WGS 84 (degree)",
        "Hot days at flowering in the same fields",
        "km",
    ):
        assert words in text, words


def test_a_line_runs_where_the_sea_meets_the_land(result_maker: Maker) -> None:
    """Both may be white; the line runs on every edge between them and on no other."""
    result = result_maker()
    without = np.isin(kinds.categories(result, classes_for("hot_days"), 2021), kinds.WITHOUT_VALUE)
    edges = (without[:, 1:] != without[:, :-1]).sum() + (without[1:] != without[:-1]).sum()
    (axes,) = [each for each in map_page(result, "hot_days", 2021).figure.axes if each.get_xlim() != (0.0, 6.7)]
    drawn = [patch for patch in axes.patches if not patch.get_fill() and not patch.get_hatch()]
    assert edges > 10
    assert [len(patch.get_path().vertices) for patch in drawn] == [2 * edges]


def test_no_map_of_a_c4_crop_blames_photorespiration(result_maker: Maker) -> None:
    c4, c3 = (printed(map_page(result_maker(pathway=pathway), "leading_cause", 2021)) for pathway in ("C4", "C3"))
    assert "photorespiration" not in c4 and "no single cause" in c4
    assert "photorespiration" in c3 and "no single cause" not in c3
    assert "enzymes" in c4 and "enzymes" in c3


def test_the_leading_cause_is_never_shown_without_the_loss(result_maker: Maker) -> None:
    text = printed(map_page(result_maker(), "leading_cause", 2021))
    assert "Share of the leaves' carbon uptake lost to heat" in text


def test_a_crop_without_flowering_window_says_so(result_maker: Maker) -> None:
    text = printed(map_page(result_maker(flowering=False), "lost_to_heat", 2021))
    assert "no flowering window" in text and "at flowering above" not in text


def test_dollars_and_backslashes_stay_letters(tmp_path: Path, result_maker: Maker) -> None:
    page = map_page(result_maker(label=r"Maize $\frac{1}{2}$ <script>"), "hot_days", 2021)
    assert r"$\frac{1}{2}$" in printed(page)
    page.save(tmp_path / "map.png", {})


def test_kinds_of_cells_are_told_apart(result_maker: Maker) -> None:
    result = result_maker(10, 10)
    found = kinds.categories(result, classes_for("lost_to_heat_share"), 2021)
    status = result["cell_status"].values
    share = result["lost_to_heat_share"].values[0]
    assert (found[status == 1] == kinds.NO_CROP).all() and (found[status == 2] == kinds.NO_DATA).all()
    assert (found[status >= 3] == kinds.NOT_COMPUTED).all()
    assert (found[share == 0.0] == kinds.NONE).all() and (share == 0.0).any()
    first = kinds.categories(result, classes_for("first_hot_day"), 2021)
    assert (first[(status == 0) & (result["hot_days"].values[0] == 0)] == kinds.NO_VALUE).all()


def test_a_small_gain_is_not_none(result_maker: Maker) -> None:
    result = result_maker(1, 2)
    result["lost_to_heat_share"].values[...] = [[[-0.002, 0.0]]]
    found = kinds.categories(result, classes_for("lost_to_heat_share"), 2021)
    assert found.tolist() == [[0, kinds.NONE]]


def test_blocks_show_what_most_of_their_cells_show() -> None:
    found = np.array([[1, 1, 4], [1, 2, 4], [3, 3, 2]], dtype=np.int8)
    assert kinds.coarser(found, 2).tolist() == [[1, 4], [3, 2]]
    assert kinds.coarser(found, 3) is found


def test_a_large_map_is_drawn_in_few_cells(tmp_path: Path, result_maker: Maker) -> None:
    small = result_maker(20, 20)[["hot_days", "cell_status", "season_start", "season_end", "hot_day_limit"]]
    large = small.isel(lat=np.arange(2000) // 100, lon=np.arange(2400) // 120)
    large = large.assign_coords(
        lat=("lat", np.linspace(44.0, 45.0, 2000), small["lat"].attrs),
        lon=("lon", np.linspace(8.0, 9.0, 2400), small["lon"].attrs),
    )
    map_figure(large, "hot_days", 2021, tmp_path / "map.png")
    assert max(Image.open(tmp_path / "map.png").size) < 3000


@pytest.mark.parametrize("latitude", [0.0, 45.0, 60.0])
def test_the_scale_bar_has_the_true_length_in_degrees(result_maker: Maker, latitude: float) -> None:
    result = result_maker(5, 5)
    result = result.assign_coords(lat=("lat", latitude + 0.05 * np.arange(-2, 3), result["lat"].attrs))
    length, label = scale_bar(map_grid(result), 12.0, 1.25) or (0.0, "")
    # On paper 12 inches are one degree; along the parallel this many km (pyproj's ellipsoid)
    degree = pyproj.Geod(ellps="WGS84").inv(-0.005, latitude, 0.005, latitude)[2] * 0.1
    assert float(label.removesuffix(" km")) == pytest.approx(length / 12.0 * degree, rel=1e-4)
    assert length <= 1.25 and label.endswith(" km")


@pytest.mark.parametrize(
    ("crs", "unit", "places", "stretch"),
    [
        # UTM at its central meridian: 0.9996 of the ground
        ("EPSG:32632", 1.0, (500_000.0, 5_000_000.0), 0.9996),
        # The same projection in kilometres
        ("+proj=utm +zone=32 +datum=WGS84 +units=km", 1000.0, (500.0, 5000.0), 0.9996),
        # Web Mercator at 60 degrees north doubles lengths (1 / cos, on the ellipsoid 1.9950)
        ("EPSG:3857", 1.0, (1_000_000.0, 8_399_737.9), 1.9950),
    ],
)
def test_the_scale_bar_has_the_true_length_in_projections(
    result_maker: Maker, crs: str, unit: float, places: tuple[float, float], stretch: float
) -> None:
    steps = (np.arange(5) - 2) * 1000.0 / unit
    result = with_axes(result_maker(5, 5, projected=True), places[1] + steps, places[0] + steps, crs)
    grid = map_grid(result)
    inches = 0.5 * unit / 1000.0
    length, label = scale_bar(grid, inches, 1.25) or (0.0, "")
    shown, name = label.split(" ")
    metres = float(shown) * {"km": 1000.0, "m": 1.0}[name]
    assert metres == pytest.approx(length / inches * unit / stretch, rel=1e-3)


def test_the_scale_bar_says_where_it_holds_when_the_map_is_tall(result_maker: Maker) -> None:
    result = result_maker(5, 5)
    tall = result.assign_coords(lat=("lat", np.array([30.0, 37.5, 45.0, 52.5, 60.0]), result["lat"].attrs))
    assert (scale_bar(map_grid(tall), 0.2, 1.25) or (0.0, ""))[1].endswith("(at 45° N)")
    assert scale_bar(map_grid(result_maker(1, 1)), 1.0, 1.25) is None


def test_north_is_up_only_where_it_is(result_maker: Maker) -> None:
    result = result_maker(5, 5, projected=True)
    assert map_grid(result_maker()).north_is_up and map_grid(result).north_is_up
    # Far from the central meridian of a conic projection the meridians lean by many degrees
    leaning = with_axes(result, 5.5e6 + 1e4 * np.arange(5), 6.0e6 + 1e4 * np.arange(5), "EPSG:3035")
    assert not map_grid(leaning).north_is_up
    text = [one.get_text() for one in map_page(leaning, "hot_days", 2021).paper.texts]
    assert "N" not in text
    assert "N" in [one.get_text() for one in map_page(result, "hot_days", 2021).paper.texts]


def test_without_a_system_there_is_no_scale_and_no_arrow(result_maker: Maker) -> None:
    placeless = result_maker(5, 5, projected=True).drop_vars("spatial_ref")
    text = printed(map_page(placeless, "hot_days", 2021))
    assert " km" not in text and "Coordinates" not in text


def test_longitudes_beyond_180_are_printed_west(result_maker: Maker) -> None:
    result = result_maker(5, 5)
    result = result.assign_coords(lon=("lon", 250.0 + 0.05 * np.arange(5), result["lon"].attrs))
    page = map_page(result, "hot_days", 2021)
    labels = [label.get_text() for label in page.figure.axes[1].get_xticklabels()]
    assert labels and all(label.endswith("° W") for label in labels)


@pytest.mark.parametrize("descending", [False, True])
def test_the_north_of_the_grid_is_the_upper_end_of_the_map(result_maker: Maker, descending: bool) -> None:
    result = result_maker(4, 4, descending=descending)
    result["hot_days"].values[...] = np.where(result["lat"].values > 44.12, 50.0, 0.0)[None, :, None]
    page = map_page(result, "hot_days", 2021)
    page.figure.canvas.draw()
    pixels = np.asarray(page.figure.canvas.buffer_rgba())[..., :3]
    box = page.figure.axes[1].get_window_extent()
    middle, height = int(0.5 * (box.x0 + box.x1)), pixels.shape[0]
    upper, lower = pixels[height - int(box.y1) + 20, middle], pixels[height - int(box.y0) - 20, middle]
    assert upper.mean() < 60 and lower.mean() > 250


@pytest.mark.parametrize("measure", MEASURES)
def test_every_measure_can_be_drawn(result_maker: Maker, measure: str) -> None:
    assert map_page(result_maker(5, 6), measure, 2021).height > 3.0


def test_lines_are_broken_between_words_but_not_inside_a_measure() -> None:
    text = "hot day: highest air temperature above 35 °C until 20 June 2021 and so on " * 3
    for width in np.linspace(1.0, 3.0, 15):
        lines = broken(text, width)
        assert all(text_width(line) <= width for line in lines)
        assert " ".join(lines).replace("\N{NO-BREAK SPACE}", " ").split() == text.split()
        assert not any(line.startswith("°C") for line in lines)
    assert "".join(broken("x" * 100, 1.0)) == "x" * 100


def test_round_lengths() -> None:
    assert [round_below(length) for length in (1.0, 1.9, 2.0, 4.99, 5.0, 9.0, 10.0, 0.3)] == [
        1.0,
        1.0,
        2.0,
        2.0,
        5.0,
        5.0,
        10.0,
        0.2,
    ]
