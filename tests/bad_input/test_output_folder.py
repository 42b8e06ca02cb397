"""Output folders that cannot be used or fail on the way; what is computed is not lost, nothing is half-written."""

from __future__ import annotations

import errno
import json
import os
import shutil
from collections import namedtuple
from collections.abc import Callable
from pathlib import Path

import netCDF4
import pytest
from spoilt_season import RADIATION, Command, Season, Stops

OTHER = "with --out or with `folder` in [output]"


def test_another_run(season: Season, stops: Stops) -> None:
    season.results.mkdir()
    (season.results / "run.json").write_text('{"title": "Another summer"}')
    stops('results: the output folder holds another run, "Another summer"; this one is "Bad input"', OTHER)


def test_something_else(season: Season, stops: Stops) -> None:
    season.results.mkdir()
    (season.results / "beach.jpg").write_bytes(b"")
    stops("results: the output folder holds something else (beach.jpg)", OTHER)


@pytest.mark.parametrize("text", ["not json", "[]", '{"title": "Bad input", "outputs": [{"file": 1}]}'])
def test_a_record_that_is_none(season: Season, stops: Stops, text: str) -> None:
    season.results.mkdir()
    (season.results / "run.json").write_text(text)
    stops("run.json", "Move it away together with its folder.")


def test_a_file_in_its_place_or_above_it(season: Season, stops: Stops) -> None:
    season.results.write_text("")
    stops("results: results is a file, not a folder", OTHER)
    season.rewrite('folder = "results"', 'folder = "results/2021/maize"')
    stops("the output folder cannot be made, for results, which is above it, is a file", OTHER)


def test_no_permission(season: Season, stops: Stops, monkeypatch: pytest.MonkeyPatch) -> None:
    real = os.access
    monkeypatch.setattr(os, "access", lambda path, mode: not mode & os.W_OK and real(path, mode))
    text = stops("results: no permission to write to the output folder or to make it in ", OTHER)
    assert str(season.folder) in text


def test_no_room_before_the_run(season: Season, stops: Stops, monkeypatch: pytest.MonkeyPatch) -> None:
    usage = namedtuple("usage", "total used free")
    monkeypatch.setattr(shutil, "disk_usage", lambda _: usage(10**9, 10**9, 0))
    stops("results: no room is left on the disk of the output folder", "Free some space")


def _refuse(monkeypatch: pytest.MonkeyPatch, name: str, error: Callable[[], BaseException]) -> None:
    """Let the renaming of one file to its final name fail."""
    real = os.replace

    def replace(source: Path, target: Path) -> None:
        if Path(target).name == name:
            raise error()
        real(source, target)

    monkeypatch.setattr(os, "replace", replace)


def _whole(path: Path) -> bool:
    with netCDF4.Dataset(path) as file:
        return "hot_days" in file.variables


def test_open_in_another_program(season: Season, command: Command, monkeypatch: pytest.MonkeyPatch) -> None:
    """Simulated by the error that Windows gives; the new file is beside the old one, all grids are there."""
    assert command("run", season.run_file).code == 0
    table = season.results / "tables/maize-observed-seasons.csv"
    before = season.final_files()
    (season.results / "grids/wheat-observed.nc").unlink()
    table.write_text("as another program has it open")
    with monkeypatch.context() as patch:
        _refuse(patch, table.name, lambda: PermissionError(errno.EACCES, "Permission denied"))
        said = command("run", season.run_file)
    assert said.code == 2
    assert f"{table}: maize-observed-seasons.csv cannot be replaced; it is open in another program" in said.err
    assert "the new one is whole beside it, as maize-observed-seasons.new.csv" in said.err
    assert "Close it there (a map viewer, a spreadsheet) and run the same command again." in said.err
    assert "Kept, each file whole: grids/maize-observed.nc, grids/wheat-observed.nc; " in said.err
    assert "The grids hold all that was computed." in said.err
    assert table.read_text() == "as another program has it open"
    assert season.final_files() == before | {"tables/maize-observed-seasons.new.csv"}
    assert _whole(season.results / "grids/wheat-observed.nc")
    assert json.loads((season.results / "run.json").read_text(encoding="utf-8"))["finished"] is False
    # closed again, the same command finishes and clears up
    assert command("run", season.run_file).code == 0
    assert season.final_files() == before
    assert table.read_text() != "as another program has it open"


def test_no_room_on_the_way(season: Season, command: Command, monkeypatch: pytest.MonkeyPatch) -> None:
    """The first grid cannot be written, the second can: it is kept, and the list says which is not."""
    _refuse(monkeypatch, "maize-observed.nc", lambda: OSError(errno.ENOSPC, "No space left on device"))
    said = command("run", season.run_file)
    assert said.code == 2
    assert "no room left on the disk for maize-observed.nc\n     Free some space" in said.err
    assert "Kept, each file whole: grids/wheat-observed.nc; 0 tables and maps." in said.err
    assert "Not kept: grids/maize-observed.nc." in said.err
    assert season.final_files() == {"run.json", "grids/wheat-observed.nc"}
    assert _whole(season.results / "grids/wheat-observed.nc")


def test_a_write_that_fails_in_the_middle_of_a_file(
    season: Season, command: Command, monkeypatch: pytest.MonkeyPatch
) -> None:
    """As the NetCDF library tells it: with no reason, and the file half-written."""

    def half(self: object, file: netCDF4.Dataset, history: str) -> None:
        file.createDimension("x", 3)
        raise RuntimeError("NetCDF: HDF error")

    monkeypatch.setattr("cropstress.report.netcdf._Writer.write", half)
    said = command("run", season.run_file)
    assert said.code == 2
    assert "maize-observed.nc could not be written (NetCDF: HDF error)" in said.err
    assert "wheat-observed.nc could not be written (NetCDF: HDF error)" in said.err
    assert "Nothing could be kept of this run; run the same command again." in said.err
    assert season.final_files() == {"run.json"}


def test_files_of_an_earlier_run_that_are_held_open(
    season: Season, command: Command, monkeypatch: pytest.MonkeyPatch
) -> None:
    assert command("run", season.run_file).code == 0
    left = {name for name in season.final_files() if "wheat" in name}
    real = Path.unlink

    def held(self: Path, missing_ok: bool = False) -> None:
        if self.name.startswith("wheat"):
            raise PermissionError(errno.EACCES, "Permission denied")
        real(self, missing_ok)

    monkeypatch.setattr(Path, "unlink", held)
    said = command("run", season.run_file, "--only", "crop=maize")
    assert said.code == 0
    assert (
        "- grids/wheat-observed.nc of the earlier run is open in another program or protected and was kept" in said.out
    )
    assert left <= season.final_files()


def test_an_input_that_goes_before_it_is_read(
    season: Season, command: Command, monkeypatch: pytest.MonkeyPatch
) -> None:
    """The hashes of the input are taken before anything is computed, so that nothing is lost by it."""

    def gone(path: Path, name: str | None = None) -> None:
        raise FileNotFoundError(errno.ENOENT, "No such file or directory")

    monkeypatch.setattr("cropstress.run_faults.file_record", gone)
    said = command("run", season.run_file)
    assert said.code == 2
    assert f"{RADIATION}: the file can no longer be read" in said.err
    assert season.final_files() == set()
