"""Response curves of one leaf: the command `leaf`."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pandas as pd

from cropstress.crops import CropProfile, load_crop
from cropstress.errors import fail
from cropstress.one_leaf import gas_exchange, heat_loss
from cropstress.report.curves import leaf_figure
from cropstress.report.phrases import number, phrase
from cropstress.report.writing import written_aside
from cropstress.season.measures import CAUSES
from cropstress.weather.humidity import saturation_vapour_pressure

AIR_TEMPERATURES = np.arange(5.0, 46.0)  # degC
HOT_AIR = (33.0, 36.0, 39.0, 42.0)  # degC
CO2_LEVELS = (280.0, 421.0, 600.0)  # umol mol-1: before industry, 2023, a future


def leaf_curves(crop: str, folder: str | Path, photons: float = 1500.0, humidity: float = 50.0) -> list[str]:
    """Write how a leaf of a crop answers air temperature, at several CO2.

    Parameters
    ----------
    crop : str
        Name of a profile, or a file.
    folder : path
    photons : float
        [umol m-2 s-1]
    humidity : float
        Relative humidity of the air [%].

    Returns
    -------
    list of str
        Lines for the screen: the table at today's CO2 and the files written.
    """
    if not 1.0 <= humidity <= 100.0:
        raise fail(f"{humidity:g} is not a relative humidity", "--humidity", "Give a value from 1 to 100 %.")
    profile = load_crop(crop)
    air, co2 = (array.ravel() for array in np.meshgrid(AIR_TEMPERATURES, CO2_LEVELS))
    vapour_pressure = 0.01 * humidity * saturation_vapour_pressure(air)
    answer = gas_exchange(profile, air, vapour_pressure, photons, co2)
    table = pd.DataFrame(
        {"air_temperature": air, "co2": co2} | {name: answer[name].values for name in map(str, answer.data_vars)}
    )
    folder = Path(folder)
    table_path, figure_path = folder / f"leaf-{profile.name}.csv", folder / f"leaf-{profile.name}.png"
    notes = phrase("leaf.conditions", photons=number(photons), humidity=number(humidity))
    if profile.pathway == "C3":
        notes += " " + phrase("leaf.growth_temperature", value=number(profile.number("growth_temperature")))
    with written_aside(table_path) as aside:
        first = pd.Series([f"{notes} {phrase('caution.full')}"], name="notes")
        pd.concat([table.round(4), first], axis=1).to_csv(aside, index=False)
    leaf_figure(
        table, figure_path, label=profile.label, heat_onset=profile.number("heat_onset"), notes=[notes],
    )  # fmt: skip
    today = table[(table["co2"] == 421.0) & (table["air_temperature"] % 5 == 0)]
    lines = [
        f"{profile.label}: air [degC], net assimilation and the same without oxygenation [umol m-2 s-1], 421 umol/mol"
    ]
    lines += [
        f"  {row.air_temperature:5.0f} {row.assimilation:8.1f} {row.assimilation_without_oxygenation:8.1f}"
        for row in today.itertuples()
    ]
    return [*lines, *_cause_lines(profile, photons, humidity), str(table_path), str(figure_path)]


def _cause_lines(profile: CropProfile, photons: float, humidity: float) -> list[str]:
    """Return what air above the onset costs the leaf at some temperatures, and by which causes."""
    air = np.array(HOT_AIR)
    vapour_pressure = 0.01 * humidity * 0.6108 * np.exp(17.27 * air / (air + 237.3))  # FAO-56 Eq. 11
    loss = heat_loss(profile, air, vapour_pressure, photons)
    lost = loss["lost_to_heat"].values
    lines = [
        f"Lost to heat above the onset of {loss.attrs['heat_onset']:g} degC: air [degC], loss [umol m-2 s-1], "
        "its causes [% of it]"
    ]
    for row, temperature in enumerate(air):
        shares = {cause: float(loss[f"lost_to_heat_by_{cause}"].values[row]) for cause in CAUSES}
        split = (
            ", ".join(f"{cause} {round(100.0 * share / lost[row])}" for cause, share in shares.items())
            if lost[row] > 0.0
            else "nothing lost" if lost[row] == 0.0 else "a gain"
        )  # fmt: skip
        lines.append(f"  {temperature:5.0f} {lost[row]:8.1f}   {split}")
    return lines
