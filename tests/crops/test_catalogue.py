"""Finding profiles, changing them, and what is said when something is wrong."""

import pytest
from pydantic import ValidationError

from cropstress.crops import load_crop
from cropstress.errors import InputError


def faults_of(*arguments, **keywords):
    with pytest.raises(InputError) as caught:
        load_crop(*arguments, **keywords)
    return caught.value.faults


@pytest.fixture
def profile_file(tmp_path):
    def write(text, name="mine.toml"):
        path = tmp_path / name
        path.write_text(text, encoding="utf-8")
        return path

    return write


@pytest.mark.parametrize("written", ["pearl-millet", "pearl millet", "Pearl_Millet", " PEARL  MILLET "])
def test_two_words_may_be_joined_in_any_way(written):
    assert load_crop(written).name == "pearl-millet"


def test_unknown_crop_suggests_the_nearest():
    (fault,) = faults_of("maze")
    assert "maze" in fault.what and "Did you mean 'maize'?" in fault.remedy
    (fault,) = faults_of("triticale-winter-x")
    assert "Did you mean" not in fault.remedy and "wheat" in fault.remedy


def test_a_change_takes_value_and_source_and_keeps_the_range():
    crop = load_crop("maize", {"heat_onset": {"value": 34, "source": "our trial 2020"}})
    onset = crop.values["heat_onset"]
    assert (onset.value, onset.low, onset.high) == (34.0, 29.0, 36.0)
    assert (onset.source, onset.status, onset.confidence) == ("our trial 2020", "given by user", None)
    assert crop.changed == ("heat_onset",)
    assert load_crop("maize").number("heat_onset") == 33.0


def test_a_change_beyond_the_range_widens_it():
    crop = load_crop("maize", {"heat_onset": {"value": 37.5, "source": "our trial 2020"}})
    assert (crop.values["heat_onset"].low, crop.values["heat_onset"].high) == (29.0, 37.5)


def test_a_change_may_reach_the_kinetics_by_plain_or_dotted_name():
    change = {"value": 400.0, "source": "our own assay"}
    for name in ("michaelis_co2", "kinetics.michaelis_co2"):
        assert load_crop("wheat", {name: change}).kinetics["michaelis_co2"].value == 400.0


def test_all_faults_of_the_changes_come_at_once():
    faults = faults_of(
        "maize",
        {
            "heat_onset": {"value": 340, "low": 29, "high": 341, "source": "x"},
            "hot_day": {"value": 33, "source": "x"},
            "hot_day_limit": {"value": 33},
            "leaf_width": 0.05,
            "light_curvature": {"value": "steep", "source": "x"},
            "growth_temperature": {"value": 25, "source": "x"},
            "dry_air_limit": {"value": 20, "unit": "hPa", "source": "x"},
            "stomatal_slope": {"value": 1.5, "low": 1.6, "high": 2.0, "source": "x"},
            "initial_days": {"value": 20.5, "source": "x"},
            "mid_days": {"source": "x"},
        },
        where="season.toml: crop maize",
    )
    said = "\n".join(map(str, faults))
    assert "heat_onset: value = 340 degC is outside the physical range 10 to 50 degC" in said
    assert "'hot_day'" in said and "Did you mean 'hot_day_limit'?" in said
    assert "hot_day_limit: the changed value has no source" in said
    assert "leaf_width: a change is a table" in said
    assert "light_curvature: value: expected a number, found the text" in said
    assert "'growth_temperature'" in said
    assert "dry_air_limit: is given in 'hPa'" in said
    assert "stomatal_slope: low 1.6, value 1.5, high 2 are not in this order" in said
    assert "initial_days: value = 20.5 is not a whole number" in said
    assert "mid_days: the change has no value" in said
    assert all("season.toml: crop maize" in fault.where for fault in faults)


@pytest.mark.parametrize(
    ("changes", "words"),
    [
        ({"base_temperature": 24.0, "ceiling_temperature": 20.0}, "is not below ceiling_temperature"),
        ({"flowering_offset": -90}, "is outside the season"),
        ({"flowering_window_start": 20}, "starts on day 20 and ends on day 8"),
        ({"mid_days": 300, "late_days": 300, "development_days": 300}, "last 930 days together"),
    ],
)
def test_values_that_do_not_fit_each_other(changes, words):
    faults = faults_of("maize", {name: {"value": value, "source": "x"} for name, value in changes.items()})
    assert any(words in fault.what for fault in faults)


def test_part_of_a_group_is_not_enough():
    faults = faults_of("potato", {"flowering_limit": {"value": 30, "source": "x"}})
    missing = {fault.what for fault in faults}
    assert missing == {
        f"the value 'flowering_{name}' is missing" for name in ("offset", "window_start", "window_end")
    }


def test_a_whole_group_may_be_added():
    flowering = {"limit": 30, "offset": 5, "window_start": -5, "window_end": 5}
    changes = {f"flowering_{name}": {"value": value, "source": "x"} for name, value in flowering.items()}
    assert load_crop("potato", changes).flowering_window == (-5, 5)


def test_own_profile_lists_only_what_differs(profile_file):
    path = profile_file(
        'based_on = "maize"\nname = "maize-early"\nlabel = "Early maize"\n'
        '[values.mid_days]\nvalue = 40\nsource = "seed catalogue"\n'
    )
    crop = load_crop(path)
    assert (crop.name, crop.label, crop.latin) == ("maize-early", "Early maize", "Zea mays")
    assert crop.days == (30, 40, 40, 30)
    assert crop.values["mid_days"].status == "given by user"
    assert (crop.based_on, crop.changed) == ("maize", ("mid_days",))


def test_own_profile_may_start_from_another_file(profile_file):
    profile_file('based_on = "maize"\n[values.late_days]\nvalue = 35\nsource = "a"\n', "first.toml")
    path = profile_file(
        'based_on = "./first.toml"\n[values.mid_days]\nvalue = 45\nsource = "b"\n', "second.toml"
    )
    crop = load_crop(str(path))
    assert crop.days == (30, 40, 45, 35)
    assert crop.changed == ("late_days", "mid_days")


def test_own_profile_needs_sources_and_no_circle(profile_file):
    path = profile_file('based_on = "maize"\n[values.mid_days]\nvalue = 40\n')
    (fault,) = faults_of(path)
    assert "no source" in fault.what and fault.where == "profile mine.toml: mid_days"
    circle = profile_file('based_on = "./circle.toml"\n', "circle.toml")
    assert "based on itself" in faults_of(circle)[0].what


def test_own_profile_with_wrong_keys(profile_file):
    path = profile_file('based_on = "maize"\nlable = "x"\n[values]\nheat_onset = 30\n')
    said = "\n".join(map(str, faults_of(path)))
    assert "unknown key 'lable'" in said and "Did you mean 'label'?" in said
    assert "values.heat_onset: expected a table, found 30" in said


def test_kinetics_of_the_other_pathway_are_refused(profile_file):
    path = profile_file('based_on = "maize"\nkinetics_set = "bernacchi_2001"\n')
    assert "is for C3 leaves" in faults_of(path)[0].what
    path = profile_file('based_on = "maize"\nkinetics_set = "bernachi_2001"\n')
    assert "Did you mean 'bernacchi_2001'?" in faults_of(path)[0].remedy


def test_a_profile_from_nothing_says_all_that_is_missing(profile_file):
    path = profile_file(
        'name = "rye"\nlabel = "Rye"\nlatin = "Secale cereale"\npathway = "C3"\n'
        'kinetics_set = "bernacchi_2001"\n[values]\n'
    )
    missing = {fault.what for fault in faults_of(path)}
    assert "the value 'heat_onset' is missing" in missing
    assert "the value 'growth_temperature' is missing" in missing
    assert "the value 'flowering_limit' is missing" not in missing
    assert "the value 'pep_carboxylation_ratio' is missing" not in missing


@pytest.mark.parametrize(
    ("text", "line", "words"),
    [
        ('name = "rye"\nsource = "C:\\grids\\rye.txt"\n', 2, "backslash"),
        ('name = "rye"\n[values\n', 2, "not TOML"),
        ('name = "rye"\nlabel = \n', 2, "not TOML"),
    ],
)
def test_toml_errors_name_the_line(profile_file, text, line, words):
    (fault,) = faults_of(profile_file(text))
    assert fault.where == f"profile mine.toml, line {line}"
    assert words in fault.what
    assert (words == "backslash") == ("single quotes" in fault.remedy)


def test_files_that_cannot_be_read(tmp_path):
    assert "no such file" in faults_of(tmp_path / "none.toml")[0].what
    (tmp_path / "latin.toml").write_bytes("name = 'x'\nlabel = 'Rübe'\n".encode("latin-1"))
    assert "line 2 is not UTF-8" in faults_of(tmp_path / "latin.toml")[0].what


def test_number_of_an_unknown_name_suggests_the_nearest():
    with pytest.raises(InputError, match="Did you mean 'heat_onset'"):
        load_crop("maize").number("heat_onse")


def test_a_profile_cannot_be_changed_in_place():
    crop = load_crop("maize")
    with pytest.raises(ValidationError):
        crop.name = "other"
    with pytest.raises(ValidationError):
        crop.values["heat_onset"].value = 40.0
