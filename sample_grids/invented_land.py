"""The invented land of Tessavar: coast, island, hills, dryness, crops, sowing days and districts.

Everything here is a smooth function of place, written down by hand; nothing is taken from a real map.
Positions inside formulas are shares of the region, from 0 to 1: `east` of its width, `north` of its height.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
import shapely
from shapely.geometry import LineString, MultiPolygon, Point, Polygon, mapping
from shapely.geometry.polygon import orient
from shapely.ops import polygonize, unary_union

ROWS, COLUMNS = 60, 80
CELL = 0.05  # degrees of latitude and of longitude
SOUTH_EDGE, WEST_EDGE = 41.0, -36.0  # degrees; open ocean, far from any land or people
KILOMETRES_PER_DEGREE = 111.2  # a sphere of 6371 km; only used for distances inside the invented land

LATITUDE = np.round(SOUTH_EDGE + CELL * (np.arange(ROWS) + 0.5), 3)
LONGITUDE = np.round(WEST_EDGE + CELL * (np.arange(COLUMNS) + 0.5), 3)

# code, name and a place inside (east, north); codes have leading zeros and stay text
DISTRICTS = (
    ("0101", "Port Évarne", 0.25, 0.15),
    ("0102", "Sarnelle Bay", 0.35, 0.50),
    ("0103", "Cape Ivrel", 0.28, 0.85),
    ("0204", "Middle Plain", 0.55, 0.45),
    ("0205", "Vándorre", 0.55, 0.10),
    ("0306", "Torvel Hills", 0.65, 0.85),
    ("0307", "Ossalène", 0.90, 0.75),
    ("0408", "Dry Basin", 0.88, 0.25),
)

# month and day on which spring wheat is sown, by district code
WHEAT_SOWING = {
    "0101": "04-02",
    "0102": "04-04",
    "0103": "04-08",
    "0204": "04-05",
    "0205": "04-03",
    "0306": "04-16",
    "0307": "04-12",
    "0408": "04-03",
}


@dataclass(frozen=True)
class Land:
    """What does not change in time, on the grid (ROWS, COLUMNS).

    Attributes
    ----------
    is_land : bool
        False over the sea.
    inland : float [1]
        0 at the coast, rising to 1 far from it.
    elevation : float [m]
        Height above the sea, whole metres.
    dryness : float [1]
        0 to about 1 in the middle of the dry basin.
    """

    is_land: np.ndarray
    inland: np.ndarray
    elevation: np.ndarray
    dryness: np.ndarray


def gaussian(
    east: np.ndarray, north: np.ndarray, centre: tuple[float, float], radii: tuple[float, float]
) -> np.ndarray:
    """Bell of height 1 around a centre, with its radii given as shares of the region."""
    return np.exp(-(((east - centre[0]) / radii[0]) ** 2) - ((north - centre[1]) / radii[1]) ** 2)


def smooth_step(value: np.ndarray, low: float, high: float) -> np.ndarray:
    """Rise smoothly from 0 at `low` to 1 at `high`."""
    share = np.clip((value - low) / (high - low), 0.0, 1.0)
    return share * share * (3.0 - 2.0 * share)


def places() -> tuple[np.ndarray, np.ndarray]:
    """East and north shares of every cell centre, each (ROWS, COLUMNS)."""
    east = (np.arange(COLUMNS) + 0.5) / COLUMNS
    north = (np.arange(ROWS) + 0.5) / ROWS
    return np.broadcast_to(east, (ROWS, COLUMNS)), np.broadcast_to(north[:, None], (ROWS, COLUMNS))


def coast_east(north: np.ndarray) -> np.ndarray:
    """East share of the coast line at a north share: two bends, small ones on top, and one bay."""
    return (
        0.165
        + 0.045 * np.sin(2 * np.pi * (1.1 * north + 0.15))
        + 0.015 * np.sin(2 * np.pi * (3.3 * north + 0.40))
        + 0.006 * np.sin(2 * np.pi * (8.7 * north + 0.10))
        + 0.105 * np.exp(-(((north - 0.45) / 0.075) ** 2))
    )


def island_outline() -> np.ndarray:
    """Corner points (east, north) of the island off the north-west coast."""
    angle = np.linspace(0.0, 2 * np.pi, 61)[:-1]
    stretch = 1 + 0.18 * np.sin(3 * angle + 0.5)
    return np.column_stack([0.060 + 0.028 * stretch * np.cos(angle), 0.760 + 0.062 * stretch * np.sin(angle)])


def coast_points() -> np.ndarray:
    """Points (east, north) along the coast line from south to north."""
    north = np.linspace(-0.02, 1.02, 209)
    return np.column_stack([coast_east(north), north])


def make_land(texture: np.ndarray) -> Land:
    """Shape the land.

    Parameters
    ----------
    texture : numpy.ndarray (ROWS, COLUMNS) [1]
        Smooth random field of unit variance that roughens the hills.
    """
    east, north = places()
    outline = island_outline()
    on_island = shapely.contains_xy(Polygon(outline), east, north)
    is_land = (east > coast_east(north)) | on_island

    kilometres_east = COLUMNS * CELL * KILOMETRES_PER_DEGREE * np.cos(np.deg2rad(LATITUDE.mean()))
    kilometres_north = ROWS * CELL * KILOMETRES_PER_DEGREE
    shore = np.concatenate([coast_points(), outline])
    distance = np.sqrt(
        (((east[..., None] - shore[:, 0]) * kilometres_east) ** 2)
        + (((north[..., None] - shore[:, 1]) * kilometres_north) ** 2)
    ).min(axis=-1)
    inland = 1.0 - np.exp(-distance / 45.0)

    northern_hills = np.exp(-(((north - (0.93 - 0.14 * east)) / 0.15) ** 2)) * smooth_step(east, 0.25, 0.70)
    ridge_line = 0.665 + 0.05 * np.sin(2 * np.pi * (0.9 * north + 0.2))
    ridge = np.exp(-(((east - ridge_line) / 0.045) ** 2)) * smooth_step(north, 0.12, 0.60)
    hills = 880.0 * northern_hills * (1 + 0.28 * texture) + 330.0 * ridge * (1 + 0.20 * texture)
    island_hill = 160.0 * gaussian(east, north, (0.060, 0.760), (0.022, 0.045))
    elevation = 4.0 + 0.75 * distance + 5.0 * texture * inland + hills + island_hill
    elevation = np.rint(np.maximum(elevation, 2.0))

    dryness = gaussian(east, north, (0.90, 0.26), (0.22, 0.30)) * np.clip(1.25 - elevation / 800.0, 0.0, 1.0)
    return Land(is_land, inland, elevation, dryness)


def crop_shares(land: Land, texture: np.ndarray) -> dict[str, np.ndarray]:
    """Share of each cell under each crop, to 0.01, exactly 0 where it is not grown; (ROWS, COLUMNS) [1]."""
    east, north = places()
    low = 1.0 - smooth_step(land.elevation, 260.0, 480.0)
    middle = smooth_step(land.elevation, 60.0, 200.0) * (1.0 - smooth_step(land.elevation, 650.0, 900.0))
    roughness = 1.0 + 0.25 * texture
    plain = gaussian(east, north, (0.48, 0.42), (0.27, 0.38))
    wanted = {
        "maize": 0.42 * low * (plain + 0.35 * land.dryness),
        "wheat": 0.34 * np.maximum(middle * (1 - 0.6 * land.dryness), 0.55 * low * (1 - land.dryness)),
        "soybean": 0.24 * low * gaussian(east, north, (0.42, 0.25), (0.24, 0.28)),
        "cotton": 0.36 * low * land.dryness,
        "potato": 0.14 * (1.0 - smooth_step(land.inland, 0.45, 0.75)) * low,
    }
    wanted = {crop: share * roughness for crop, share in wanted.items()}
    wanted = {crop: np.where(share < 0.02, 0.0, share) for crop, share in wanted.items()}
    crowding = np.maximum(sum(wanted.values()) / 0.92, 1.0)
    shares = {
        crop: np.where(land.is_land, np.rint(100.0 * share / crowding) / 100.0, np.nan)
        for crop, share in wanted.items()
    }
    return shares


def maize_sowing_day(land: Land, texture: np.ndarray) -> np.ndarray:
    """Day of the year on which maize is sown: earlier in the warm south, later with height; NaN at sea."""
    _, north = places()
    day = 113.0 + 6.0 * (north - 0.5) + land.elevation / 70.0 - 3.0 * land.dryness + 1.0 * texture
    return np.where(land.is_land, np.rint(np.clip(day, 106.0, 128.0)), np.nan)


def district_shapes() -> dict[str, dict[str, Any]]:
    """District outlines by code, as GeoJSON geometries in degrees, rounded to 0.0001.

    Two wavy lines cut the land into three strips, and shorter ones cut the strips into districts; a piece is
    known by the named place that lies in it. The island belongs to the district across the water.
    """
    along = np.linspace(-0.02, 1.02, 131)

    def northward(east: float, lean: float, wave: float, phase: float) -> LineString:
        bend = lean * (along - 0.5) + wave * np.sin(2 * np.pi * (1.5 * along + phase))
        return LineString(np.column_stack([east + bend, along]))

    def eastward(north: float, lean: float, phase: float, start: float, end: float) -> LineString:
        part = along[(along >= start) & (along <= end)]
        bend = lean * (part - 0.5 * (start + end)) + 0.025 * np.sin(2 * np.pi * (1.7 * part + phase))
        return LineString(np.column_stack([part, north + bend]))

    coast_to_plain = northward(0.400, -0.10, 0.020, 0.1)
    plain_to_basin = northward(0.705, 0.08, 0.025, 0.4)
    # each strip between two of these has its own borders; ends that stick out beyond a strip are dropped
    across = [
        eastward(0.30, 0.15, 0.0, -0.02, 0.50),
        eastward(0.66, -0.20, 0.3, -0.02, 0.50),
        eastward(0.24, 0.10, 0.6, 0.34, 0.80),
        eastward(0.71, -0.25, 0.2, 0.34, 0.80),
        eastward(0.55, 0.20, 0.5, 0.62, 1.02),
    ]
    corners = [(1.0, 1.0), (1.0, 0.0)]
    shore = coast_points()
    shore = shore[(shore[:, 1] >= 0.0) & (shore[:, 1] <= 1.0)]
    mainland = Polygon([*map(tuple, shore), *corners])
    lines = [mainland.exterior, coast_to_plain, plain_to_basin, *across]

    shapes: dict[str, list[Polygon]] = {code: [] for code, *_ in DISTRICTS}
    for piece in polygonize(unary_union(lines)):
        if not mainland.contains(piece.representative_point()):
            continue
        (code,) = [code for code, _, east, north in DISTRICTS if piece.contains(Point(east, north))]
        shapes[code].append(piece)
    shapes["0103"].append(Polygon(island_outline()))

    def to_degrees(points: np.ndarray) -> np.ndarray:
        degrees = [WEST_EDGE, SOUTH_EDGE] + points * [COLUMNS * CELL, ROWS * CELL]
        return np.round(degrees, 4)

    geometries = {}
    for code, parts in shapes.items():
        parts = [orient(shapely.normalize(shapely.transform(part, to_degrees))) for part in parts]
        parts.sort(key=lambda part: -part.area)
        geometries[code] = mapping(parts[0] if len(parts) == 1 else MultiPolygon(parts))
    return geometries
