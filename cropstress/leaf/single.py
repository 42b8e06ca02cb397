"""Leaves by themselves: any number of single leaves through the solver of blocks."""

from __future__ import annotations

import numpy as np

from cropstress.compiled import kernel
from cropstress.leaf import solve

PHOTON_ABSORPTANCE = 0.85  # 1; von Caemmerer 2000 (from memory)
INFRARED_ABSORPTANCE = 0.20  # 1; Campbell & Norman 1998 (from memory)
PHOTONS_PER_JOULE = 4.57  # umol J-1; McCree 1972 (from memory)


@kernel
def solve_blocks(leaves, blocks, oxygenation, answers):  # type: ignore[no-untyped-def]
    """Solve blocks of leaves, one after the other.

    Parameters
    ----------
    leaves : record array (1,) of `C3_LEAF` or `C4_LEAF`
    blocks : float64 array (n, LEAF_INPUTS, LANES)
    oxygenation : float
    answers : float64 array (n, LEAF_OUTPUTS, LANES)
        Written.
    """
    for block in range(blocks.shape[0]):
        solve.solve_leaves(leaves[0], blocks[block], oxygenation, answers[block])


def in_blocks(lanes: np.ndarray) -> np.ndarray:
    """Cut leaves (LEAF_INPUTS, n) into blocks (blocks, LEAF_INPUTS, LANES); the last is filled with its last leaf."""
    count = lanes.shape[1]
    padded = np.pad(lanes, ((0, 0), (0, -count % solve.LANES)), mode="edge")
    return np.ascontiguousarray(padded.reshape(len(lanes), -1, solve.LANES).swapaxes(0, 1))


def solve_lanes(leaves: np.ndarray, lanes: np.ndarray, oxygenation: float = 1.0) -> np.ndarray:
    """Solve leaves given as the rows of `solve`.

    Parameters
    ----------
    leaves : record array (1,) of `C3_LEAF` or `C4_LEAF`
    lanes : float64 array (LEAF_INPUTS, n)
    oxygenation : float
        1, or 0 for leaves without oxygenation.

    Returns
    -------
    float64 array (LEAF_OUTPUTS, n)
    """
    blocks = in_blocks(lanes)
    answers = np.empty((len(blocks), solve.LEAF_OUTPUTS, solve.LANES))
    solve_blocks(leaves, blocks, oxygenation, answers)
    return answers.swapaxes(0, 1).reshape(solve.LEAF_OUTPUTS, -1)[:, : lanes.shape[1]]


def leaf_lanes(
    air_temperature: np.ndarray,
    vapour_pressure: np.ndarray,
    photons: np.ndarray,
    co2: np.ndarray,
    wind: np.ndarray,
    pressure: np.ndarray,
    net_longwave: np.ndarray,
    growth_temperature: np.ndarray,
) -> np.ndarray:
    """Lay out single leaves as the rows of `solve`."""
    logarithm = np.log(vapour_pressure / 0.6108)
    dew_point = 237.3 * logarithm / (17.27 - logarithm)  # FAO-56 Eq. 3-11
    lanes = np.empty((solve.LEAF_INPUTS, air_temperature.size))
    lanes[solve.AIR_TEMPERATURE] = air_temperature
    lanes[solve.VAPOUR_PRESSURE] = vapour_pressure
    lanes[solve.DEW_POINT] = np.minimum(dew_point, air_temperature)
    lanes[solve.NET_RADIATION] = (
        photons / PHOTONS_PER_JOULE * (PHOTON_ABSORPTANCE + INFRARED_ABSORPTANCE) + net_longwave
    )
    lanes[solve.PHOTONS] = PHOTON_ABSORPTANCE * photons
    lanes[solve.CAPACITY] = 1.0
    lanes[solve.WIND] = wind
    lanes[solve.PRESSURE] = pressure
    lanes[solve.CO2] = co2
    lanes[solve.GROWTH_TEMPERATURE] = growth_temperature
    return lanes
