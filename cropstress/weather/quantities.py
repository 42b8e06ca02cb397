"""What may be read from weather grids, and by which names, cell methods and units it is known.

Standard names are those of the CF Standard Name Table, version 83. Everything here is data: `recognise`,
`units` and `inspect` act on it and name no quantity of their own.
"""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True)
class Form:
    """One kind of unit a quantity may come in.

    Attributes
    ----------
    unit : str
        The unit, as UDUNITS spells it, that has the size of the canonical one: a value in it needs no factor.
    is_sum : bool
        True where the value is a sum over the day, False where it is a mean, an extreme or a rate.
    """

    unit: str
    is_sum: bool = False


@dataclass(frozen=True)
class Quantity:
    """A quantity that weather files may hold.

    Attributes
    ----------
    name : str
        Its name here and in the run file.
    meaning : str
        In words.
    unit : str
        Unit it is converted to.
    forms : tuple of Form
        Units it may come in.
    standard_names : tuple of str
        CF standard names it is found by.
    cell_methods : tuple of str
        Cell methods over time that fit.
    method_needed : bool
        True where the standard name alone does not tell it apart, so that the cell method must be there.
    other_names : tuple of str
        Long names, in lower case, clear enough to find it by where no standard name is there; the unit must
        fit.
    units : tuple of str
        Units it is usually given in, to name in messages; its own unit where there are none.
    low, high : float
        Values outside are impossible [unit].
    is_timed : bool
        False for what does not change in time.
    is_needed : bool
        True where nothing can be computed without it.
    is_spare : bool
        True where no result depends on it yet: what is wrong with it is told, and it is left out.
    """

    name: str
    meaning: str
    unit: str
    forms: tuple[Form, ...]
    standard_names: tuple[str, ...]
    cell_methods: tuple[str, ...] = ("mean",)
    method_needed: bool = False
    other_names: tuple[str, ...] = ()
    units: tuple[str, ...] = ()
    low: float = float("-inf")
    high: float = float("inf")
    is_timed: bool = True
    is_needed: bool = False
    is_spare: bool = False

    @property
    def usual_units(self) -> tuple[str, ...]:
        """Units to name in messages."""
        return self.units or (self.unit,)


# Impossible values. Temperature: the records of the World Meteorological Organization are -89.2 and 56.7 degC
# (common knowledge, from memory), widened to round numbers. The others are chosen here, wider than any
# weather.
LOWEST_TEMPERATURE, HIGHEST_TEMPERATURE = -90.0, 60.0  # degC
LOWEST_PRESSURE, HIGHEST_PRESSURE = 30.0, 110.0  # kPa

_CELSIUS = (Form("degC"),)
_PRESSURE = (Form("kPa"),)
_PERCENT = (Form("percent"),)
_RELATIVE = ("relative humidity", "near-surface relative humidity")

QUANTITIES: dict[str, Quantity] = {
    quantity.name: quantity
    for quantity in (
        Quantity(
            name="tmax",
            meaning="daily highest air temperature",
            unit="degC",
            forms=_CELSIUS,
            units=("degC", "K"),
            standard_names=("air_temperature",),
            cell_methods=("maximum",),
            method_needed=True,
            other_names=(
                "daily maximum air temperature",
                "maximum daily air temperature",
                "maximum air temperature",
                "daily maximum near-surface air temperature",
                "daily highest air temperature",
            ),
            low=LOWEST_TEMPERATURE,
            high=HIGHEST_TEMPERATURE,
            is_needed=True,
        ),
        Quantity(
            name="tmin",
            meaning="daily lowest air temperature",
            unit="degC",
            forms=_CELSIUS,
            units=("degC", "K"),
            standard_names=("air_temperature",),
            cell_methods=("minimum",),
            method_needed=True,
            other_names=(
                "daily minimum air temperature",
                "minimum daily air temperature",
                "minimum air temperature",
                "daily minimum near-surface air temperature",
                "daily lowest air temperature",
            ),
            low=LOWEST_TEMPERATURE,
            high=HIGHEST_TEMPERATURE,
            is_needed=True,
        ),
        Quantity(
            name="vapour_pressure",
            meaning="vapour pressure",
            unit="kPa",
            forms=_PRESSURE,
            units=("kPa", "hPa", "Pa"),
            standard_names=("water_vapor_partial_pressure_in_air",),
            other_names=(
                "vapor pressure",
                "vapour pressure",
                "actual vapor pressure",
                "actual vapour pressure",
            ),
            low=0.0,
            high=20.0,
        ),
        Quantity(
            name="dew_point",
            meaning="dew point",
            unit="degC",
            forms=_CELSIUS,
            units=("degC", "K"),
            standard_names=("dew_point_temperature",),
            other_names=("dew point temperature", "dewpoint temperature", "dew point"),
            low=LOWEST_TEMPERATURE,
            high=HIGHEST_TEMPERATURE,
        ),
        Quantity(
            name="specific_humidity",
            meaning="specific humidity",
            unit="kg kg-1",
            forms=(Form("kg kg-1"),),
            units=("kg kg-1", "g kg-1"),
            standard_names=("specific_humidity",),
            other_names=("specific humidity", "near-surface specific humidity"),
            low=0.0,
            high=0.1,
        ),
        Quantity(
            name="relative_humidity_maximum",
            meaning="daily highest relative humidity",
            unit="%",
            forms=_PERCENT,
            units=("%", "1"),
            standard_names=("relative_humidity",),
            cell_methods=("maximum",),
            method_needed=True,
            other_names=(
                "daily maximum relative humidity",
                "maximum relative humidity",
                "daily maximum near-surface relative humidity",
            ),
            low=0.0,
            high=105.0,
        ),
        Quantity(
            name="relative_humidity_minimum",
            meaning="daily lowest relative humidity",
            unit="%",
            forms=_PERCENT,
            units=("%", "1"),
            standard_names=("relative_humidity",),
            cell_methods=("minimum",),
            method_needed=True,
            other_names=(
                "daily minimum relative humidity",
                "minimum relative humidity",
                "daily minimum near-surface relative humidity",
            ),
            low=0.0,
            high=105.0,
        ),
        Quantity(
            name="relative_humidity",
            meaning="daily mean relative humidity",
            unit="%",
            forms=_PERCENT,
            units=("%", "1"),
            standard_names=("relative_humidity",),
            other_names=("daily mean relative humidity", *_RELATIVE),
            low=0.0,
            high=105.0,
        ),
        Quantity(
            name="vapour_pressure_deficit",
            meaning="vapour pressure deficit",
            unit="kPa",
            forms=_PRESSURE,
            units=("kPa", "hPa", "Pa"),
            standard_names=("water_vapor_saturation_deficit_in_air",),
            other_names=("vapor pressure deficit", "vapour pressure deficit"),
            low=0.0,
            high=20.0,
        ),
        Quantity(
            name="radiation",
            meaning="shortwave radiation reaching the ground",
            unit="MJ m-2 d-1",
            forms=(Form("MJ m-2 day-1"), Form("MJ m-2", is_sum=True)),
            units=("W m-2", "MJ m-2 d-1", "J m-2"),
            standard_names=(
                "surface_downwelling_shortwave_flux_in_air",
                "integral_wrt_time_of_surface_downwelling_shortwave_flux_in_air",
            ),
            cell_methods=("mean", "sum"),
            other_names=(
                "surface downwelling shortwave flux",
                "surface downwelling shortwave radiation",
                "surface solar radiation downwards",
            ),
        ),
        Quantity(
            name="wind",
            meaning="wind speed",
            unit="m s-1",
            forms=(Form("m s-1"),),
            standard_names=("wind_speed",),
            other_names=("wind speed", "near-surface wind speed"),
            low=0.0,
            high=75.0,
        ),
        Quantity(
            name="pressure",
            meaning="air pressure at the ground",
            unit="kPa",
            forms=_PRESSURE,
            units=("kPa", "hPa", "Pa"),
            standard_names=("surface_air_pressure", "air_pressure"),
            other_names=("surface pressure", "surface air pressure"),
            low=LOWEST_PRESSURE,
            high=HIGHEST_PRESSURE,
        ),
        Quantity(
            name="rain",
            meaning="precipitation",
            unit="mm d-1",
            # 1 kg of water on 1 m2 stands 1 mm high (density 1000 kg m-3)
            forms=(
                Form("mm day-1"),
                Form("mm", is_sum=True),
                Form("kg m-2 day-1"),
                Form("kg m-2", is_sum=True),
            ),
            standard_names=(
                "precipitation_flux",
                "precipitation_amount",
                "lwe_thickness_of_precipitation_amount",
                "lwe_precipitation_rate",
            ),
            cell_methods=("mean", "sum"),
            other_names=("precipitation", "total precipitation", "rainfall"),
            low=-0.1,
            high=2000.0,
            is_spare=True,
        ),
        Quantity(
            name="elevation",
            meaning="height of the ground above the sea",
            unit="m",
            forms=(Form("m"),),
            standard_names=("surface_altitude",),
            other_names=("surface altitude", "height of the ground"),
            low=-500.0,
            high=9000.0,
            is_timed=False,
            cell_methods=("mean", "point"),
        ),
    )
}


#: Ways to the vapour pressure, best first: FAO-56 chapter 3 prefers a measured dew point or vapour pressure,
#: then highest and lowest relative humidity, then the highest alone, and calls the mean "less desirable".
HUMIDITY_WAYS: tuple[tuple[str, ...], ...] = (
    ("vapour_pressure",),
    ("dew_point",),
    ("specific_humidity",),
    ("relative_humidity_maximum", "relative_humidity_minimum"),
    ("relative_humidity_maximum",),
    ("relative_humidity",),
    ("vapour_pressure_deficit",),
)

#: Every quantity that has to do with humidity.
HUMIDITY: tuple[str, ...] = tuple(dict.fromkeys(name for way in HUMIDITY_WAYS for name in way))
