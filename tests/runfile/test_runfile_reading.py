"""The run file: defaults, paths, and every fault in one list."""

import json

import pytest

from cropstress.errors import InputError
from cropstress.runfile import load_runfile

LEAST = """
[seasons]
years = 2003

[weather]
files = "grids/*.nc"

[[crops]]
name = "maize"
sowing = "25 April"
"""


@pytest.fixture
def written(tmp_path):
    def write(text, name="season.toml"):
        path = tmp_path / name
        path.parent.mkdir(parents=True, exist_ok=True)
        path.write_text(text, encoding="utf-8")
        return path

    return write


def faults_of(path):
    with pytest.raises(InputError) as caught:
        load_runfile(path)
    return caught.value.faults


def said(path):
    return "\n".join(map(str, faults_of(path)))


def test_the_least_run_file_gets_every_default(written):
    run = load_runfile(written(LEAST))
    assert run.title == "season"
    assert run.seasons.years == [2003] and run.seasons.allowed_missing == 0.1
    assert run.weather.files == ["grids/*.nc"]
    assert run.co2(2003) == 421.0
    assert (run.model.canopy, run.model.acclimation, run.model.least_potential) == (
        "sunlit_shaded",
        False,
        1.0,
    )
    assert run.crops[0].profile == "maize" and run.crops[0].stages == "days"
    assert run.crops[0].sowing_spec() == "25 April" and run.crops[0].area_spec() is None
    assert run.profiles()["maize"].number("heat_onset") == 33.0


def test_paths_are_relative_to_the_run_file(written, tmp_path):
    run = load_runfile(written(LEAST, "configs/season.toml"))
    assert run.resolve("grids/a.nc") == tmp_path / "configs/grids/a.nc"
    assert run.resolve(str(tmp_path / "b.nc")) == tmp_path / "b.nc"
    assert run.output_folder == tmp_path / "configs/results/season"


def test_a_full_run_file(written):
    run = load_runfile(
        written(
            """
title = "Summer"
[seasons]
years = [2003, 2004]
through = 2004-08-31
allowed_missing = 0.2
[weather]
files = ["a.nc", "b.nc"]
credit = "the weather office"
[weather.variables.wind]
name = "ws"
unit = "m s-1"
cell_method = "mean"
height = 10
[air]
co2 = { 2003 = 376, "2004" = 377.5 }
[places]
districts = "districts.gpkg"
layer = "areas"
id_field = "code"
name_field = "name"
elevation = { file = "elevation.nc", name = "z" }
[[crops]]
name = "maize-late"
label = "Late maize"
profile = "maize"
sowing = { table = "sowing.csv", code = "district", date = "sown" }
area = { file = "area.nc", name = "maize", unit = "ha" }
stages = "thermal_time"
changes = { heat_onset = { value = 34, source = "our trial 2020" } }
[[crops]]
name = "wheat"
sowing = 2003-03-01
area = "share.nc"
[[crops]]
name = "rice"
sowing = { grid = "sowing.nc" }
[model]
canopy = "leaf"
acclimation = true
least_potential = 2
[maps]
measures = ["warm_nights"]
[output]
folder = "out"
[compute]
threads = 2
"""
        )
    )
    assert run.seasons.through == "2004-08-31"
    assert run.weather.variable_specs() == {
        "wind": {"name": "ws", "unit": "m s-1", "cell_method": "mean", "height": 10.0}
    }
    assert (run.co2(2003), run.co2(2004)) == (376.0, 377.5)
    assert run.places.elevation_spec() == {"file": "elevation.nc", "name": "z"}
    late, wheat, rice = run.crops
    assert late.sowing_spec() == {"table": "sowing.csv", "code": "district", "date": "sown"}
    assert late.area_spec() == {"file": "area.nc", "name": "maize", "unit": "ha"}
    assert (wheat.sowing_spec(), wheat.area_spec()) == ("2003-03-01", "share.nc")
    assert rice.sowing_spec() == {"grid": "sowing.nc"}
    profile = run.profiles()["maize-late"]
    assert profile.number("heat_onset") == 34.0 and profile.changed == ("heat_onset",)
    assert run.compute.threads == 2 and run.output_folder.name == "out"


def test_resolved_holds_every_default_and_no_absolute_path(written, tmp_path):
    text = LEAST.replace('"grids/*.nc"', f"['grids/*.nc', '{tmp_path.as_posix()}/x.nc', 'C:\\data\\y.nc']")
    resolved = load_runfile(written(text)).resolved()
    assert resolved == json.loads(json.dumps(resolved))
    assert resolved["weather"]["files"] == ["grids/*.nc", "x.nc", "y.nc"]
    assert resolved["air"] == {"co2": 421.0}
    assert resolved["output"] == {"folder": "results/season"}
    assert resolved["seasons"] == {"years": [2003], "through": None, "allowed_missing": 0.1}
    assert tmp_path.as_posix() not in json.dumps(resolved)


def test_all_faults_come_in_one_list(written):
    text = said(
        written(
            """
files = "x.nc"
[seasons]
years = [2003, "2004"]
allowed_mising = 0.2
through = "2003-13-01"
[weather]
files = []
[weather.variables.tmax]
units = "K"
cell_method = "maximun"
[air]
co2 = 40
[model]
canopy = "leaves"
acclimation = "yes"
[[crops]]
name = "wheat late"
profile = "wheat"
sowing = { tabel = "sowing.csv" }
[[crops]]
name = "barley"
changes = { hot_day_limit = { value = 31 } }
[[crops]]
name = "rye"
sowing = "1 October"
water = "rain"
[[crops]]
name = "maze"
sowing = "1 May"
changes = { heat_onset = { value = 34, source = "our trial" } }
[sureness]
"""
        )
    )
    for words in (
        "season.toml: unknown key 'files'\n    It belongs in [weather].",
        'season.toml: seasons.years: expected a whole number, found the text "2004"',
        "season.toml: seasons: unknown key 'allowed_mising'\n    Did you mean 'allowed_missing'?",
        'seasons.through: "2003-13-01" is not a date',
        "weather.files: expected at least one entry, found an empty list",
        "weather.variables.tmax: unknown key 'units'\n    Did you mean 'unit'?",
        "Did you mean 'maximum'?",
        "air.co2: expected a number not below 50, found 40",
        "model.canopy: expected 'sunlit_shaded' or 'leaf', found the text \"leaves\"",
        "Did you mean 'leaf'?",
        'model.acclimation: expected true or false, found the text "yes"',
        'crop wheat late: name: "wheat late" cannot be part of a file name',
        "crop wheat late: sowing: unknown key 'tabel'\n    Did you mean 'table'?",
        "crop barley: the key 'sowing' is missing",
        "crop barley: changes.hot_day_limit: the key 'source' is missing",
        "crop rye: unknown key 'water'",
        "crop maze: profile: there is no crop profile named 'maze'\n    Did you mean 'maize'?",
        "unknown key 'sureness'",
    ):
        assert words in text


@pytest.mark.parametrize("second", ["maize", "Maize"])
def test_two_entries_of_one_name(written, second):
    more = f'[[crops]]\nname = "{second}"\nprofile = "maize"\nsowing = "1 May"\n'
    (fault,) = faults_of(written(LEAST + more))
    assert "2 crop entries named" in fault.what


@pytest.mark.parametrize(
    ("more", "words"),
    [
        ("[air]\nco2 = { 2004 = 380 }\n", "air.co2: no value for 2003"),
        ("[air]\nco2 = { 203 = 380 }\n", '"203" is not a year'),
        ("[compute]\nthreads = 0\n", "compute.threads: expected a number not below 1"),
        ("[compute]\nmemory = '4GB'\n", "unknown key 'memory'"),
        ("[output]\nkeep = true\n", "unknown key 'keep'"),
        ("[places]\nelevation = 5\n", "places.elevation: expected a text"),
    ],
)
def test_single_faults(written, more, words):
    assert words in said(written(LEAST + more))


def test_sowing_by_district_needs_districts(written):
    path = written(LEAST.replace('"25 April"', '{ table = "sowing.csv" }'))
    assert "sowing by district needs districts" in said(path)
    path = written(path.read_text() + '[places]\ndistricts = "d.gpkg"\n')
    # Without names of its own, the table's columns are the usual ones.
    assert load_runfile(path).crops[0].sowing_spec() == {
        "table": "sowing.csv",
        "code": "code",
        "date": "date",
    }


def test_a_year_listed_twice(written):
    text = said(written(LEAST.replace("2003", "[2003, 2003]")))
    assert "the year 2003 is listed twice" in text


def test_profile_faults_are_found_together(written):
    more = (
        '[[crops]]\nname = "potato"\nsowing = "1 May"\nstages = "thermal_time"\n'
        '[[crops]]\nname = "rice"\nsowing = "1 May"\n'
        'changes = { leaf_width = { value = 12, source = "x" } }\n'
    )
    run = load_runfile(written(LEAST + more))
    with pytest.raises(InputError) as caught:
        run.profiles()
    text = str(caught.value)
    assert "crop potato: stages: the profile 'potato' has no thermal sums" in text
    assert "season.toml: crop rice: changes: leaf_width: value = 12 m is outside the physical range" in text


def test_own_profile_is_found_beside_the_run_file(written):
    own = 'based_on = "maize"\nname = "early"\n[values.mid_days]\nvalue = 40\nsource = "catalogue"\n'
    written(own, "profiles/early.toml")
    run = load_runfile(written(LEAST + 'profile = "profiles/early.toml"\n'))
    assert run.profiles()["maize"].days == (30, 40, 40, 30)


def test_a_backslash_that_is_no_escape(written):
    (fault,) = faults_of(written(LEAST.replace('"grids/*.nc"', '"C:\\grids\\*.nc"')))
    assert fault.where == "season.toml, line 6" and "backslash" in fault.what
    assert "forward slashes" in fault.remedy and "single quotes" in fault.remedy


def test_a_backslash_that_became_a_line_end(written):
    (fault,) = faults_of(written(LEAST.replace('"grids/*.nc"', '"grids\\new.nc"')))
    assert fault.where == "season.toml: weather.files" and "backslash" in fault.what


def test_a_backslash_in_single_quotes_is_fine(written):
    run = load_runfile(written(LEAST.replace('"grids/*.nc"', "'grids\\new.nc'")))
    assert run.weather.files == ["grids\\new.nc"]


def test_missing_file_and_broken_toml(written, tmp_path):
    assert "no such file" in faults_of(tmp_path / "none.toml")[0].what
    (fault,) = faults_of(written("title = \n"))
    assert fault.where == "season.toml, line 1"
