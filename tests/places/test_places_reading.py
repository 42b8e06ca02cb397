"""Districts, sowing, area and elevation: good files and everything that can be wrong with them."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

import numpy as np
import pytest
import shapely
import xarray as xr

from cropstress.errors import Fault, InputError
from cropstress.places import (
    Districts,
    cell_area_hectares,
    read_area,
    read_districts,
    read_elevation,
    read_sowing,
)

Write = Callable[..., str]


def fault(call: Callable[[], object]) -> Fault:
    """Return the only fault of a call that must fail."""
    with pytest.raises(InputError) as caught:
        call()
    assert len(caught.value.faults) == 1, str(caught.value)
    return caught.value.faults[0]


# --- districts


@pytest.mark.parametrize("crs", ["EPSG:4326", "EPSG:4267", "EPSG:3035"])
def test_districts(weather: xr.Dataset, write_districts: Write, tmp_path: Path, crs: str) -> None:
    districts = read_districts(write_districts(crs=crs), None, "code", "title", weather, tmp_path)
    assert districts.codes == ["0101", "0203"]
    assert districts.names == ["District 0101", "District 0203"]
    assert districts.index.dtype == np.int32
    assert districts.index.tolist() == [[0, 0, 1, -1]] * 3
    assert districts.shapes.crs == weather.rio.crs
    assert districts.remarks == []


def test_districts_and_longitudes_to_360(
    weather_of: Callable[..., xr.Dataset], write_districts: Write, tmp_path: Path
) -> None:
    weather = weather_of(longitude=np.array([349.0, 349.5, 350.0, 350.5]))
    file = write_districts(shapes=[shapely.box(-11.5, 39, -10.75, 42), shapely.box(-10.75, 39, -10.25, 42)])
    districts = read_districts(file, None, "code", None, weather, tmp_path)
    assert districts.index[0].tolist() == [0, 1, -1, -1]
    assert districts.names == ["0101", "0203"]


def test_parts_of_one_district(weather: xr.Dataset, write_districts: Write, tmp_path: Path) -> None:
    districts = read_districts(write_districts(codes=("0101", "0101")), None, "code", None, weather, tmp_path)
    assert districts.codes == ["0101"]
    assert districts.index[0].tolist() == [0, 0, 0, -1]
    assert len(districts.shapes) == 1


def test_invalid_outline_is_mended_and_told(
    weather: xr.Dataset, write_districts: Write, tmp_path: Path
) -> None:
    bow_tie = shapely.Polygon([(9.5, 39.5), (10.75, 41.5), (10.75, 39.5), (9.5, 41.5)])
    file = write_districts(shapes=[bow_tie, shapely.box(10.75, 39.5, 11.25, 41.5)])
    districts = read_districts(file, None, "code", None, weather, tmp_path)
    assert districts.remarks == ["districts.gpkg: 1 invalid outlines mended: 0101"]


def test_numbers_as_codes_are_told(weather: xr.Dataset, write_districts: Write, tmp_path: Path) -> None:
    districts = read_districts(write_districts(codes=(101, 203)), None, "code", None, weather, tmp_path)
    assert districts.codes == ["101", "203"]
    assert "leading zeros" in districts.remarks[0]


@pytest.mark.parametrize(
    ("layer", "id_field", "words", "remedy"),
    [
        ("distrikts", "code", "no layer 'distrikts'", "'districts'"),
        (None, "cod", "no field 'cod'", "'code'"),
        (None, None, "which field holds the code", "id_field"),
    ],
)
def test_layer_or_field_at_fault(
    weather: xr.Dataset,
    write_districts: Write,
    tmp_path: Path,
    layer: str | None,
    id_field: str | None,
    words: str,
    remedy: str,
) -> None:
    file = write_districts()
    found = fault(lambda: read_districts(file, layer, id_field, None, weather, tmp_path))
    assert words in found.what
    assert found.where == "districts.gpkg"
    assert remedy in found.remedy


@pytest.mark.filterwarnings("ignore:'crs' was not provided")
def test_districts_without_crs(weather: xr.Dataset, write_districts: Write, tmp_path: Path) -> None:
    file = write_districts(crs=None, file="districts.shp")
    found = fault(lambda: read_districts(file, None, "code", None, weather, tmp_path))
    assert "no coordinate reference system" in found.what
    assert "never guessed" in found.remedy


def test_districts_elsewhere(weather: xr.Dataset, write_districts: Write, tmp_path: Path) -> None:
    file = write_districts(shapes=[shapely.box(0, 0, 1, 1), shapely.box(1, 0, 2, 1)])
    found = fault(lambda: read_districts(file, None, "code", None, weather, tmp_path))
    assert "no cell of the weather grid lies in a district" in found.what
    assert "lat 40 to 41" in found.what


def test_points_are_no_districts(weather: xr.Dataset, write_districts: Write, tmp_path: Path) -> None:
    file = write_districts(shapes=[shapely.Point(10, 40), shapely.Point(11, 40)])
    assert (
        "districts are polygons"
        in fault(lambda: read_districts(file, None, "code", None, weather, tmp_path)).what
    )


def test_districts_file_missing_or_damaged(weather: xr.Dataset, tmp_path: Path) -> None:
    found = fault(lambda: read_districts("gone.gpkg", None, "code", None, weather, tmp_path))
    assert "no such file" in found.what
    (tmp_path / "bad.gpkg").write_text("no database")
    found = fault(lambda: read_districts("bad.gpkg", None, "code", None, weather, tmp_path))
    assert "cannot be read" in found.what
    assert str(tmp_path) not in str(found)


def test_real_counties(real_data: Path, weather_of: Callable[..., xr.Dataset]) -> None:
    """Real polygons in NAD27: Raleigh, 35.78 N 78.64 W, lies in Wake County, 37183 (common knowledge)."""
    weather = weather_of(
        latitude=np.array([35.28, 35.78, 36.28]), longitude=np.array([-79.14, -78.64, -78.14, -77.64])
    )
    path = str(real_data / "boundaries" / "nc_counties_nad27.gpkg")
    districts = read_districts(path, None, "FIPS", "NAME", weather)
    assert len(districts.codes) == 100
    assert districts.names[districts.index[1, 1]] == "Wake"
    assert districts.codes[districts.index[1, 1]] == "37183"


# --- sowing


@pytest.mark.parametrize("spec", ["25 April", "04-25"])
def test_sowing_date(weather: xr.Dataset, spec: str) -> None:
    sowing = read_sowing(spec, weather)
    assert sowing.words == "sown on 25 April of the year, everywhere"
    assert sowing.dates(2021).tolist() == [[115.0] * 4] * 3
    assert sowing.dates(2020)[0, 0] == 116.0


def test_sowing_in_one_year(weather: xr.Dataset) -> None:
    sowing = read_sowing("2021-04-25", weather)
    assert sowing.year == 2021
    assert sowing.words == "sown on 25 April, in 2021 only, everywhere"
    assert (sowing.dates(2021) == 115.0).all()
    assert np.isnan(sowing.dates(2020)).all()


def test_sowing_in_another_calendar(weather_of: Callable[..., xr.Dataset]) -> None:
    assert read_sowing("31 May", weather_of("360_day")).dates(2021)[0, 0] == 150.0


def test_sowing_date_at_fault(weather: xr.Dataset) -> None:
    found = fault(lambda: read_sowing("25/04", weather))
    assert "'25/04' cannot be read" in found.what
    assert '"25 April"' in found.remedy
    assert "keys sown" in fault(lambda: read_sowing({"sown": "x"}, weather)).what


def test_sowing_grid(weather: xr.Dataset, write_grid: Write, tmp_path: Path) -> None:
    days = np.full((3, 4), 366.0)
    days[0] = [100.0, 101.4, np.nan, 120.0]
    sowing = read_sowing({"grid": write_grid(days)}, weather, base=tmp_path)
    assert sowing.words == "sown by the grid 'grid', day 100 to 366 of the year"
    np.testing.assert_array_equal(sowing.dates(2021)[0], [100.0, 101.0, np.nan, 120.0])
    assert sowing.dates(2021)[1, 0] == 365.0
    assert sowing.dates(2020)[1, 0] == 366.0
    assert sowing.remarks == ["grid.nc: grid: 1 sowing days are not whole; rounded"]


def test_sowing_grid_from_north_to_south(weather: xr.Dataset, write_grid: Write, tmp_path: Path) -> None:
    days = np.array([[120.0], [110.0], [100.0]])
    file = write_grid(days, latitude=np.array([41.0, 40.5, 40.0]))
    assert read_sowing({"grid": file}, weather, base=tmp_path).dates(2021)[:, 0].tolist() == [
        100.0,
        110.0,
        120.0,
    ]


@pytest.mark.parametrize(
    ("values", "options", "words", "remedy"),
    [
        (0.0, {}, "12 cells have a sowing day outside 1 to 366, for example 0 at lat 40", "missing, not 0"),
        (367.0, {}, "outside 1 to 366", "1 January"),
        (np.nan, {}, "no cell has a sowing day", "Name another"),
        (
            100.0,
            {"units": "days since 2021-01-01"},
            "its unit is 'days since 2021-01-01'",
            "days of the year",
        ),
        (100.0, {"latitude": np.array([40.0, 40.5, 41.1])}, "the grids differ", "one grid"),
    ],
)
def test_sowing_grid_at_fault(
    weather: xr.Dataset,
    write_grid: Write,
    tmp_path: Path,
    values: float,
    options: dict[str, object],
    words: str,
    remedy: str,
) -> None:
    file = write_grid(values, **options)
    found = fault(lambda: read_sowing({"grid": file}, weather, base=tmp_path))
    assert words in found.what
    assert found.where == "grid.nc: grid"
    assert remedy in found.remedy


@pytest.fixture
def districts(weather: xr.Dataset, write_districts: Write, tmp_path: Path) -> Districts:
    """Return the two districts."""
    return read_districts(write_districts(), None, "code", "title", weather, tmp_path)


def table(folder: Path, text: str) -> dict[str, str]:
    """Write a sowing table."""
    (folder / "sowing.csv").write_text(text, encoding="utf-8")
    return {"table": "sowing.csv"}


@pytest.mark.parametrize("separator", [",", ";", "\t"])
def test_sowing_table(weather: xr.Dataset, districts: Districts, tmp_path: Path, separator: str) -> None:
    text = "\ufeffcode,date\n0101,04-25\n0203,1 May\n".replace(",", separator)
    sowing = read_sowing(table(tmp_path, text), weather, districts, tmp_path)
    np.testing.assert_array_equal(sowing.dates(2021), [[115.0, 115.0, 121.0, np.nan]] * 3)
    assert sowing.words == "sown by district, 25 April to 1 May, 2 of 2 districts"
    assert sowing.remarks == ["3 cells lie in no district of districts.gpkg and have no sowing date"]
    assert sowing.missing_districts == []


@pytest.mark.parametrize("row", ["", "0203,\n"])
def test_district_missing_from_the_table(
    weather: xr.Dataset, districts: Districts, tmp_path: Path, row: str
) -> None:
    """Blank and listed, never filled with a neighbour's."""
    sowing = read_sowing(table(tmp_path, f"code,date\n0101,04-25\n{row}"), weather, districts, tmp_path)
    assert sowing.missing_districts == ["0203"]
    assert np.isnan(sowing.dates(2021)[:, 2]).all()
    assert "no sowing date for 0203 District 0203; their cells stay blank" in sowing.remarks[0]


def test_code_that_lost_its_zero(weather: xr.Dataset, districts: Districts, tmp_path: Path) -> None:
    spec = table(tmp_path, "code,date\n101,04-25\n203,05-01\n")
    found = fault(lambda: read_sowing(spec, weather, districts, tmp_path))
    assert "code 101 has lost its leading zero: in districts.gpkg it is 0101, and 1 more" in found.what
    assert found.where == "sowing.csv"
    assert "spreadsheet" in found.remedy


def test_districts_that_lost_their_zeros(weather: xr.Dataset, write_districts: Write, tmp_path: Path) -> None:
    file = write_districts(codes=(101, 203), file="numbers.gpkg")
    numbers = read_districts(file, None, "code", None, weather, tmp_path)
    spec = table(tmp_path, "code,date\n0101,04-25\n0203,05-01\n")
    found = fault(lambda: read_sowing(spec, weather, numbers, tmp_path))
    assert "in sowing.csv it is 0101" in found.what
    assert found.where == "numbers.gpkg"


@pytest.mark.parametrize(
    ("text", "words", "remedy"),
    [
        ("cod,date\n0101,04-25\n", "no column 'code'", "'cod'"),
        ("code,date\n0101,25/04\n", "cannot be read", "25 April"),
        ("code,date\n0101,04-25\n0101,04-26\n", "there twice, also in line 2", "Keep one"),
        ("code,date\n0101,2021-04-25\n0203,04-26\n", "different years", "all in the same year"),
        ("code,date\n77,04-25\n", "no code of the table", "id_field"),
        ("code,date\n", "no rows", "code and date"),
    ],
)
def test_table_at_fault(
    weather: xr.Dataset, districts: Districts, tmp_path: Path, text: str, words: str, remedy: str
) -> None:
    spec = table(tmp_path, text)
    found = fault(lambda: read_sowing(spec, weather, districts, tmp_path))
    assert words in found.what
    assert found.where.startswith("sowing.csv")
    assert remedy in found.remedy


def test_all_faults_of_a_table(weather: xr.Dataset, districts: Districts, tmp_path: Path) -> None:
    spec = table(tmp_path, "code,date\n101,25/04\n0203,32 May\n")
    with pytest.raises(InputError) as caught:
        read_sowing(spec, weather, districts, tmp_path)
    assert [each.where for each in caught.value.faults] == [
        "sowing.csv: line 2",
        "sowing.csv: line 3",
        "sowing.csv",
    ]


def test_table_without_districts(weather: xr.Dataset, tmp_path: Path) -> None:
    spec = table(tmp_path, "code,date\n0101,04-25\n")
    found = fault(lambda: read_sowing(spec, weather, None, tmp_path))
    assert "needs districts" in found.what
    assert "[places] districts" in found.remedy


# --- area and elevation


def test_area_of_cells(weather: xr.Dataset) -> None:
    """Between parallels on the WGS 84 ellipsoid: a sphere of equal area (R 6371.007 km) is within 0.6 %."""
    area = cell_area_hectares(weather)
    edges = np.deg2rad([39.75, 40.25])
    sphere = 6371007.2**2 * np.deg2rad(0.5) * (np.sin(edges[1]) - np.sin(edges[0])) / 1e4
    assert area.shape == (3, 4)
    np.testing.assert_allclose(area[0], sphere, rtol=6e-3)
    assert (np.diff(area[:, 0]) < 0).all()


def test_area_of_the_world(weather_of: Callable[..., xr.Dataset]) -> None:
    """All cells of the world together: 510 065 622 km2 (WGS 84, common knowledge)."""
    world = weather_of(latitude=np.arange(-88.0, 89.0, 4.0), longitude=np.arange(-178.0, 180.0, 4.0))
    assert cell_area_hectares(world).sum() / 100.0 == pytest.approx(510_065_622, rel=1e-4)


def test_area_of_one_cell_needs_bounds(weather_of: Callable[..., xr.Dataset]) -> None:
    one = weather_of(latitude=np.array([40.0]), longitude=np.array([10.0]))
    assert "size of the cells is not known" in fault(lambda: cell_area_hectares(one)).what


@pytest.mark.parametrize(("value", "unit"), [(0.25, "1"), (25.0, "%")])
def test_area_as_share(
    weather: xr.Dataset, write_grid: Write, tmp_path: Path, value: float, unit: str
) -> None:
    values = np.full((3, 4), value)
    values[0, 0] = np.nan
    share = read_area(write_grid(values, unit), weather, tmp_path)
    assert share[0, 0] == 0.0
    assert share[1, 1] == pytest.approx(0.25)


def test_area_in_hectares(weather: xr.Dataset, write_grid: Write, tmp_path: Path) -> None:
    cells = cell_area_hectares(weather)
    file = write_grid(cells * 0.25, None)
    share = read_area({"file": file, "name": "grid", "unit": "ha"}, weather, tmp_path)
    np.testing.assert_allclose(share, 0.25)


@pytest.mark.parametrize(
    ("value", "unit", "words"),
    [
        (1.2, "1", "more than the whole cell in 12 cells, for example 1.2"),
        (-0.1, "1", "below 0"),
        (1e6, "ha", "more than the whole cell"),
        (0.5, None, "no unit"),
        (0.5, "K", "neither that of a share nor that of an area"),
    ],
)
def test_area_at_fault(
    weather: xr.Dataset, write_grid: Write, tmp_path: Path, value: float, unit: str | None, words: str
) -> None:
    file = write_grid(value, unit)
    found = fault(lambda: read_area(file, weather, tmp_path))
    assert words in found.what
    assert found.where == "grid.nc: grid"
    assert '"ha"' in found.remedy


def test_which_variable(weather: xr.Dataset, write_grid: Write, tmp_path: Path) -> None:
    write_grid(0.1, name="maize")
    with xr.open_dataset(tmp_path / "grid.nc") as file:
        two = file.load()
    two["wheat"] = two["maize"]
    two.to_netcdf(tmp_path / "two.nc")
    assert "'maize', 'wheat'" in fault(lambda: read_area("two.nc", weather, tmp_path)).what
    assert "'wheat'" in fault(lambda: read_area({"file": "two.nc", "name": "weat"}, weather, tmp_path)).remedy
    assert read_area({"file": "two.nc", "name": "wheat"}, weather, tmp_path)[0, 0] == pytest.approx(0.1)


def test_elevation(weather: xr.Dataset, write_grid: Write, tmp_path: Path) -> None:
    file = write_grid(1.5, "km", standard_name="surface_altitude")
    assert (read_elevation(file, weather, tmp_path) == 1500.0).all()


@pytest.mark.parametrize(
    ("value", "unit", "words"),
    [(1.0, None, "no unit"), (1.0, "K", "does not fit"), (12000.0, "m", "outside -500 to 9000 m")],
)
def test_elevation_at_fault(
    weather: xr.Dataset, write_grid: Write, tmp_path: Path, value: float, unit: str | None, words: str
) -> None:
    file = write_grid(value, unit)
    assert words in fault(lambda: read_elevation(file, weather, tmp_path)).what
