"""Angles that close on themselves: azimuths modulo 360°, polarisation angles modulo 180°."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray


def fold(angle: ArrayLike) -> NDArray[np.float64]:
    """Bring a polarisation angle, or a difference of two, into (−90, 90].

    Parameters
    ----------
    angle : array_like
        Degrees, any shape.

    Returns
    -------
    ndarray
        The same shape, in (−90, 90]; NaN stays NaN.

    Examples
    --------
    >>> fold([-90.0, 95.0, 180.0]).tolist()
    [90.0, -85.0, 0.0]
    """
    angle = np.asarray(angle, dtype=np.float64)
    # Cheaper than a modulo; rounding may leave an ulp above 90.
    return np.asarray(np.minimum(angle - 180.0 * np.ceil((angle - 90.0) / 180.0), 90.0))


def wrap_longitude(longitude: ArrayLike) -> NDArray[np.float64]:
    """Bring a longitude or a difference of longitudes into [−180, 180), degrees, any shape."""
    wrapped = np.mod(np.asarray(longitude, dtype=np.float64) + 180.0, 360.0) - 180.0
    # np.mod can round up to the period itself.
    return np.where(wrapped >= 180.0, -180.0, wrapped)


def wrap_azimuth(azimuth: ArrayLike) -> NDArray[np.float64]:
    """Bring an azimuth into [0, 360), degrees, any shape."""
    wrapped = np.mod(np.asarray(azimuth, dtype=np.float64), 360.0)
    return np.where(wrapped >= 360.0, 0.0, wrapped)
