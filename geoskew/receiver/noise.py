"""Noise of sky, ground and receiver at the LNB input, and the figure of merit G/T."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

from geoskew.constants import (
    COSMIC_TEMPERATURE_K,
    MEDIUM_TEMPERATURE_K,
    REFERENCE_TEMPERATURE_K,
)


def _ratio(decibel: ArrayLike) -> NDArray[np.float64]:
    """Power ratio of a dB value."""
    return np.asarray(10.0 ** (np.asarray(decibel, dtype=np.float64) / 10.0), dtype=np.float64)


def medium_temperature(surface_k: ArrayLike) -> NDArray[np.float64]:
    """Mean radiating temperature, K, from the surface temperature in K: ITU-R P.618-14 §3, eq. (70).

    For clear and cloudy weather; 275 K is the recommendation's value without local data.

    Examples
    --------
    >>> round(float(medium_temperature(288.15)), 4)
    270.7415
    """
    return 37.34 + 0.81 * np.asarray(surface_k, dtype=np.float64)


def sky_noise(
    attenuation_db: ArrayLike, *, medium_k: ArrayLike = MEDIUM_TEMPERATURE_K
) -> NDArray[np.float64]:
    """Sky noise temperature seen through an attenuating atmosphere.

    Parameters
    ----------
    attenuation_db : array_like
        Total attenuation without scintillation, dB.
    medium_k : array_like, optional
        Mean radiating temperature, K.

    Returns
    -------
    ndarray
        K, the broadcast shape: ITU-R P.618-14 §3, eq. (69).

    Examples
    --------
    >>> round(float(sky_noise(1.0)), 4)
    58.7044
    """
    passed = 1.0 / _ratio(attenuation_db)
    return np.asarray(medium_k, dtype=np.float64) * (1.0 - passed) + COSMIC_TEMPERATURE_K * passed


def noise_figure_temperature(noise_figure_db: ArrayLike) -> NDArray[np.float64]:
    """Effective input noise temperature, K, of a noise figure in dB: 290·(10^(NF/10) − 1).

    Examples
    --------
    >>> round(float(noise_figure_temperature(0.7)), 4)
    50.7203
    """
    return REFERENCE_TEMPERATURE_K * (_ratio(noise_figure_db) - 1.0)


def system_noise_temperature(
    attenuation_db: ArrayLike,
    *,
    noise_figure_db: ArrayLike,
    feed_loss_db: ArrayLike = 0.0,
    ground_noise_k: ArrayLike = 10.0,
    medium_k: ArrayLike = MEDIUM_TEMPERATURE_K,
) -> NDArray[np.float64]:
    """System noise temperature at the LNB input.

    Parameters
    ----------
    attenuation_db : array_like
        Attenuation of the atmosphere without scintillation, dB.
    noise_figure_db, feed_loss_db : array_like
        Noise figure of the LNB and loss between feed and LNB, dB.
    ground_noise_k : array_like, optional
        Ground pick-up, K (5 to 20 K by elevation and dish: common practice, no source).
    medium_k : array_like, optional
        Mean radiating temperature, K.

    Returns
    -------
    ndarray
        K, the broadcast shape: (sky + ground)/L + 290·(1 − 1/L) + 290·(10^(NF/10) − 1) (textbook).

    Examples
    --------
    >>> round(float(system_noise_temperature(5.12, noise_figure_db=0.7, feed_loss_db=0.1)), 2)
    253.98
    """
    loss = _ratio(feed_loss_db)
    outside = sky_noise(attenuation_db, medium_k=medium_k) + np.asarray(ground_noise_k, dtype=np.float64)
    own = REFERENCE_TEMPERATURE_K * (1.0 - 1.0 / loss)
    return outside / loss + own + noise_figure_temperature(noise_figure_db)


def figure_of_merit(
    gain_dbi: ArrayLike,
    system_noise: ArrayLike,
    *,
    feed_loss_db: ArrayLike = 0.0,
    radome_loss_db: ArrayLike = 0.0,
) -> NDArray[np.float64]:
    """Figure of merit G/T at the LNB input, dB/K, the broadcast shape.

    Parameters
    ----------
    gain_dbi : array_like
        Dish gain, dBi.
    system_noise : array_like
        Noise temperature at the LNB input, K.
    feed_loss_db, radome_loss_db : array_like, optional
        Losses before the LNB input, dB. The noise of the feed's loss is in `system_noise`; a dry
        radome's own noise is left out.

    Examples
    --------
    >>> round(float(figure_of_merit(41.703, 76.871, feed_loss_db=0.1)), 3)
    22.745
    """
    losses = np.asarray(feed_loss_db, dtype=np.float64) + np.asarray(radome_loss_db, dtype=np.float64)
    noise = 10.0 * np.log10(np.asarray(system_noise, dtype=np.float64))
    return np.asarray(gain_dbi, dtype=np.float64) - losses - noise
