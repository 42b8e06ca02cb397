"""A run file that is the same as another."""

import pytest

from cropstress.errors import InputError
from cropstress.runfile import load_runfile

BASE = """
title = "Base"
[seasons]
years = [2003]
[weather]
files = ["grids/*.nc"]
credit = "the weather office"
[weather.variables.tmax]
unit = "K"
[places]
districts = "d.gpkg"
elevation = { file = "z.nc" }
[[crops]]
name = "maize"
sowing = { grid = "sowing.nc" }
area = "area.nc"
[[crops]]
name = "wheat"
sowing = "1 March"
profile = "profiles/own.toml"
[output]
folder = "out"
"""


@pytest.fixture
def written(tmp_path):
    def write(name, text):
        path = tmp_path / name
        path.parent.mkdir(parents=True, exist_ok=True)
        path.write_text(text, encoding="utf-8")
        return path

    return write


def test_tables_merge_key_by_key_and_crops_by_name(written):
    written("base.toml", BASE)
    run = load_runfile(
        written(
            "child.toml",
            'same_as = "base.toml"\n[weather.variables.tmax]\nname = "tx"\n[model]\nacclimation = true\n'
            '[[crops]]\nname = "maize"\nsowing = "1 May"\n[[crops]]\nname = "rice"\nsowing = "1 June"\n',
        )
    )
    assert run.title == "Base" and run.model.acclimation
    assert run.weather.variable_specs() == {"tmax": {"name": "tx", "unit": "K"}}
    assert run.weather.credit == "the weather office"
    assert [entry.name for entry in run.crops] == ["maize", "wheat", "rice"]
    # A crop entry of the same name is replaced as a whole: no area is left.
    assert run.crops[0].sowing_spec() == "1 May" and run.crops[0].area_spec() is None


def test_results_never_go_to_the_folder_of_the_other_run(written):
    written("base.toml", BASE)
    run = load_runfile(written("child.toml", 'same_as = "base.toml"\n'))
    assert run.resolved()["output"]["folder"] == "results/child"


def test_paths_stay_those_of_the_file_that_holds_them(written, tmp_path):
    written("base/base.toml", BASE)
    written("middle/middle.toml", 'same_as = "../base/base.toml"\n[air]\nco2 = 500\n')
    child = written("child/child.toml", 'same_as = "../middle/middle.toml"\n[places]\nelevation = "own.nc"\n')
    run = load_runfile(child)
    assert run.resolve(run.places.districts).resolve() == (tmp_path / "base/d.gpkg").resolve()
    assert (
        run.resolve(run.crops[0].sowing_spec()["grid"]).resolve() == (tmp_path / "base/sowing.nc").resolve()
    )
    assert run.resolve(run.crops[0].area_spec()).resolve() == (tmp_path / "base/area.nc").resolve()
    assert run.resolve(run.crops[1].profile).resolve() == (tmp_path / "base/profiles/own.toml").resolve()
    assert run.crops[0].profile == "maize"
    assert run.resolve(run.weather.files[0]).parent.resolve() == (tmp_path / "base/grids").resolve()
    assert run.places.elevation_spec() == "own.nc"
    assert run.co2(2003) == 500.0


def test_faults_name_the_file_that_holds_them(written):
    written("base.toml", BASE.replace("credit", "kredit"))
    path = written("child.toml", 'same_as = "base.toml"\n[model]\ncanopy = "x"\n')
    with pytest.raises(InputError) as caught:
        load_runfile(path)
    places = {fault.where for fault in caught.value.faults}
    assert "base.toml: weather" in places and "child.toml: model.canopy" in places


def test_a_circle_and_a_missing_file(written):
    path = written("a.toml", 'same_as = "b.toml"\n')
    written("b.toml", 'same_as = "a.toml"\n')
    with pytest.raises(InputError, match="the same as itself"):
        load_runfile(path)
    path = written("c.toml", 'same_as = "none.toml"\n')
    with pytest.raises(InputError, match=r"none\.toml: there is no such file"):
        load_runfile(path)
