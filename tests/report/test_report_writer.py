"""The output folder: its layout, and what is never overwritten or removed."""

from __future__ import annotations

import json
import os
from collections.abc import Callable
from pathlib import Path

import numpy as np
import pytest
import xarray as xr

from cropstress.errors import InputError
from cropstress.report.folder import check_folder, claim_folder
from cropstress.report.writer import write_report

Maker = Callable[..., xr.Dataset]


def files_in(folder: Path) -> set[str]:
    return {path.relative_to(folder).as_posix() for path in folder.rglob("*") if path.is_file()}


def test_the_layout(tmp_path: Path, result_maker: Maker) -> None:
    folder = tmp_path / "results"
    told: list[str] = []
    report = write_report(
        [result_maker(4, 5), result_maker(4, 5, crop="barley-late", label="Barley", flowering=False)],
        folder,
        title="Summer",
        measures=["hot_hours", "hot_hours", "warm_nights_flowering"],
        areas={"maize": np.ones((4, 5))},
        record={"seconds": 1.0, "run_file": {"title": "Summer"}, "remarks": ["told before"]},
        progress=told.append,
    )
    expected = {"run.json"}
    for crop in ("maize", "barley-late"):
        expected |= {f"grids/{crop}-observed.nc"}
        expected |= {f"tables/{crop}-observed-{name}.csv" for name in ("seasons", "stages", "ten_days")}
        measures = ["lost_to_heat_share", "hot_days", "leading_cause", "hot_hours"]
        if crop == "maize":
            measures += ["hot_days_flowering", "warm_nights_flowering"]
        expected |= {f"maps/{crop}-2021-observed-{name}.{end}" for name in measures for end in ("tif", "png")}
    assert files_in(folder) == expected == {path.as_posix() for path in report.files}
    assert len(told) == len(expected) - 1
    record = json.loads((folder / "run.json").read_text(encoding="utf-8"))
    assert record["title"] == "Summer" and record["finished"] is True and record["seconds"] == 1.0
    assert {entry["name"] for entry in record["outputs"]} == expected - {"run.json"}
    assert record["remarks"][0] == "told before"
    assert any("warm_nights_flowering for barley-late" in remark for remark in report.remarks)


def test_the_same_title_replaces_its_files_and_keeps_what_was_changed(
    tmp_path: Path, result_maker: Maker
) -> None:
    folder = tmp_path / "results"
    wheat = result_maker(2, 2, crop="wheat")
    write_report([result_maker(2, 2), wheat], folder, title="Summer")
    (folder / "tables" / "wheat-observed-seasons.csv").write_text("edited by hand")
    (folder / "notes.txt").write_text("mine")
    report = write_report([result_maker(2, 2)], folder, title="Summer")
    left = {name for name in files_in(folder) if "wheat" in name}
    assert left == {"tables/wheat-observed-seasons.csv"}
    assert (folder / "notes.txt").read_text() == "mine"
    assert any("changed by hand" in remark for remark in report.remarks)
    assert any("were removed" in remark for remark in report.remarks)


def test_another_run_and_other_things_are_left_alone(tmp_path: Path, result_maker: Maker) -> None:
    folder = tmp_path / "results"
    claim_folder(folder, "Summer")
    with pytest.raises(InputError, match='holds another run, "Summer"; this one is "Winter"'):
        write_report([result_maker(2, 2)], folder, title="Winter")
    other = tmp_path / "photos"
    other.mkdir()
    (other / "beach.jpg").write_bytes(b"")
    with pytest.raises(InputError, match=r"something else \(beach.jpg\)"):
        write_report([result_maker(2, 2)], other, title="Winter")
    assert files_in(other) == {"beach.jpg"} and files_in(folder) == {"run.json"}
    file = tmp_path / "file"
    file.write_text("")
    with pytest.raises(InputError, match="is a file, not a folder"):
        check_folder(file, "Winter")


def test_new_empty_and_unfinished_folders_may_be_used(tmp_path: Path) -> None:
    check_folder(tmp_path / "new", "Summer")
    assert not (tmp_path / "new").exists()
    (tmp_path / ".parts").mkdir()
    check_folder(tmp_path, "Summer")
    claim_folder(tmp_path, "Summer")
    assert json.loads((tmp_path / "run.json").read_text())["finished"] is False
    claim_folder(tmp_path, "Summer")


@pytest.mark.parametrize("text", ["not json", "[1, 2]"])
def test_a_record_that_cannot_be_read(tmp_path: Path, text: str) -> None:
    (tmp_path / "run.json").write_text(text)
    with pytest.raises(InputError, match=r"run\.json"):
        claim_folder(tmp_path, "Summer")


def test_no_file_outside_the_folder_is_ever_removed(tmp_path: Path, result_maker: Maker) -> None:
    folder = tmp_path / "results"
    write_report([result_maker(2, 2)], folder, title="Summer")
    outside = tmp_path / "outside.csv"
    outside.write_text("x")
    record = json.loads((folder / "run.json").read_text(encoding="utf-8"))
    digest = "2d711642b726b04401627ca9fbac32f5c8530fb1903cc4db02258717921a4881"
    record["outputs"].append({"name": "../outside.csv", "size": 1, "sha256": digest})
    (folder / "run.json").write_text(json.dumps(record))
    write_report([result_maker(2, 2)], folder, title="Summer")
    assert outside.exists()


def test_no_permission(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    def refuse(*_: object) -> None:
        raise PermissionError(13, "Permission denied")

    monkeypatch.setattr(os, "replace", refuse)
    with pytest.raises(InputError, match=r"no permission to write run\.json"):
        claim_folder(tmp_path / "results", "Summer")


def test_two_results_of_one_name(tmp_path: Path, result_maker: Maker) -> None:
    with pytest.raises(InputError, match="two results would be written to one file"):
        write_report([result_maker(2, 2), result_maker(2, 2, crop="Maize")], tmp_path / "a", title="Summer")
    assert not (tmp_path / "a").exists()


def test_all_unknown_measures_are_told_at_once(tmp_path: Path, result_maker: Maker) -> None:
    with pytest.raises(InputError) as caught:
        write_report([result_maker(2, 2)], tmp_path / "a", title="S", measures=["hot_dais", "xyz"])
    assert len(caught.value.faults) == 2 and not (tmp_path / "a").exists()


def test_a_grid_that_geotiff_cannot_hold_still_has_its_other_files(
    tmp_path: Path, result_maker: Maker
) -> None:
    placeless = result_maker(4, 4, projected=True).drop_vars("spatial_ref")
    report = write_report([placeless], tmp_path / "a", title="Summer")
    assert not any(path.suffix == ".tif" for path in report.files)
    assert any("no GeoTIFF for maize" in remark for remark in report.remarks)
    assert any(path.suffix == ".png" for path in report.files)
