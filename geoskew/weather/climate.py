"""What the weather formulas need to know of each place, looked up on the maps once."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from geoskew.weather import maps
from geoskew.weather.strips import in_strips
from geoskew.weather.zenith import ZenithGas

FloatArray = NDArray[np.float64]

# Gas and cloud keep their value at this percentage below it, P.618-14 §2.5 (edition 13 held 1 %).
HELD_PERCENTAGE = 5.0
# Clear air is the median of an average year.
CLEAR_PERCENTAGE = 50.0


@dataclass(frozen=True, slots=True)
class Climate:
    """Long-term weather of each place at one frequency, all arrays of the places' shape.

    Attributes
    ----------
    frequency_ghz : float
        Frequency that the gas values belong to.
    held_percentage : float
        Percentage of an average year that gas and cloud belong to.
    latitude : ndarray
        Degrees, as given.
    rain_rate : ndarray
        Exceeded for 0.01 % of an average year, mm/h (P.837-7).
    rain_height, height : ndarray
        Rain height (P.839-4) and height of the place, km above mean sea level.
    zenith_gas : ndarray
        Oxygen and water vapour towards the zenith at `held_percentage`, dB (P.676-12, P.836-6).
    zenith_gas_clear : ndarray
        The same in clear air: water vapour at its median (50 %) value.
    cloud_liquid : ndarray
        Reduced columnar liquid water at `held_percentage`, kg/m² (P.840-8).
    wet_refractivity : ndarray
        Median wet term of the surface refractivity, N-units (P.453-13).
    """

    frequency_ghz: float
    held_percentage: float
    latitude: FloatArray
    rain_rate: FloatArray
    rain_height: FloatArray
    height: FloatArray
    zenith_gas: FloatArray
    zenith_gas_clear: FloatArray
    cloud_liquid: FloatArray
    wet_refractivity: FloatArray


def climate(
    longitude: ArrayLike,
    latitude: ArrayLike,
    height_m: ArrayLike,
    *,
    frequency_ghz: float,
    percentage: float = HELD_PERCENTAGE,
) -> Climate:
    """Look up the climate of places for one frequency. Arguments and errors as in `climates`."""
    return climates(longitude, latitude, height_m, frequencies_ghz=(frequency_ghz,), percentage=percentage)[0]


def climates(
    longitude: ArrayLike,
    latitude: ArrayLike,
    height_m: ArrayLike,
    *,
    frequencies_ghz: Sequence[float],
    percentage: float = HELD_PERCENTAGE,
) -> tuple[Climate, ...]:
    """Look up the climate of places for several frequencies at the price of little more than one.

    Parameters
    ----------
    longitude, latitude : array_like
        Degrees. Shapes that broadcast: a grid keeps longitude (1, W) and latitude (H, 1).
    height_m : array_like
        Height above mean sea level, m (an ellipsoidal height is accepted); where it is NaN the
        topography of P.1511-2 is taken, and ground below sea level counts as 0 there.
    frequencies_ghz : sequence of float
        1 to 55 GHz.
    percentage : float
        Percentage of an average year that will be asked for; gas and cloud are held at their 5 %
        values below 5 % (P.618-14 §2.5), so any value up to 5 gives the same climate.

    Returns
    -------
    tuple of Climate
        One per frequency; the arrays that do not depend on it are shared. NaN where a coordinate is.

    Raises
    ------
    ValueError
        A frequency is outside of 1 to 55 GHz, or the percentage outside of 0.001 to 50 %.
    GeoskewError
        The package that carries the maps is not installed.
    """
    for frequency in frequencies_ghz:
        if not 1.0 <= frequency <= 55.0:
            raise ValueError(f"frequency {frequency} GHz: the weather methods of P.618-14 hold up to 55 GHz")
    held = held_percentage(percentage)
    longitude, latitude, height_m = (
        np.asarray(array, dtype=np.float64) for array in (longitude, latitude, height_m)
    )
    gases = [ZenithGas.at(float(frequency)) for frequency in frequencies_ghz]

    def look_up(longitude: FloatArray, latitude: FloatArray, height_m: FloatArray) -> list[FloatArray]:
        height = _height_km(longitude, latitude, height_m)
        temperature = maps.surface_temperature(longitude, latitude)
        vapour = maps.water_vapour(longitude, latitude, height, percentages=(held, CLEAR_PERCENTAGE))
        shared = [
            maps.rain_rate(longitude, latitude),
            maps.rain_height(longitude, latitude),
            height,
            maps.cloud_liquid(longitude, latitude, percentage=held),
            maps.wet_refractivity(longitude, latitude),
        ]
        for gas in gases:
            shared.extend(gas.attenuation(height, temperature, vapour))
        return shared

    rate, rain_height, height, liquid, wet, *zenith = in_strips(look_up, (longitude, latitude, height_m))
    return tuple(
        Climate(gas.frequency_ghz, held, latitude, rate, rain_height, height, *pair, liquid, wet)
        for gas, pair in zip(gases, zip(zenith[::2], zenith[1::2], strict=True), strict=True)
    )


def clear_zenith(
    longitude: ArrayLike, latitude: ArrayLike, height_m: ArrayLike, *, frequencies_ghz: Sequence[float]
) -> list[FloatArray]:
    """Gas towards the zenith in clear air alone, dB, a frequency: `Climate.zenith_gas_clear` and no more.

    Arguments and errors as in `climates`.
    """
    longitude, latitude, height_m = (
        np.asarray(array, dtype=np.float64) for array in (longitude, latitude, height_m)
    )
    gases = [ZenithGas.at(float(frequency)) for frequency in frequencies_ghz]

    def look_up(longitude: FloatArray, latitude: FloatArray, height_m: FloatArray) -> list[FloatArray]:
        height = _height_km(longitude, latitude, height_m)
        temperature = maps.surface_temperature(longitude, latitude)
        vapour = maps.water_vapour(longitude, latitude, height, percentages=(CLEAR_PERCENTAGE,))
        return [gas.attenuation(height, temperature, vapour)[0] for gas in gases]

    return list(in_strips(look_up, (longitude, latitude, height_m)))


def held_percentage(percentage: float) -> float:
    """Percentage of an average year at which gas and cloud are taken: P.618-14 §2.5, eq. (66)-(67).

    Raises
    ------
    ValueError
        The percentage is outside of 0.001 to 50 %.
    """
    if not 0.001 <= percentage <= 50.0:
        raise ValueError(
            f"percentage {percentage}: P.618-14 §2.5 holds for 0.001 to 50 % of an average year; "
            "ask for an availability of 50 to 99.999 %"
        )
    return max(HELD_PERCENTAGE, float(percentage))


def _height_km(longitude: FloatArray, latitude: FloatArray, height_m: FloatArray) -> FloatArray:
    unknown = np.isnan(height_m)
    if not unknown.any():
        return height_m / 1000.0
    mapped = maps.topography(longitude, latitude)
    return mapped if unknown.all() else np.where(unknown, mapped, height_m / 1000.0)
