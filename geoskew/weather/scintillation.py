"""Fades by tropospheric scintillation: Rec. ITU-R P.618-14 §2.4.1, for elevations of 5° to 90°."""

from __future__ import annotations

from functools import lru_cache
from math import log10, radians, sin

import numpy as np
from numpy.typing import ArrayLike, NDArray

FloatArray = NDArray[np.float64]

# Height of the turbulent layer, m: P.618-14 §2.4.1.
_TURBULENT_HEIGHT_M = 1000.0
# Below this percentage the fade keeps its value: the method holds for 0.01 to 50 %.
LEAST_PERCENTAGE = 0.01
# Nodes of the table over sin θ that stands for the formula when many places share one dish; linear
# interpolation between them is right to 1e-6 of the fade's largest value.
_TABLE_NODES = 16384
_TABLE_WORTH = 4096


def deviation(
    elevation: FloatArray,
    wet_refractivity: FloatArray,
    *,
    frequency_ghz: float,
    diameter_m: ArrayLike,
    efficiency: ArrayLike,
    sine: FloatArray | None = None,
) -> FloatArray:
    """Standard deviation of the signal, dB: P.618-14, eq. (43)-(47).

    Parameters
    ----------
    elevation : ndarray
        Degrees; NaN below 5°.
    wet_refractivity : ndarray
        Wet term of the refractivity, N-units (P.453).
    frequency_ghz : float
        4 to 55 GHz; below 4 GHz it is an extrapolation.
    diameter_m, efficiency : array_like
        Diameter of the dish, m, and its efficiency. All shapes broadcast.
    sine : ndarray, optional
        Sine of the elevation, NaN below 5°, for callers who have it already.
    """
    if sine is None:
        sine = np.sin(np.radians(np.where(elevation >= 5.0, elevation, np.nan)))
    area = np.asarray(efficiency, dtype=np.float64) * np.asarray(diameter_m, dtype=np.float64) ** 2
    if area.size == 1 and sine.size > _TABLE_WORTH:
        table = _path_table(frequency_ghz, float(area.item()))
        place = (sine - _LEAST_SINE) * ((_TABLE_NODES - 1) / (1.0 - _LEAST_SINE))
        node = np.clip(np.nan_to_num(place), 0, _TABLE_NODES - 2).astype(np.intp)
        below = table[node]
        path = below + (place - node) * (table[node + 1] - below)
    else:
        path = _path_factor(sine, area, frequency_ghz)
    return np.asarray((3.6e-3 + 1e-4 * wet_refractivity) * path)


_LEAST_SINE = sin(radians(5.0))


@lru_cache(maxsize=64)
def _path_table(frequency_ghz: float, area: float) -> FloatArray:
    sines = np.linspace(_LEAST_SINE, 1.0, _TABLE_NODES)
    return _path_factor(sines, np.asarray(area), frequency_ghz)


def _path_factor(sine: FloatArray, area: FloatArray, frequency_ghz: float) -> FloatArray:
    """f^(7/12)·g(x)/sin^1.2 θ of eq. (47); area is efficiency × diameter²."""
    length = 2.0 * _TURBULENT_HEIGHT_M / (np.sqrt(sine * sine + 2.35e-4) + sine)
    x = 1.22 * area * frequency_ghz / length
    averaging = 3.86 * (x * x + 1.0) ** (11.0 / 12.0) * np.sin(11.0 / 6.0 * np.arctan2(1.0, x))
    averaging = averaging - 7.08 * x ** (5.0 / 6.0)
    # A negative argument of the square root (from x = 7 on) means no fade, by the recommendation.
    averaging = np.where(x >= 7.0, 0.0, np.maximum(averaging, 0.0))
    return np.asarray(frequency_ghz ** (7.0 / 12.0) * np.sqrt(averaging) / sine**1.2)


def time_factor(percentage: float) -> float:
    """Factor a(p) between the standard deviation and the fade exceeded for p %: P.618-14, eq. (48).

    Raises
    ------
    ValueError
        The percentage is above 50; below 0.01 the factor keeps its value at 0.01.
    """
    if not percentage <= 50.0:
        raise ValueError(f"percentage {percentage}: P.618-14 §2.4.1 predicts fades for up to 50 % of a year")
    x = log10(max(percentage, LEAST_PERCENTAGE))
    return -0.061 * x**3 + 0.072 * x**2 - 1.71 * x + 3.0
