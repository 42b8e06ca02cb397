"""Gas exchange of one leaf at a time, for conditions of any shape."""

from __future__ import annotations

import numpy as np
import xarray as xr
from numpy.typing import ArrayLike

from cropstress.crops import CropProfile, load_crop
from cropstress.errors import Fault, InputError
from cropstress.leaf import solve
from cropstress.leaf.parameters import leaf_record
from cropstress.leaf.single import leaf_lanes, solve_lanes

# What is physically possible: name, lowest, highest, unit.
_RANGES = {
    "air_temperature": (-60.0, 70.0, "degC"),
    "vapour_pressure": (1e-4, 20.0, "kPa"),
    "photons": (0.0, 3000.0, "umol m-2 s-1"),
    "co2": (1.0, 20000.0, "umol mol-1"),
    "wind": (0.0, 100.0, "m s-1"),
    "pressure": (20.0, 120.0, "kPa"),
    "net_longwave": (-300.0, 300.0, "W m-2"),
}
_UNITS = {
    "assimilation": ("umol m-2 s-1", solve.ASSIMILATION),
    "respiration": ("umol m-2 s-1", solve.RESPIRATION),
    "leaf_temperature": ("degC", solve.LEAF_TEMPERATURE),
    "leaf_to_air_deficit": ("kPa", solve.DEFICIT),
    "intercellular_co2": ("umol mol-1", solve.INTERCELLULAR_CO2),
    "stomatal_conductance": ("mol m-2 s-1", solve.STOMATAL_CONDUCTANCE),
    "carboxylation": ("umol m-2 s-1", solve.CARBOXYLATION),
    "oxygenation": ("umol m-2 s-1", solve.OXYGENATION),
}


def gas_exchange(
    crop: CropProfile | str,
    air_temperature: ArrayLike,
    vapour_pressure: ArrayLike,
    photons: ArrayLike,
    co2: ArrayLike = 421.0,
    wind: ArrayLike = 2.0,
    pressure: ArrayLike = 101.3,
    net_longwave: ArrayLike = 0.0,
    growth_temperature: ArrayLike | None = None,
) -> xr.Dataset:
    """Gas exchange of one top leaf, with and without oxygenation; arguments are broadcast.

    Parameters
    ----------
    crop : CropProfile or str
    air_temperature : array_like
        [degC]
    vapour_pressure : array_like
        Of the air [kPa], at most saturated.
    photons : array_like
        Falling on the leaf, 400-700 nm [umol m-2 s-1].
    co2 : array_like
        Of the air [umol mol-1].
    wind : array_like
        [m s-1], at least 0.5 is taken.
    pressure : array_like
        [kPa]
    net_longwave : array_like
        Isothermal [W m-2].
    growth_temperature : array_like, optional
        [degC]; the profile's by default. Used by C3 leaves.

    Returns
    -------
    xarray.Dataset
        assimilation, respiration, carboxylation, oxygenation, assimilation_without_oxygenation
        [umol m-2 s-1], leaf_temperature [degC], leaf_to_air_deficit [kPa], intercellular_co2 [umol mol-1],
        stomatal_conductance to vapour [mol m-2 s-1]; dimensions dim_0, dim_1 ... of the broadcast arguments.

    Raises
    ------
    InputError
        For an unknown crop, or values that are missing or physically impossible.
    """
    profile = load_crop(crop) if isinstance(crop, str) else crop
    given = {
        "air_temperature": air_temperature, "vapour_pressure": vapour_pressure, "photons": photons, "co2": co2,
        "wind": wind, "pressure": pressure, "net_longwave": net_longwave,
    }  # fmt: skip
    arrays = dict(zip(given, np.broadcast_arrays(*(np.asarray(value, float) for value in given.values())), strict=True))
    faults = [fault for name, values in arrays.items() if (fault := _range_fault(name, values))]
    if faults:
        raise InputError(faults)
    shape = arrays["photons"].shape
    if growth_temperature is None:
        growth_temperature = profile.number("growth_temperature") if profile.pathway == "C3" else 25.0
    growth = np.broadcast_to(np.asarray(growth_temperature, float), shape)
    lanes = leaf_lanes(*(array.ravel() for array in (*arrays.values(), growth)))
    record = leaf_record(profile)
    answers = solve_lanes(record, lanes)
    without = solve_lanes(record, lanes, 0.0)
    dims = tuple(f"dim_{number}" for number in range(len(shape)))
    variables = {
        name: (dims, answers[row].reshape(shape), {"units": unit}) for name, (unit, row) in _UNITS.items()
    }
    variables["assimilation_without_oxygenation"] = (
        dims, without[solve.ASSIMILATION].reshape(shape), {"units": "umol m-2 s-1"},
    )  # fmt: skip
    return xr.Dataset(variables, attrs={"crop": profile.name, "pathway": profile.pathway})


def _range_fault(name: str, values: np.ndarray) -> Fault | None:
    lowest, highest, unit = _RANGES[name]
    wrong = ~((values >= lowest) & (values <= highest))
    if not wrong.any():
        return None
    return Fault(
        f"{values[wrong].flat[0]:g} is missing or impossible ({int(wrong.sum())} of {values.size} values)",
        f"argument {name}",
        f"Give {name} between {lowest:g} and {highest:g} {unit}.",
    )
