"""What does not change in time: districts, crop area, sowing day, elevation."""

from cropstress.places.area import cell_area_hectares, read_area
from cropstress.places.districts import Districts, read_district_codes, read_districts
from cropstress.places.elevation import read_elevation
from cropstress.places.grid_file import grid_file_faults
from cropstress.places.sowing import Sowing, read_sowing, sowing_faults

__all__ = [
    "Districts",
    "Sowing",
    "cell_area_hectares",
    "grid_file_faults",
    "read_area",
    "read_district_codes",
    "read_districts",
    "read_elevation",
    "read_sowing",
    "sowing_faults",
]
