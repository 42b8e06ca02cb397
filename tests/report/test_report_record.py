"""The record of a run names no machine and no person."""

from __future__ import annotations

import hashlib
import json
from pathlib import Path

import numpy as np
import pytest

from cropstress.report import record
from cropstress.report.record import file_record, versions, without_places, write_run_record


@pytest.fixture
def jane(monkeypatch: pytest.MonkeyPatch, tmp_path: Path) -> Path:
    """A home of an invented user."""
    home = tmp_path / "janedoe"
    home.mkdir()
    monkeypatch.setattr(record, "_user_name", lambda: "janedoe")
    monkeypatch.setattr(Path, "home", lambda: home)
    return home


def test_no_absolute_path_and_no_user_name(jane: Path, tmp_path: Path) -> None:
    path = tmp_path / "run.json"
    write_run_record(
        path,
        title="Summer",
        run_file={
            "weather": {
                "files": [str(jane / "grids" / "tmax_*.nc"), "grids/tmin.nc", "../../janedoe/x/rain.nc"]
            },
            "places": {"districts": "C:\\Users\\janedoe\\My Maps\\districts.gpkg", "area": "~/area.nc"},
            "path object": jane / "a.toml",
        },
        counts={str(jane / "grids" / "tmax.nc"): {"mended": np.int64(3), "share": np.float64(0.5)}},
        remarks=[
            f"{jane}/grids/tmax.nc: 3 days were mended",
            f'"{jane}/My Grids/rh.nc" holds a fraction (see {jane}/notes.txt).',
            "C:\\Users\\janedoe\\tmin.nc: units W m-2 or mol/m2/s, and/or 1/8 degree",
        ],
        seconds=3.5,
    )
    text = path.read_text(encoding="utf-8")
    assert "janedoe" not in text and str(tmp_path) not in text and "Users" not in text
    found = json.loads(text)
    assert found["run_file"]["weather"]["files"] == ["tmax_*.nc", "grids/tmin.nc", "x/rain.nc"]
    assert found["run_file"]["places"] == {"districts": "districts.gpkg", "area": "area.nc"}
    assert found["run_file"]["path object"] == "a.toml"
    assert found["counts"] == {"tmax.nc": {"mended": 3, "share": 0.5}}
    assert found["remarks"] == [
        "tmax.nc: 3 days were mended",
        '"rh.nc" holds a fraction (see notes.txt).',
        "tmin.nc: units W m-2 or mol/m2/s, and/or 1/8 degree",
    ]
    assert found["seconds"] == 3.5 and found["finished"] is True


def test_ordinary_words_are_kept() -> None:
    for text in (
        "mol CO2 m-2 / d",
        "30/40/50/30 = 150 d",
        "https://example.org/a/b",
        "grids/sub/*.nc",
        "0.5 W/m2 (a/b)",
        "kPa, hPa or Pa: kPa",
        "12:30/13:30",
    ):
        assert without_places(text) == text


def test_numbers_json_cannot_hold() -> None:
    found = without_places(
        {"a": float("nan"), "b": np.array([1.0, np.inf]), "c": (1, None, True), "d": {2: "x"}}
    )
    assert found == {"a": None, "b": [1.0, None], "c": [1, None, True], "d": {"2": "x"}}


def test_inputs_by_name_size_and_hash(tmp_path: Path) -> None:
    path = tmp_path / "tmax.nc"
    path.write_bytes(b"daily grids")
    found = file_record(path)
    assert (found.name, found.size) == ("tmax.nc", 11)
    assert found.sha256 == hashlib.sha256(b"daily grids").hexdigest()


def test_versions_of_what_can_change_a_number() -> None:
    found = versions()
    assert {"cropstress", "python", "numpy", "numba", "xarray", "netCDF4"} <= set(found)
