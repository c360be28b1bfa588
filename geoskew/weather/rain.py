"""Rain attenuation: Rec. ITU-R P.618-14 §2.2.1.1 with the specific attenuation of P.838-3."""

from __future__ import annotations

from math import exp, log, log10
from typing import NamedTuple

import numpy as np
from numpy.typing import ArrayLike, NDArray

FloatArray = NDArray[np.float64]

# Effective radius of the Earth of P.618-14 eq. (2), km.
_EFFECTIVE_RADIUS_KM = 8500.0
# Range of the method, percent of an average year and GHz: P.618-14 §2.2.1.1.
LEAST_PERCENTAGE, MOST_PERCENTAGE = 0.001, 5.0
MOST_FREQUENCY_GHZ = 55.0

# P.838-3 Tables 1 to 4: (a_j, b_j, c_j) of the Gaussian terms, then the slope and the constant.
_K_HORIZONTAL = (
    ((-5.33980, -0.10008, 1.13098), (-0.35351, 1.26970, 0.45400))
    + ((-0.23789, 0.86036, 0.15354), (-0.94158, 0.64552, 0.16817)),
    -0.18961,
    0.71147,
)
_K_VERTICAL = (
    ((-3.80595, 0.56934, 0.81061), (-3.44965, -0.22911, 0.51059))
    + ((-0.39902, 0.73042, 0.11899), (0.50167, 1.07319, 0.27195)),
    -0.16398,
    0.63297,
)
_ALPHA_HORIZONTAL = (
    ((-0.14318, 1.82442, -0.55187), (0.29591, 0.77564, 0.19822), (0.32177, 0.63773, 0.13164))
    + ((-5.37610, -0.96230, 1.47828), (16.1721, -3.29980, 3.43990)),
    0.67849,
    -1.95537,
)
_ALPHA_VERTICAL = (
    ((-0.07771, 2.33840, -0.76284), (0.56727, 0.95545, 0.54039), (-0.20238, 1.14520, 0.26809))
    + ((-48.2991, 0.791669, 0.116226), (48.5833, 0.791459, 0.116479)),
    -0.053739,
    0.83433,
)


class LinearCoefficients(NamedTuple):
    """k and α of P.838-3 for horizontal and vertical polarisation."""

    k_horizontal: float
    k_vertical: float
    alpha_horizontal: float
    alpha_vertical: float


def linear_coefficients(frequency_ghz: float) -> LinearCoefficients:
    """Coefficients for linear polarisation on horizontal paths: P.838-3, eq. (2)-(3) with Tables 1-4."""

    def curve(table: tuple[tuple[tuple[float, float, float], ...], float, float]) -> float:
        terms, slope, constant = table
        x = log10(frequency_ghz)
        bells = sum(a * exp(-(((x - b) / c) ** 2)) for a, b, c in terms)
        return bells + slope * x + constant

    return LinearCoefficients(
        float(10.0 ** curve(_K_HORIZONTAL)),
        float(10.0 ** curve(_K_VERTICAL)),
        curve(_ALPHA_HORIZONTAL),
        curve(_ALPHA_VERTICAL),
    )


def coefficients(
    elevation: ArrayLike, tilt: ArrayLike, *, frequency_ghz: float
) -> tuple[FloatArray, FloatArray]:
    """Coefficients k and α for any path and polarisation: P.838-3, eq. (4)-(5).

    Parameters
    ----------
    elevation : array_like
        Degrees.
    tilt : array_like
        Angle of the E-vector from the local horizontal, degrees, modulo 180; 45 for circular
        polarisation. Shapes broadcast.
    """
    cosine = np.cos(np.radians(np.asarray(elevation, dtype=np.float64)))
    return _mixed(cosine * cosine, np.asarray(tilt, dtype=np.float64), frequency_ghz)


def _mixed(
    cosine_squared: FloatArray, tilt: FloatArray, frequency_ghz: float
) -> tuple[FloatArray, FloatArray]:
    kh, kv, alpha_h, alpha_v = linear_coefficients(frequency_ghz)
    mix = cosine_squared * np.cos(np.radians(2.0 * tilt))
    doubled = (kh + kv) + (kh - kv) * mix
    alpha = ((kh * alpha_h + kv * alpha_v) + (kh * alpha_h - kv * alpha_v) * mix) / doubled
    return doubled / 2.0, alpha


def specific_attenuation(
    rate: ArrayLike, elevation: ArrayLike, tilt: ArrayLike, *, frequency_ghz: float
) -> FloatArray:
    """Specific attenuation of rain, dB/km: P.838-3, eq. (1).

    Rain rate in mm/h; the others as in `coefficients`. Shapes broadcast.
    """
    k, alpha = coefficients(elevation, tilt, frequency_ghz=frequency_ghz)
    return np.asarray(k * np.asarray(rate, dtype=np.float64) ** alpha)


def attenuation_001(
    rate: FloatArray,
    depth_km: FloatArray,
    latitude: FloatArray,
    elevation: FloatArray,
    tilt: FloatArray,
    *,
    frequency_ghz: float,
    sine: FloatArray | None = None,
) -> FloatArray:
    """Rain attenuation exceeded for 0.01 % of an average year, dB: P.618-14 §2.2.1.1, eq. (1)-(7).

    Parameters
    ----------
    rate : ndarray
        Rain rate exceeded for 0.01 % of an average year, mm/h.
    depth_km : ndarray
        Rain height less height of the place, km; no rain attenuation where it is not positive.
    latitude, elevation : ndarray
        Degrees. NaN where the elevation is not positive.
    tilt : ndarray
        As in `coefficients`. All shapes broadcast.
    frequency_ghz : float
        Up to 55 GHz.
    sine : ndarray, optional
        Sine of the elevation, NaN where that is not positive, for callers who have it already.
    """
    if sine is None:
        sine = np.sin(np.radians(np.where(elevation > 0.0, elevation, np.nan)))
    cosine_squared = 1.0 - sine * sine
    depth = np.maximum(depth_km, 0.0)
    k, alpha = _mixed(cosine_squared, tilt, frequency_ghz)
    gamma = k * rate**alpha
    # Slant path below the rain height, eq. (1), and eq. (2) where the Earth's curvature counts.
    vertical = depth / sine
    path = vertical
    if np.any(elevation < 5.0):
        low = 2.0 * depth / (np.sqrt(sine * sine + 2.0 * depth / _EFFECTIVE_RADIUS_KM) + sine)
        path = np.where(elevation < 5.0, low, vertical)
    ground = path * np.sqrt(cosine_squared)
    reduction = 1.0 / (
        1.0 + 0.78 * np.sqrt(ground * gamma / frequency_ghz) - 0.38 * (1.0 - np.exp(-2.0 * ground))
    )
    # Step 7 compares ζ = atan(depth / (L_G r)) with the elevation; as L_R is L_G r / cos θ above it
    # and depth / sin θ below, it is the smaller of the two and no angle has to be taken.
    rainy = np.minimum(path * reduction, vertical)
    chi = np.maximum(36.0 - np.abs(latitude), 0.0)
    lift = 31.0 * (1.0 - np.exp(-elevation / (1.0 + chi)))
    adjustment = 1.0 + np.sqrt(sine) * (lift * np.sqrt(rainy * gamma) / frequency_ghz**2 - 0.45)
    return np.asarray(gamma * rainy / adjustment)


def at_percentage(
    attenuation: FloatArray,
    latitude: FloatArray,
    elevation: FloatArray,
    *,
    percentage: float,
    sine: FloatArray | None = None,
) -> FloatArray:
    """Rain attenuation exceeded for another percentage of an average year, dB: P.618-14, eq. (8).

    Parameters
    ----------
    attenuation : ndarray
        The value for 0.01 % at each place, dB, from `attenuation_001`.
    latitude, elevation : ndarray
        Degrees; shapes that broadcast to the attenuation's.
    percentage : float
        0.001 to 5 % of an average year; above 5 % the rain is left out (0 dB, P.618-14 §2.5).
    sine : ndarray, optional
        Sine of the elevation, for callers who have it already.

    Raises
    ------
    ValueError
        The percentage is below 0.001.
    """
    if not percentage >= LEAST_PERCENTAGE:
        raise ValueError(
            f"percentage {percentage}: P.618-14 predicts rain for 0.001 to 5 % of an average year; "
            "ask for an availability of at most 99.999 %"
        )
    if percentage > MOST_PERCENTAGE:
        return np.asarray(0.0 * attenuation)
    growth = log(percentage / 0.01)
    if percentage == 0.01:
        return attenuation
    # No rain has no logarithm; the exponential below makes 0 of it again.
    with np.errstate(divide="ignore"):
        exponent = (1.0 + 0.045 * growth) * np.log(attenuation)
    exponent = exponent - growth * (0.655 + 0.033 * log(percentage))
    if percentage < 1.0:
        sine = np.sin(np.radians(elevation)) if sine is None else sine
        exponent = exponent + (growth * (1.0 - percentage)) * (_beta(latitude, elevation, sine) * sine)
    return np.asarray(np.exp(exponent))


def _beta(latitude: FloatArray, elevation: FloatArray, sine: FloatArray) -> FloatArray:
    """Exponent term of eq. (8) for percentages below 1 %."""
    distance = np.abs(latitude) - 36.0
    steep = np.where(elevation >= 25.0, 0.0, 1.8 - 4.25 * sine)
    return np.asarray(np.where(distance >= 0.0, 0.0, -0.005 * distance + steep))
