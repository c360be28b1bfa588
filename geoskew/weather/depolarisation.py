"""Depolarisation by rain and ice: Rec. ITU-R P.618-14 §4.1."""

from __future__ import annotations

from math import log10

import numpy as np
from numpy.typing import ArrayLike, NDArray

FloatArray = NDArray[np.float64]

# Range of the method, GHz; eq. (79) scales from 6 GHz down to 4 GHz.
LEAST_FREQUENCY_GHZ, SCALED_BELOW_GHZ, MOST_FREQUENCY_GHZ = 4.0, 6.0, 55.0
# The method holds for elevations up to this; a higher one counts as this.
MOST_ELEVATION = 60.0
# Effective standard deviation of the raindrops' canting angle: (percentage, degrees).
_CANTING = ((0.001, 15.0), (0.01, 10.0), (0.1, 5.0), (1.0, 0.0))


def rain_frequency(frequency_ghz: float) -> float:
    """Frequency whose rain attenuation enters the discrimination, GHz: 6 GHz for 4 to 6 GHz.

    Eq. (79) scales a discrimination that was found at 6 GHz, from the attenuation there.

    Raises
    ------
    ValueError
        The frequency is outside of 4 to 55 GHz.
    """
    if not LEAST_FREQUENCY_GHZ <= frequency_ghz <= MOST_FREQUENCY_GHZ:
        raise ValueError(
            f"frequency {frequency_ghz} GHz: P.618-14 §4.1 predicts depolarisation for 4 to 55 GHz only"
        )
    return max(frequency_ghz, SCALED_BELOW_GHZ)


def discrimination(
    rain: ArrayLike, elevation: ArrayLike, tilt: ArrayLike, *, frequency_ghz: float, percentage: float
) -> FloatArray:
    """Cross-polarisation discrimination not exceeded for a percentage of an average year, dB.

    P.618-14 §4.1, eq. (71)-(79), the ice term included. The canting angle's deviation is tabulated for
    1, 0.1, 0.01 and 0.001 %; between these it is interpolated linearly in the logarithm of the
    percentage (the recommendation names no rule), and it stays at the nearest value outside of them.

    Parameters
    ----------
    rain : array_like
        Rain attenuation alone at `rain_frequency(frequency_ghz)`, dB, for the same percentage.
    elevation : array_like
        Degrees; above 60° counts as 60°.
    tilt : array_like
        Angle of the E-vector from the local horizontal, degrees, modulo 180; 45 for circular
        polarisation. Shapes broadcast.
    frequency_ghz : float
        4 to 55 GHz.
    percentage : float
        Percent of an average year.

    Returns
    -------
    ndarray
        dB; infinite where there is no rain attenuation, NaN where an input is NaN.

    Raises
    ------
    ValueError
        The frequency is outside of 4 to 55 GHz.
    """
    frequency = rain_frequency(frequency_ghz)
    cosine = np.cos(np.radians(np.minimum(np.asarray(elevation, dtype=np.float64), MOST_ELEVATION)))
    # cos 4τ = 2 cos² 2τ − 1, and eq. (73) and (74) are one logarithm of a product.
    double = np.cos(np.radians(2.0 * np.asarray(tilt, dtype=np.float64)))
    geometry = (1.0 - 0.968 * double * double) * (cosine * cosine) ** 2
    constant = _frequency_term(frequency) + 0.0053 * canting(percentage) ** 2
    with np.errstate(divide="ignore"):
        fade = np.log10(np.asarray(rain, dtype=np.float64))
    of_rain = constant - _fade_slope(frequency) * fade - 10.0 * np.log10(geometry)
    with_ice = of_rain * (1.0 - (0.3 + 0.1 * log10(percentage)) / 2.0)
    return np.asarray(with_ice - 20.0 * log10(frequency_ghz / frequency))


def polarisation_term(tilt: ArrayLike) -> FloatArray:
    """Improvement of linear over circular polarisation, C_τ in dB: P.618-14, eq. (73)."""
    angle = np.radians(4.0 * np.asarray(tilt, dtype=np.float64))
    return np.asarray(-10.0 * np.log10(1.0 - 0.484 * (1.0 + np.cos(angle))))


def canting(percentage: float) -> float:
    """Effective deviation of the canting angle, degrees, linear in the logarithm of the percentage."""
    percentages, degrees = zip(*_CANTING, strict=True)
    return float(np.interp(np.log10(percentage), np.log10(percentages), degrees))


def _frequency_term(f: float) -> float:
    """C_f of eq. (71)."""
    if f < 9.0:
        return 60.0 * log10(f) - 28.3
    if f < 36.0:
        return 26.0 * log10(f) + 4.1
    return 35.9 * log10(f) - 11.3


def _fade_slope(f: float) -> float:
    """V(f) of eq. (72)."""
    if f < 9.0:
        return float(30.8 * f**-0.21)
    if f < 20.0:
        return float(12.8 * f**0.19)
    if f < 40.0:
        return 22.6
    return float(13.0 * f**0.15)
