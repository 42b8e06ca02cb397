"""What a run says and leaves behind: exit code, summary, the files, and a record without names or places."""

import hashlib
import json
import re
from pathlib import Path

import numpy as np
import pytest
from finished_run import CROPS, SAMPLE, USER, Run
from PIL import Image

from cropstress.season.measures import DRAWN

#: What every file that travels alone must carry, as words in it; the limits are those of the profiles.
CARRIED = {
    "maize": ("above 35 °C", "from 33 °C", "acclimation: none"),
    "wheat": ("above 32 °C", "at flowering above 30 °C", "from 26 °C", "acclimation: none; leaves used to 15 °C"),
    "potato": ("above 30 °C", "acclimation: none; leaves used to"),
}
CARRIED_BY_ALL = (
    "CO₂ 416.4 ppm", "assumes enough soil water", "weather data to 10 October 2021", "for screening only", "not yield",
)  # fmt: skip


def files_of(folder: Path) -> set[str]:
    return {path.relative_to(folder).as_posix() for path in folder.rglob("*") if path.is_file()}


def sha256(path: Path) -> str:
    return hashlib.sha256(path.read_bytes()).hexdigest()


def test_files_are_those_of_the_design_and_no_others(thinned_run: Run) -> None:
    assert thinned_run.process.returncode == 0, thinned_run.process.stderr
    expected = {"run.json"}
    for crop in CROPS:
        expected.add(f"grids/{crop}-observed.nc")
        expected |= {f"tables/{crop}-observed-{table}.csv" for table in ("seasons", "stages", "ten_days")}
        for measure in (*DRAWN, "hottest_temperature"):
            if crop != "potato" or measure != "hot_days_flowering":
                expected |= {f"maps/{crop}-2021-observed-{measure}.{ending}" for ending in ("tif", "png")}
    assert files_of(thinned_run.folder) == expected


def test_summary_tells_a_wrong_calendar_at_once(thinned_run: Run) -> None:
    said = thinned_run.process.stdout
    assert thinned_run.process.stderr == ""
    wheat = thinned_run.unwritten("wheat")
    for words in (
        "Wheat of the districts, harvest 2021",
        f"sown {int(np.nanmedian(wheat['sowing_day'])) - 90} April 2021",
        f"hottest day: {float(wheat['hottest_temperature'].max()):.1f} °C on ",
        "flowering none",
        "hot days (above 35 °C)",
        "this crop has no flowering window",
        "share lost to heat",
        "without weather data",
        "without this crop",
        "Modelled potential uptake of leaves, not yield.",
    ):
        assert words in re.sub(r"\s+", " ", said), words


def test_record_has_hashes_versions_counts_and_all_settings(thinned_run: Run) -> None:
    record = json.loads((thinned_run.folder / "run.json").read_text("utf-8"))
    assert record["finished"] is True
    assert {"cropstress", "python", "numpy", "numba", "xarray"} <= set(record["versions"])
    assert record["counts"] == {}
    assert record["seconds"] > 0
    assert record["run_file"]["model"] == {"canopy": "sunlit_shaded", "acclimation": False, "least_potential": 1.0}
    assert [crop["profile"] for crop in record["run_file"]["crops"]] == list(CROPS)
    grids = thinned_run.run_file.parent / "grids"
    inputs = {entry["name"]: entry for entry in record["inputs"]}
    # Grids, elevation, and the places: area, sowing days, districts and their table
    assert set(inputs) == {path.name for path in SAMPLE.glob("*.nc")} | {"districts.geojson", "sowing_by_district.csv"}
    for name, entry in inputs.items():
        assert entry["sha256"] == sha256(grids / name) and entry["size"] == (grids / name).stat().st_size
    outputs = {entry["name"]: entry["sha256"] for entry in record["outputs"]}
    assert set(outputs) == files_of(thinned_run.folder) - {"run.json"}
    assert all(digest == sha256(thinned_run.folder / name) for name, digest in outputs.items())


def test_no_file_tells_whose_machine_it_was(thinned_run: Run) -> None:
    """The user's name stands in the path of the run file, of the folder and of the home."""
    assert USER in str(thinned_run.folder)
    for path in thinned_run.folder.rglob("*.*"):
        content = path.read_bytes()
        assert USER.encode() not in content, path.name
        assert str(thinned_run.folder.parents[2]).encode() not in content, path.name
    text = (thinned_run.folder / "run.json").read_text("utf-8")
    values = re.findall(r'"((?:[^"\\]|\\.)*)"', text)
    assert [value for value in values if re.match(r"(/|~|[A-Za-z]:[\\/])", value)] == []


@pytest.mark.parametrize("crop", CROPS)
def test_every_figure_and_table_carries_its_assumptions(thinned_run: Run, crop: str) -> None:
    words = (*CARRIED[crop], *CARRIED_BY_ALL)
    figures = sorted((thinned_run.folder / "maps").glob(f"{crop}-*.png"))
    assert len(figures) == (4 if crop == "potato" else 5)
    for path in figures:
        with Image.open(path) as image:
            inside = image.text  # type: ignore[attr-defined]
        assert inside["Copyright"] == "Invented for tests"
        assert [each for each in words if each not in inside["Description"]] == [], path.name
    for path in (thinned_run.folder / "tables").glob(f"{crop}-*.csv"):
        rows = path.read_text("utf-8").splitlines()[1:]
        for row in rows:
            assert [each for each in (*words, "Invented for tests") if each not in row] == [], path.name


@pytest.mark.parametrize("crop", CROPS)
def test_figures_draw_what_they_carry(thinned_run: Run, crop: str) -> None:
    """The printed foot itself, not only what is tucked away inside the file."""
    from cropstress.report.figure import map_page

    page = map_page(thinned_run.unwritten(crop), "lost_to_heat_share", 2021)
    drawn = " ".join(text.get_text() for text in page.paper.texts).replace("\N{NO-BREAK SPACE}", " ")
    for words in (*CARRIED[crop], *CARRIED_BY_ALL, "Data: Invented for tests", "100 km", "N", "none: exactly 0"):
        assert words in drawn, words
