"""Gas exchange of one leaf at a time, for conditions of any shape."""

from __future__ import annotations

import numpy as np
import xarray as xr
from numpy.typing import ArrayLike

from cropstress.crops import CropProfile, load_crop
from cropstress.day.worlds import losses_of_blocks
from cropstress.errors import Fault, InputError
from cropstress.leaf import solve
from cropstress.leaf.parameters import leaf_record
from cropstress.leaf.single import in_blocks, leaf_lanes, solve_lanes
from cropstress.season.measures import CAUSES

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
_RATE_UNIT = "umol m-2 s-1"
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
    profile, lanes, shape = _one_leaf(
        crop, growth_temperature, air_temperature=air_temperature, vapour_pressure=vapour_pressure,
        photons=photons, co2=co2, wind=wind, pressure=pressure, net_longwave=net_longwave,
    )  # fmt: skip
    record = leaf_record(profile)
    answers = solve_lanes(record, lanes)
    rows = {name: (unit, answers[row]) for name, (unit, row) in _UNITS.items()}
    without = solve_lanes(record, lanes, 0.0)[solve.ASSIMILATION]
    rows["assimilation_without_oxygenation"] = (_RATE_UNIT, without)
    return _labelled(rows, shape, profile)


def heat_loss(
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
    """What air above the crop's heat onset costs one top leaf at one moment, and by which causes.

    Parameters, errors and dimensions are those of `gas_exchange`.

    Returns
    -------
    xarray.Dataset
        lost_to_heat and lost_to_heat_by_photorespiration, _by_stomata, _by_enzymes and _by_respiration, which add
        up to it [umol m-2 s-1]; exactly 0 at and below the onset. Attribute heat_onset [degC].
    """
    profile, lanes, shape = _one_leaf(
        crop, growth_temperature, air_temperature=air_temperature, vapour_pressure=vapour_pressure,
        photons=photons, co2=co2, wind=wind, pressure=pressure, net_longwave=net_longwave,
    )  # fmt: skip
    blocks = in_blocks(lanes)
    losses = np.empty((len(blocks), 1 + len(CAUSES), solve.LANES))
    onset = profile.number("heat_onset")
    losses_of_blocks(leaf_record(profile), onset, blocks, losses)
    names = ["lost_to_heat", *(f"lost_to_heat_by_{cause}" for cause in CAUSES)]
    rows = {
        name: (_RATE_UNIT, losses[:, row].ravel()[: lanes.shape[1]]) for row, name in enumerate(names)
    }  # fmt: skip
    return _labelled(rows, shape, profile).assign_attrs(heat_onset=onset)


def _one_leaf(
    crop: CropProfile | str, growth_temperature: ArrayLike | None, **given: ArrayLike
) -> tuple[CropProfile, np.ndarray, tuple[int, ...]]:
    """Return the profile, the leaves as the rows of `solve`, and the shape of the arguments."""
    profile = load_crop(crop) if isinstance(crop, str) else crop
    arrays = dict(
        zip(given, np.broadcast_arrays(*(np.asarray(value, float) for value in given.values())), strict=True)
    )
    faults = [fault for name, values in arrays.items() if (fault := _range_fault(name, values))]
    if faults:
        raise InputError(faults)
    shape = arrays["photons"].shape
    if growth_temperature is None:
        growth_temperature = profile.number("growth_temperature") if profile.pathway == "C3" else 25.0
    growth = np.broadcast_to(np.asarray(growth_temperature, float), shape)
    return profile, leaf_lanes(*(array.ravel() for array in (*arrays.values(), growth))), shape


def _labelled(
    rows: dict[str, tuple[str, np.ndarray]], shape: tuple[int, ...], profile: CropProfile
) -> xr.Dataset:
    """Return answers as a dataset in the shape of the arguments."""
    dims = tuple(f"dim_{number}" for number in range(len(shape)))
    return xr.Dataset(
        {name: (dims, values.reshape(shape), {"units": unit}) for name, (unit, values) in rows.items()},
        attrs={"crop": profile.name, "pathway": profile.pathway},
    )


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
