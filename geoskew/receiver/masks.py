"""Published reference patterns of receiving earth-station antennas.

ITU-R BO.1213-1 for small broadcasting-satellite dishes at 11.7 to 12.75 GHz, ITU-R S.465-6 elsewhere,
ITU-R S.580-6 for antennas built to its design objective. The formulas were written from memory of the
recommendations and agree with independently computed values; the texts rule.
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import Final

import numpy as np
from numpy.typing import ArrayLike, NDArray

from geoskew.receiver.antenna import antenna_gain, wavelength

_Pieces = Sequence[tuple[NDArray[np.bool_], ArrayLike]]

MASKS: Final = ("BO.1213", "S.465", "S.580")
_BO1213_BAND_GHZ: Final = (11.7, 12.75)
# Angles at which 29 − 25·log φ and 21 − 25·log φ have come down to −5 dBi.
_BO1213_CO_END_DEG: Final = 10.0 ** (34.0 / 25.0)
_BO1213_CROSS_END_DEG: Final = 10.0 ** (26.0 / 25.0)


def mask_name(frequency_ghz: float) -> str:
    """Name the reference pattern that suits a frequency: BO.1213 at 11.7 to 12.75 GHz, else S.465.

    Examples
    --------
    >>> mask_name(12.2), mask_name(3.9)
    ('BO.1213', 'S.465')
    """
    low, high = _BO1213_BAND_GHZ
    return "BO.1213" if low <= frequency_ghz <= high else "S.465"


def _angle_and_ratio(
    off_axis: ArrayLike, diameter_m: ArrayLike, frequency_ghz: ArrayLike
) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Off-axis angle without its sign, and λ/D."""
    angle = np.abs(np.asarray(off_axis, dtype=np.float64))
    return angle, wavelength(frequency_ghz) / np.asarray(diameter_m, dtype=np.float64)


def _envelope(angle: NDArray[np.float64], constant: float) -> NDArray[np.float64]:
    """Evaluate constant − 25·log10 φ, dBi; the angle is kept off zero, where no piece uses it."""
    return constant - 25.0 * np.log10(np.maximum(angle, 1e-6))


def bo1213_co(
    off_axis: ArrayLike, *, diameter_m: ArrayLike, frequency_ghz: ArrayLike, peak_dbi: ArrayLike
) -> NDArray[np.float64]:
    """Co-polar reference pattern of ITU-R BO.1213-1 (Radio Regulations Appendix 30, Annex 5).

    Parameters
    ----------
    off_axis : array_like
        Angle from the dish axis, degrees.
    diameter_m, frequency_ghz : array_like
        Diameter, metres, and frequency, GHz (the recommendation is for 11.7 to 12.75 GHz).
    peak_dbi : array_like
        Gain on the axis, dBi.

    Returns
    -------
    ndarray
        dBi, the broadcast shape; NaN where the angle is NaN. The step at 70° is the recommendation's.

    Examples
    --------
    >>> round(float(bo1213_co(2.0, diameter_m=0.6, frequency_ghz=12.1, peak_dbi=35.5)), 3)
    29.635
    """
    angle, ratio = _angle_and_ratio(off_axis, diameter_m, frequency_ghz)
    peak = np.asarray(peak_dbi, dtype=np.float64)
    first_sidelobe = 95.0 * ratio
    plateau = _envelope(first_sidelobe, 29.0)
    main_lobe_end = ratio * np.sqrt(np.maximum(peak - plateau, 0.0) / 0.0025)
    pieces: _Pieces = [
        (angle < main_lobe_end, peak - 0.0025 * (angle / ratio) ** 2),
        (angle < first_sidelobe, plateau),
        (angle < _BO1213_CO_END_DEG, _envelope(angle, 29.0)),
        (angle < 70.0, -5.0),
        (angle >= 70.0, 0.0),
    ]
    return _choose(pieces)


def bo1213_cross(
    off_axis: ArrayLike, *, diameter_m: ArrayLike, frequency_ghz: ArrayLike, peak_dbi: ArrayLike
) -> NDArray[np.float64]:
    """Cross-polar reference pattern of ITU-R BO.1213-1; arguments and result as `bo1213_co`.

    Examples
    --------
    >>> round(float(bo1213_cross(2.0, diameter_m=0.6, frequency_ghz=12.1, peak_dbi=35.5)), 3)
    18.5
    """
    angle, ratio = _angle_and_ratio(off_axis, diameter_m, frequency_ghz)
    peak = np.asarray(peak_dbi, dtype=np.float64)
    half_power = 2.0 * ratio * np.sqrt(3.0 / 0.0025)
    fall_end = 0.5 * half_power * np.sqrt(10.1875)
    fall = _envelope(fall_end, 21.0) - (peak - 17.0)
    ramp = 8.0 * (angle - 0.25 * half_power) / (0.19 * half_power)
    pieces: _Pieces = [
        (angle < 0.25 * half_power, peak - 25.0),
        (angle < 0.44 * half_power, peak - 25.0 + ramp),
        (angle < half_power, peak - 17.0),
        (angle < fall_end, peak - 17.0 + fall * (angle - half_power) / (fall_end - half_power)),
        (angle < _BO1213_CROSS_END_DEG, _envelope(angle, 21.0)),
        (angle < 70.0, -5.0),
        (angle >= 70.0, 0.0),
    ]
    return _choose(pieces)


def bo1213_discrimination(
    off_axis: ArrayLike, *, diameter_m: ArrayLike, frequency_ghz: ArrayLike, efficiency: ArrayLike = 0.65
) -> NDArray[np.float64]:
    """Cross-polar discrimination of BO.1213-1, co-polar less cross-polar gain, dB, never negative.

    Arguments as `bo1213_co`; the peak follows from `efficiency`. 25 dB on the axis.

    Examples
    --------
    >>> float(bo1213_discrimination(0.0, diameter_m=0.6, frequency_ghz=12.1))
    25.0
    """
    peak = antenna_gain(diameter_m, efficiency=efficiency, frequency_ghz=frequency_ghz)
    co = bo1213_co(off_axis, diameter_m=diameter_m, frequency_ghz=frequency_ghz, peak_dbi=peak)
    cross = bo1213_cross(off_axis, diameter_m=diameter_m, frequency_ghz=frequency_ghz, peak_dbi=peak)
    return np.maximum(co - cross, 0.0)


def smallest_angle(diameter_m: ArrayLike, *, frequency_ghz: ArrayLike) -> NDArray[np.float64]:
    """Angle φmin, degrees, inside which S.465-6 gives no value; also used for S.580-6.

    max(1°, 100·λ/D) for D/λ ≥ 50, max(2°, 114·(D/λ)^−1.09) below.
    """
    size = np.asarray(diameter_m, dtype=np.float64) / wavelength(frequency_ghz)
    return np.where(size >= 50.0, np.maximum(1.0, 100.0 / size), np.maximum(2.0, 114.0 * size**-1.09))


def s465(off_axis: ArrayLike, *, diameter_m: ArrayLike, frequency_ghz: ArrayLike) -> NDArray[np.float64]:
    """Evaluate the reference pattern of ITU-R S.465-6, 2 to 31 GHz.

    Parameters
    ----------
    off_axis : array_like
        Angle from the dish axis, degrees.
    diameter_m, frequency_ghz : array_like
        Diameter, metres, and frequency, GHz.

    Returns
    -------
    ndarray
        dBi, the broadcast shape: 32 − 25·log10 φ to 48°, −10 beyond; NaN inside `smallest_angle`,
        where the recommendation gives no value.

    Examples
    --------
    >>> round(float(s465(3.0, diameter_m=1.2, frequency_ghz=12.0)), 3)
    20.072
    """
    angle, _ = _angle_and_ratio(off_axis, diameter_m, frequency_ghz)
    inner = smallest_angle(diameter_m, frequency_ghz=frequency_ghz)
    pieces: _Pieces = [
        (angle < inner, np.nan),
        (angle < 48.0, _envelope(angle, 32.0)),
        (angle >= 48.0, -10.0),
    ]
    return _choose(pieces)


def s580(off_axis: ArrayLike, *, diameter_m: ArrayLike, frequency_ghz: ArrayLike) -> NDArray[np.float64]:
    """Design objective of ITU-R S.580-6 for D/λ ≥ 50, near the geostationary arc.

    29 − 25·log10 φ to 20°, −3.5 dBi to 26.3°, then S.465-6; NaN inside `smallest_angle`. A smaller dish
    gets the same envelope, since choosing this pattern for it is the user's own statement.

    Examples
    --------
    >>> round(float(s580(3.0, diameter_m=1.2, frequency_ghz=12.0)), 3)
    17.072
    """
    angle, _ = _angle_and_ratio(off_axis, diameter_m, frequency_ghz)
    inner = smallest_angle(diameter_m, frequency_ghz=frequency_ghz)
    pieces: _Pieces = [
        (angle < inner, np.nan),
        (angle < 20.0, _envelope(angle, 29.0)),
        (angle < 26.3, -3.5),
        (angle >= 26.3, s465(angle, diameter_m=diameter_m, frequency_ghz=frequency_ghz)),
    ]
    return _choose(pieces)


def _choose(pieces: _Pieces) -> NDArray[np.float64]:
    """Value of the first piece whose condition holds; NaN where none does (a NaN angle)."""
    conditions = [condition for condition, _ in pieces]
    values = [np.asarray(value, dtype=np.float64) for _, value in pieces]
    everything = np.broadcast_arrays(*conditions, *values)
    count = len(pieces)
    return np.asarray(np.select(everything[:count], everything[count:], default=np.nan), dtype=np.float64)
