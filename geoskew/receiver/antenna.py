"""Gain, half-power width and pointing loss of a dish, and the free-space loss of the path."""

from __future__ import annotations

from typing import Final

import numpy as np
from numpy.typing import ArrayLike, NDArray

from geoskew.constants import SPEED_OF_LIGHT_M_S

# Half-power width in units of λ/D, degrees: the usual illumination taper of textbooks.
HALF_POWER_FACTOR_DEG: Final = 70.0
# The parabola is a model of the main lobe; below this it has left anything that a dish shows.
LARGEST_POINTING_LOSS_DB: Final = 40.0


def wavelength(frequency_ghz: ArrayLike) -> NDArray[np.float64]:
    """Wavelength in metres of a frequency in GHz, any shape."""
    return SPEED_OF_LIGHT_M_S / (np.asarray(frequency_ghz, dtype=np.float64) * 1e9)


def antenna_gain(
    diameter_m: ArrayLike, *, efficiency: ArrayLike, frequency_ghz: ArrayLike
) -> NDArray[np.float64]:
    """Gain on the axis of a circular dish.

    Parameters
    ----------
    diameter_m : array_like
        Diameter of the aperture, metres.
    efficiency : array_like
        Aperture efficiency, above 0 and up to 1.
    frequency_ghz : array_like
        Frequency, GHz.

    Returns
    -------
    ndarray
        dBi, the broadcast shape: η·(π·D/λ)² (textbook).

    Examples
    --------
    >>> round(float(antenna_gain(1.2, efficiency=0.65, frequency_ghz=12.0)), 3)
    41.703
    """
    aperture = np.pi * np.asarray(diameter_m, dtype=np.float64) / wavelength(frequency_ghz)
    return 20.0 * np.log10(aperture) + 10.0 * np.log10(np.asarray(efficiency, dtype=np.float64))


def half_power_beamwidth(diameter_m: ArrayLike, *, frequency_ghz: ArrayLike) -> NDArray[np.float64]:
    """Full half-power width of a dish, degrees: 70·λ/D (textbook), the broadcast shape.

    Examples
    --------
    >>> round(float(half_power_beamwidth(1.2, frequency_ghz=12.0)), 4)
    1.4573
    """
    return HALF_POWER_FACTOR_DEG * wavelength(frequency_ghz) / np.asarray(diameter_m, dtype=np.float64)


def pointing_loss(
    off_axis: ArrayLike, *, diameter_m: ArrayLike, frequency_ghz: ArrayLike
) -> NDArray[np.float64]:
    """Loss of the main lobe off its axis.

    Parameters
    ----------
    off_axis : array_like
        Angle from the dish axis, degrees; the sign does not matter.
    diameter_m : array_like
        Diameter of the dish, metres.
    frequency_ghz : array_like
        Frequency, GHz.

    Returns
    -------
    ndarray
        dB, 0 to 40, the broadcast shape: 12·(θ/θ₃)² with θ₃ = 70·λ/D (textbook; good to about half
        of θ₃). Beyond the main lobe take `wanted_gain_loss`.

    Examples
    --------
    >>> round(float(pointing_loss(0.3, diameter_m=1.2, frequency_ghz=12.0)), 4)
    0.5085
    """
    width = half_power_beamwidth(diameter_m, frequency_ghz=frequency_ghz)
    loss = 12.0 * (np.asarray(off_axis, dtype=np.float64) / width) ** 2
    return np.minimum(loss, LARGEST_POINTING_LOSS_DB)


def free_space_loss(range_km: ArrayLike, *, frequency_ghz: ArrayLike) -> NDArray[np.float64]:
    """Free-space basic transmission loss, ITU-R P.525: 20·log10(4π·d/λ).

    Parameters
    ----------
    range_km : array_like
        Length of the path, km; NaN where there is none.
    frequency_ghz : array_like
        Frequency, GHz.

    Returns
    -------
    ndarray
        dB, the broadcast shape.

    Examples
    --------
    >>> round(float(free_space_loss(38000.0, frequency_ghz=12.0)), 4)
    205.6271
    """
    distance_m = 1e3 * np.asarray(range_km, dtype=np.float64)
    return 20.0 * np.log10(4.0 * np.pi * distance_m / wavelength(frequency_ghz))
