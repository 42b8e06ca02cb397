"""Daily weather grids: opened, recognised, converted and checked."""

from cropstress.weather.damage import READING, damage_in_files
from cropstress.weather.extraterrestrial import extraterrestrial_radiation
from cropstress.weather.humidity import pressure_from_elevation
from cropstress.weather.location import cell_latitude_longitude
from cropstress.weather.mend import MendedBlock, judge_mends, mend_block, mend_words
from cropstress.weather.read import FoundVariable, Weather, open_weather, read_weather

__all__ = [
    "READING",
    "FoundVariable",
    "MendedBlock",
    "Weather",
    "cell_latitude_longitude",
    "damage_in_files",
    "extraterrestrial_radiation",
    "judge_mends",
    "mend_block",
    "mend_words",
    "open_weather",
    "pressure_from_elevation",
    "read_weather",
]
