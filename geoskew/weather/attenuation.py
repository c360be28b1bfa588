"""Attenuation of a slant path by everything together: Rec. ITU-R P.618-14 §2.5.

The choice of edition: below 5 % of an average year gas and cloud keep their 5 % values (edition 13 kept
those of 1 %). The validation examples at hand are of edition 13: they hold the combining formula, and
each contribution on its own. The 5 % itself rests on the text of edition 14, eq. (66)-(67).
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from geoskew.weather import rain, scintillation
from geoskew.weather.climate import Climate, held_percentage
from geoskew.weather.cloud import liquid_coefficient
from geoskew.weather.depolarisation import LEAST_FREQUENCY_GHZ, rain_frequency
from geoskew.weather.outage import PERCENTAGES
from geoskew.weather.strips import in_strips

FloatArray = NDArray[np.float64]


@dataclass(frozen=True, slots=True)
class Attenuation:
    """Attenuation exceeded for a percentage of an average year, dB, arrays of the places' shape.

    Attributes
    ----------
    percentage : float
        Percent of an average year.
    rain, gas, cloud, scintillation : ndarray
        The contributions; gas and cloud at the held percentage.
    total : ndarray
        All of them, P.618-14 eq. (65).
    total_without_scintillation : ndarray
        The part that absorbs and hence radiates noise: gas, cloud and rain.
    depolarising_rain : ndarray
        Rain attenuation to give to `depolarisation.discrimination`: `rain`, or at 4 to 6 GHz the rain
        attenuation at 6 GHz.
    """

    percentage: float
    rain: FloatArray
    gas: FloatArray
    cloud: FloatArray
    scintillation: FloatArray
    total: FloatArray
    total_without_scintillation: FloatArray
    depolarising_rain: FloatArray


def combined(gas: ArrayLike, rain: ArrayLike, cloud: ArrayLike, scintillation: ArrayLike) -> FloatArray:
    """Total attenuation, dB: P.618-14 §2.5, eq. (65). Shapes broadcast."""
    absorbed = np.asarray(rain, dtype=np.float64) + np.asarray(cloud, dtype=np.float64)
    fade = np.asarray(scintillation, dtype=np.float64)
    return np.asarray(np.asarray(gas, dtype=np.float64) + np.sqrt(absorbed * absorbed + fade * fade))


def attenuation(
    climate: Climate,
    elevation: ArrayLike,
    tilt: ArrayLike,
    *,
    percentage: float,
    diameter_m: ArrayLike,
    efficiency: ArrayLike,
) -> Attenuation:
    """Attenuation exceeded for one percentage of an average year. Arguments as in `ladder`."""
    return ladder(
        climate,
        elevation,
        tilt,
        percentages=(percentage,),
        diameter_m=diameter_m,
        efficiency=efficiency,
    )[0]


def ladder(
    climate: Climate,
    elevation: ArrayLike,
    tilt: ArrayLike,
    *,
    percentages: Sequence[float] = PERCENTAGES,
    diameter_m: ArrayLike,
    efficiency: ArrayLike,
) -> tuple[Attenuation, ...]:
    """Attenuation exceeded for each of several percentages of an average year.

    Parameters
    ----------
    climate : Climate
        Of the places, at the carrier's frequency.
    elevation : array_like
        Degrees. Below 5°, where the methods for gas, cloud and scintillation do not hold, only the
        rain has a value; it has none where the elevation is not positive.
    tilt : array_like
        Angle of the wanted E-vector from the local horizontal, degrees, modulo 180; 45 for circular
        polarisation.
    percentages : sequence of float
        0.001 to 50 % of an average year; above 5 % the rain is left out. Above 5 % the climate must
        have been looked up for the same percentage.
    diameter_m, efficiency : array_like
        Of the receiving dish. All shapes broadcast with the climate's.

    Returns
    -------
    tuple of Attenuation
        One per percentage.

    Raises
    ------
    ValueError
        A percentage is out of range, or not the one that the climate was looked up for.
    """
    for percentage in percentages:
        if held_percentage(percentage) != climate.held_percentage:
            raise ValueError(
                f"percentage {percentage}: gas and cloud of this climate are those of "
                f"{climate.held_percentage} %; look the climate up for {percentage} %"
            )
    arrays = (
        climate.latitude,
        climate.rain_rate,
        climate.rain_height - climate.height,
        climate.zenith_gas,
        climate.cloud_liquid,
        climate.wet_refractivity,
        elevation,
        tilt,
        diameter_m,
        efficiency,
    )
    formula = _PathFormula(climate.frequency_ghz, tuple(float(value) for value in percentages))
    gas, cloud, *rest = in_strips(formula, [np.asarray(array, dtype=np.float64) for array in arrays])
    results = []
    count = len(rest) // len(percentages)
    for index, percentage in enumerate(percentages):
        wet, fade, total, absorbed, *scaled = rest[count * index : count * (index + 1)]
        depolarising = scaled[0] if scaled else wet
        results.append(Attenuation(percentage, wet, gas, cloud, fade, total, absorbed, depolarising))
    return tuple(results)


def clear_sky_gas(climate: Climate, elevation: ArrayLike) -> FloatArray:
    """Gaseous attenuation in clear air, dB: water vapour at its median. NaN below 5°.

    P.676-12 Annex 2 with the annual mean temperature (P.1510-1), the standard atmosphere's pressure
    (P.835-6) and the water vapour exceeded for 50 % of an average year (P.836-6), all at the place's
    height. The median rather than a high percentile: clear sky is what a crew meets on most days.
    """
    angle = np.asarray(elevation, dtype=np.float64)
    sine = np.sin(np.radians(np.where(angle >= 5.0, angle, np.nan)))
    return np.asarray(climate.zenith_gas_clear / sine)


@dataclass(frozen=True)
class _PathFormula:
    """The formulas of one frequency and several percentages, called strip by strip."""

    frequency_ghz: float
    percentages: tuple[float, ...]

    def __call__(self, *arrays: FloatArray) -> list[FloatArray]:
        latitude, rate, depth, zenith_gas, liquid, wet, elevation, tilt, diameter, efficiency = arrays
        frequency = self.frequency_ghz
        sine = np.sin(np.radians(np.where(elevation > 0.0, elevation, np.nan)))
        steep = np.where(elevation >= 5.0, sine, np.nan)
        gas = zenith_gas / steep
        cloud = liquid * liquid_coefficient(frequency) / steep
        deviation = scintillation.deviation(
            elevation,
            wet,
            frequency_ghz=frequency,
            diameter_m=diameter,
            efficiency=efficiency,
            sine=steep,
        )
        place = (rate, depth, latitude, elevation, tilt)
        rain_001 = rain.attenuation_001(*place, frequency_ghz=frequency, sine=sine)
        rains_001 = [rain_001]
        if frequency >= LEAST_FREQUENCY_GHZ and rain_frequency(frequency) != frequency:
            scaled = rain_frequency(frequency)
            rains_001.append(rain.attenuation_001(*place, frequency_ghz=scaled, sine=sine))
        results = [gas, cloud]
        for percentage in self.percentages:
            fade = deviation * scintillation.time_factor(percentage)
            wet_fade, *depolarising = (
                rain.at_percentage(value, latitude, elevation, percentage=percentage, sine=sine)
                for value in rains_001
            )
            total = combined(gas, wet_fade, cloud, fade)
            results += [wet_fade, fade, total, gas + cloud + wet_fade, *depolarising]
        return results
