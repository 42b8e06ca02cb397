"""The worlds that a loss is the difference of, and its causes.

A leaf is solved in the weather as it is and in a cool world, whose air never passes the crop's heat onset; in
each with and without oxygenation. Two further evaluations mix dryness and leaf temperature of both worlds.
"""

from __future__ import annotations

import numpy as np

from cropstress.compiled import inlined, kernel
from cropstress.day import course
from cropstress.leaf import held, solve
from cropstress.leaf.air import dew_point

_NO_GROSS = 1e-9  # umol m-2 s-1: below it a leaf without oxygenation fixes nothing


@kernel
def solve_worlds(leaf, heat_onset, lanes, actual, actual_open, cooled, cooled_open, mixed_dry, mixed_warm):  # type: ignore[no-untyped-def]
    """Solve a block of leaves in all worlds that its losses need.

    Parameters
    ----------
    leaf : record of `C3_LEAF` or `C4_LEAF`
    heat_onset : float
        [degC], momentary air temperature.
    lanes : float64 array (LEAF_INPUTS, LANES)
        See the row names of `solve`.
    actual, actual_open, cooled, cooled_open : float64 array (LEAF_OUTPUTS, LANES)
        Written: the weather as it is and the cool world, each with and without oxygenation.
    mixed_dry, mixed_warm : float64 array (LANES,)
        Written: gross rates without oxygenation [umol m-2 s-1] of the cool leaf at the actual deficit, and of
        the actual leaf at the cool one.

    Returns
    -------
    bool
        Whether a leaf's air is above the onset; the cool world is written only then.
    """
    solve.solve_leaves(leaf, lanes, 1.0, actual)
    solve.solve_leaves(leaf, lanes, 0.0, actual_open)
    hot = False
    for lane in range(solve.LANES):
        hot = hot or lanes[solve.AIR_TEMPERATURE, lane] > heat_onset
    if not hot:
        return False
    cool = np.empty((solve.LEAF_INPUTS, solve.LANES))
    cool[:, :] = lanes
    for lane in range(solve.LANES):
        air = min(lanes[solve.AIR_TEMPERATURE, lane], heat_onset)
        humidity = min(lanes[solve.VAPOUR_PRESSURE, lane], course.saturation(air))
        cool[solve.AIR_TEMPERATURE, lane] = air
        cool[solve.VAPOUR_PRESSURE, lane] = humidity
        cool[solve.DEW_POINT, lane] = min(dew_point(humidity), air)
    solve.solve_leaves(leaf, cool, 1.0, cooled)
    solve.solve_leaves(leaf, cool, 0.0, cooled_open)
    held.gross_without_oxygenation(
        leaf, lanes, cooled_open[solve.LEAF_TEMPERATURE], actual_open[solve.DEFICIT],
        cooled_open[solve.ASSIMILATION], mixed_dry,
    )  # fmt: skip
    held.gross_without_oxygenation(
        leaf, lanes, actual_open[solve.LEAF_TEMPERATURE], cooled_open[solve.DEFICIT],
        actual_open[solve.ASSIMILATION], mixed_warm,
    )  # fmt: skip
    return True


@kernel
def losses_of_blocks(leaves, heat_onset, blocks, losses):  # type: ignore[no-untyped-def]
    """Work out what heat costs blocks of single leaves at one moment.

    Parameters
    ----------
    leaves : record array (1,) of `C3_LEAF` or `C4_LEAF`
    heat_onset : float
        [degC]
    blocks : float64 array (n, LEAF_INPUTS, LANES)
    losses : float64 array (n, 5, LANES)
        Written: the loss and its parts by photorespiration, stomata, enzymes and respiration [umol m-2 s-1].
    """
    actual = np.empty((solve.LEAF_OUTPUTS, solve.LANES))
    actual_open = np.empty((solve.LEAF_OUTPUTS, solve.LANES))
    cooled = np.empty((solve.LEAF_OUTPUTS, solve.LANES))
    cooled_open = np.empty((solve.LEAF_OUTPUTS, solve.LANES))
    mixed_dry = np.empty(solve.LANES)
    mixed_warm = np.empty(solve.LANES)
    losses[:, :, :] = 0.0
    for block in range(blocks.shape[0]):
        lanes = blocks[block]
        solve_worlds(
            leaves[0], heat_onset, lanes, actual, actual_open, cooled, cooled_open, mixed_dry, mixed_warm
        )  # fmt: skip
        for lane in range(solve.LANES):
            if lanes[solve.AIR_TEMPERATURE, lane] > heat_onset:
                losses[block, 0, lane] = cooled[solve.ASSIMILATION, lane] - actual[solve.ASSIMILATION, lane]
                parts = causes_at(lane, actual, actual_open, cooled, cooled_open, mixed_dry, mixed_warm)
                for k in range(4):
                    losses[block, 1 + k, lane] = parts[k]


@inlined
def causes_at(lane, actual, actual_open, cooled, cooled_open, mixed_dry, mixed_warm):  # type: ignore[no-untyped-def]
    """Split the loss of one lane of the worlds of `solve_worlds` into its four causes."""
    return causes(
        actual[solve.ASSIMILATION, lane], actual[solve.RESPIRATION, lane],
        cooled[solve.ASSIMILATION, lane], cooled[solve.RESPIRATION, lane],
        actual_open[solve.ASSIMILATION, lane] + actual_open[solve.RESPIRATION, lane],
        cooled_open[solve.ASSIMILATION, lane] + cooled_open[solve.RESPIRATION, lane],
        mixed_dry[lane], mixed_warm[lane],
    )  # fmt: skip


@inlined
def causes(rate, respiration, cool_rate, cool_respiration, open_gross, cool_open_gross, mixed_dry, mixed_warm):  # type: ignore[no-untyped-def]
    """Split the loss of one leaf at one moment into its four causes.

    The Shapley (1953) values of two two-factor games: kept share x potential, then dryness x temperature.
    `mixed_dry` is the gross rate without oxygenation of a leaf of the cool world in the dry air of the actual
    one, `mixed_warm` that of the actual leaf in the air of the cool world.
    """
    gross = rate + respiration
    cool_gross = cool_rate + cool_respiration
    kept = gross / open_gross if open_gross > _NO_GROSS else 1.0
    cool_kept = cool_gross / cool_open_gross if cool_open_gross > _NO_GROSS else 1.0
    by_photorespiration = 0.5 * (cool_open_gross + open_gross) * (cool_kept - kept)
    scale = 0.5 * (cool_kept + kept)
    by_stomata = 0.5 * ((cool_open_gross - mixed_dry) + (mixed_warm - open_gross))
    by_enzymes = 0.5 * ((cool_open_gross - mixed_warm) + (mixed_dry - open_gross))
    return by_photorespiration, scale * by_stomata, scale * by_enzymes, respiration - cool_respiration
