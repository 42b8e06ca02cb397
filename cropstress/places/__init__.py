"""What does not change in time: districts, crop area, sowing day, elevation."""

from cropstress.places.area import cell_area_hectares, read_area
from cropstress.places.districts import Districts, read_districts
from cropstress.places.elevation import read_elevation
from cropstress.places.sowing import Sowing, read_sowing

__all__ = [
    "Districts",
    "Sowing",
    "cell_area_hectares",
    "read_area",
    "read_districts",
    "read_elevation",
    "read_sowing",
]
