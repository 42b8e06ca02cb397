"""What `cropstress crops` prints."""

import pytest

from cropstress.crops import available_crops, describe_crop, describe_crops, load_crop


def test_one_line_for_each_crop():
    lines = describe_crops()
    for name in available_crops():
        (line,) = (line for line in lines if line.startswith(f"{name} "))
        assert load_crop(name).latin in line
    (maize,) = (line for line in lines if line.startswith("maize "))
    assert maize.split()[:6] == ["maize", "C4", "33", "35", "35", "150"]
    (potato,) = (line for line in lines if line.startswith("potato "))
    assert potato.split()[4] == "none"


@pytest.mark.parametrize("name", ["maize", "soybean", "potato"])
def test_every_value_is_printed_with_all_that_is_known(name):
    crop = load_crop(name)
    text = " ".join(" ".join(describe_crop(crop)).split())
    for key, value in (crop.values | crop.kinetics).items():
        assert f"{key} = {value.value:g}" in text
        assert " ".join(value.meaning.split()) in text
        assert " ".join(f"Source: {value.source}".split()) in text
        assert value.status in text


def test_units_ranges_and_confidence_stand_beside_the_value():
    lines = describe_crop(load_crop("maize"))
    assert "heat_onset = 33 degC  (29 to 36)  chosen here, medium confidence" in lines
    assert "hot_day_limit = 35 degC  (32 to 38)  read" in lines


def test_changes_and_absent_values_are_told():
    crop = load_crop("potato", {"hot_day_limit": {"value": 31, "source": "ours"}})
    text = "\n".join(describe_crop(crop))
    assert "Changed by you: hot_day_limit." in text
    assert "Not in this profile: flowering_limit" in text
