"""Gaseous attenuation towards the zenith: Rec. ITU-R P.676-12, Annex 2 (approximate slant path).

Oxygen is the specific attenuation of the line-by-line model at the surface (Annex 1 §1) times the
equivalent height (Annex 2 §2.2); water vapour follows from the total column (Annex 2 §2.3). Both are
divided by the sine of the elevation, for 5° to 90°.
"""

from __future__ import annotations

from functools import cache

import numpy as np
from numpy.typing import ArrayLike, NDArray

from geoskew.weather.maps import data_file

FloatArray = NDArray[np.float64]

# Reference frequency and pressure of the water vapour column method, P.676-12 Annex 2 §2.3.
_REFERENCE_FREQUENCY_GHZ = 20.6
_REFERENCE_PRESSURE_HPA = 845.0
# Below this column, kg/m², the reference temperature of the method has no meaning; it attenuates
# less than 1e-4 dB at any frequency up to 55 GHz.
_LEAST_COLUMN = 0.01

# (c_i, f_i) of the term t2 of the equivalent height of oxygen, P.676-12 Annex 2 Table 3.
_OXYGEN_HEIGHT_LINES = (
    (0.1597, 118.750334),
    (0.1066, 368.498246),
    (0.1325, 424.763020),
    (0.1242, 487.249273),
    (0.0938, 715.392902),
    (0.1448, 773.839490),
    (0.1374, 834.145546),
)


@cache
def _lines(name: str) -> FloatArray:
    """Columns of a table of spectral lines, each of shape (lines,)."""
    table = np.loadtxt(data_file(f"676/v12_lines_{name}.txt"), delimiter=",", skiprows=1)
    return np.asarray(table.T)


def standard_pressure(height_km: ArrayLike) -> FloatArray:
    """Total pressure of the reference standard atmosphere, hPa, up to 11 km: P.835-6 §1.1, eq. (3a).

    Heights in km above mean sea level, any shape.
    """
    height = np.asarray(height_km, dtype=np.float64)
    geopotential = 6356.766 * height / (6356.766 + height)
    return np.asarray(1013.25 * (288.15 / (288.15 - 6.5 * geopotential)) ** (-34.1632 / 6.5))


def oxygen_specific_attenuation(
    frequency_ghz: float, pressure_hpa: ArrayLike, density: ArrayLike, temperature_k: ArrayLike
) -> FloatArray:
    """Specific attenuation of dry air, dB/km: P.676-12 Annex 1, eq. (1)-(9) with Table 1.

    Pressure in hPa, as Annex 2 enters it, water vapour density in g/m³, temperature in K; shapes
    that broadcast.
    """
    f0, a1, a2, a3, a4, a5, a6 = _lines("oxygen")
    f = frequency_ghz
    p = np.asarray(pressure_hpa, dtype=np.float64)[..., None]
    temperature = np.asarray(temperature_k, dtype=np.float64)[..., None]
    vapour = np.asarray(density, dtype=np.float64)[..., None] * temperature / 216.7
    theta = 300.0 / temperature
    strength = a1 * 1e-7 * p * theta**3 * np.exp(a2 * (1.0 - theta))
    width = a3 * 1e-4 * (p * theta ** (0.8 - a4) + 1.1 * vapour * theta)
    width = np.sqrt(width**2 + 2.25e-6)
    shift = (a5 + a6 * theta) * 1e-4 * (p + vapour) * theta**0.8
    below = (width - shift * (f0 - f)) / ((f0 - f) ** 2 + width**2)
    above = (width - shift * (f0 + f)) / ((f0 + f) ** 2 + width**2)
    lines = (strength * f / f0 * (below + above)).sum(axis=-1)
    p, vapour, theta = p[..., 0], vapour[..., 0], theta[..., 0]
    debye = 5.6e-4 * (p + vapour) * theta**0.8
    continuum = 6.14e-5 / (debye * (1.0 + (f / debye) ** 2))
    continuum = continuum + 1.4e-12 * p * theta**1.5 / (1.0 + 1.9e-5 * f**1.5)
    return np.asarray(0.1820 * f * (lines + f * p * theta**2 * continuum))


def vapour_specific_attenuation(
    frequency_ghz: float, pressure_hpa: ArrayLike, density: ArrayLike, temperature_k: ArrayLike
) -> FloatArray:
    """Specific attenuation of water vapour, dB/km: P.676-12 Annex 1, eq. (1)-(9) with Table 2."""
    f0, b1, b2, b3, b4, b5, b6 = _lines("water_vapour")
    f = frequency_ghz
    p = np.asarray(pressure_hpa, dtype=np.float64)[..., None]
    temperature = np.asarray(temperature_k, dtype=np.float64)[..., None]
    vapour = np.asarray(density, dtype=np.float64)[..., None] * temperature / 216.7
    theta = 300.0 / temperature
    strength = b1 * 1e-1 * vapour * theta**3.5 * np.exp(b2 * (1.0 - theta))
    width = b3 * 1e-4 * (p * theta**b4 + b5 * vapour * theta**b6)
    width = 0.535 * width + np.sqrt(0.217 * width**2 + 2.1316e-12 * f0**2 / theta)
    shape = width / ((f0 - f) ** 2 + width**2) + width / ((f0 + f) ** 2 + width**2)
    return np.asarray(0.1820 * f * (strength * f / f0 * shape).sum(axis=-1))


def oxygen_equivalent_height(
    frequency_ghz: float, pressure_hpa: ArrayLike, density: ArrayLike, temperature_k: ArrayLike
) -> FloatArray:
    """Equivalent height of dry air, km: P.676-12 Annex 2, eq. (30)-(34). Shapes that broadcast."""
    f = frequency_ghz
    temperature = np.asarray(temperature_k, dtype=np.float64)
    pressure = np.asarray(pressure_hpa, dtype=np.float64)
    ratio = (pressure + np.asarray(density, dtype=np.float64) * temperature / 216.7) / 1013.25
    first = 5.1040 / (1.0 + 0.066 * ratio**-2.3)
    first = first * np.exp(-(((f - 59.7) / (2.87 + 12.4 * np.exp(-7.9 * ratio))) ** 2))
    second = np.zeros(np.shape(ratio))
    for strength, line in _OXYGEN_HEIGHT_LINES:
        second = second + strength * np.exp(2.12 * ratio) / ((f - line) ** 2 + 0.025 * np.exp(2.2 * ratio))
    third = 0.0114 * f / (1.0 + 0.14 * ratio**-2.6)
    third = third * (15.02 * f**2 - 1353.0 * f + 5.333e4) / (f**3 - 151.3 * f**2 + 9629.0 * f - 6803.0)
    scale = 0.7832 + 0.00709 * (temperature - 273.15)
    height = 6.1 * scale / (1.0 + 0.17 * ratio**-1.1) * (1.0 + first + second + third)
    return np.asarray(np.minimum(height, 10.7 * ratio**0.3) if f < 70.0 else height)


def zenith_oxygen(
    frequency_ghz: float, pressure_hpa: ArrayLike, density: ArrayLike, temperature_k: ArrayLike
) -> FloatArray:
    """Attenuation of dry air towards the zenith, dB. Shapes that broadcast."""
    surface = (frequency_ghz, pressure_hpa, density, temperature_k)
    return oxygen_specific_attenuation(*surface) * oxygen_equivalent_height(*surface)


def column_ratio(frequency_ghz: float, column: ArrayLike) -> FloatArray:
    """Zenith attenuation of water vapour per column, dB·m²/kg, at sea level: P.676-12 Annex 2 §2.3.

    Column in kg/m², any shape; columns below 0.01 are taken as 0.01.
    """
    amount = np.maximum(np.asarray(column, dtype=np.float64), _LEAST_COLUMN)
    density = amount / 2.38
    temperature = 14.0 * np.log(0.22 * amount / 2.38) + 3.0 + 273.15
    wanted, reference = (
        vapour_specific_attenuation(frequency, _REFERENCE_PRESSURE_HPA, density, temperature)
        for frequency in (frequency_ghz, _REFERENCE_FREQUENCY_GHZ)
    )
    return np.asarray(0.0176 * wanted / reference)


def height_factor(frequency_ghz: float, height_km: ArrayLike) -> FloatArray:
    """Factor of the water vapour's attenuation for the place's height, 20 GHz and above; 1 below.

    P.676-12 Annex 2 §2.3, with the height held to 0 to 4 km.
    """
    f = frequency_ghz
    height = np.clip(np.asarray(height_km, dtype=np.float64), 0.0, 4.0)
    if f < 20.0:
        return np.ones(height.shape)
    a = 0.2048 * np.exp(-(((f - 22.43) / 3.097) ** 2)) + 0.2326 * np.exp(-(((f - 183.5) / 4.096) ** 2))
    a += 0.2073 * np.exp(-(((f - 325.0) / 3.651) ** 2)) - 0.1113
    b = 8.741e4 * np.exp(-0.587 * f) + 312.2 * f**-2.38 + 0.723
    return np.asarray(a * height**b + 1.0)


def zenith_vapour(frequency_ghz: float, column: ArrayLike, height_km: ArrayLike) -> FloatArray:
    """Attenuation of water vapour towards the zenith, dB: P.676-12 Annex 2 §2.3.

    Column in kg/m², height in km above mean sea level; shapes that broadcast.
    """
    amount = np.asarray(column, dtype=np.float64)
    return np.asarray(amount * column_ratio(frequency_ghz, amount) * height_factor(frequency_ghz, height_km))


def slant(zenith: ArrayLike, elevation: ArrayLike) -> FloatArray:
    """Attenuation along a slant path, dB; NaN below 5°, where the method does not hold.

    P.676-12 Annex 2, eq. (29): zenith attenuation over the sine of the elevation, degrees.
    """
    angle = np.asarray(elevation, dtype=np.float64)
    sine = np.sin(np.radians(np.where(angle >= 5.0, angle, np.nan)))
    return np.asarray(np.asarray(zenith, dtype=np.float64) / sine)
