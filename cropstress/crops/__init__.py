"""Crop profiles: every value with its unit, range, source and status."""

from cropstress.crops.catalogue import available_crops, load_crop
from cropstress.crops.describe import describe_crop, describe_crops
from cropstress.crops.profile import CropProfile, Value

__all__ = ["CropProfile", "Value", "available_crops", "describe_crop", "describe_crops", "load_crop"]
