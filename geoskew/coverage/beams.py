"""Elliptical beams: half-power ellipse, relative gain by a published pattern, the strongest of several.

A direction is given by its angle off the beam axis and its position angle, counter-clockwise from the
equatorial direction as seen from the satellite. EIRP at a place is the peak plus the relative gain;
distance is no part of it, it counts in the path's loss.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from typing import Final

import numpy as np
from numpy.typing import ArrayLike, NDArray

from geoskew.errors import InputError

Array = NDArray[np.float64]

# Narrowest half-power width of the fast roll-off pattern, degrees (Resolution 553 (WRC-15), Figure 1).
FAST_ROLL_OFF_NARROWEST_DEG: Final = 0.6


def half_power_width(
    position_angle: ArrayLike, *, major_deg: float, minor_deg: float, orientation_deg: float = 0.0
) -> Array:
    """Full half-power width of an elliptical beam in the direction of a position angle.

    Parameters
    ----------
    position_angle : array_like
        Degrees, counter-clockwise from the equatorial direction seen from the satellite.
    major_deg, minor_deg : float
        Full half-power widths of the ellipse, degrees.
    orientation_deg : float, optional
        Position angle of the major axis, degrees (Radio Regulations Appendix 30A, Article 9A).

    Returns
    -------
    ndarray
        Degrees, the shape of `position_angle`: the diameter of the ellipse in that direction.

    Examples
    --------
    >>> half_power_width([0.0, 90.0], major_deg=3.2, minor_deg=1.6).round(6).tolist()
    [3.2, 1.6]
    """
    turned = np.deg2rad(np.asarray(position_angle, dtype=np.float64) - orientation_deg)
    across = np.hypot(minor_deg * np.cos(turned), major_deg * np.sin(turned))
    return np.asarray(major_deg * minor_deg / across)


def on_axis_gain(major_deg: float, minor_deg: float) -> float:
    """Gain on the axis of an elliptical beam, dBi: 44.45 − 10·log10(major·minor).

    Resolution 553 (WRC-15), Figure 1.

    Examples
    --------
    >>> round(on_axis_gain(3.2, 1.6), 3)
    37.357
    """
    return float(44.45 - 10.0 * np.log10(major_deg * minor_deg))


def gaussian_gain(off_axis: ArrayLike, width: ArrayLike) -> Array:
    """Relative gain of a Gaussian main lobe without side lobes, dB: −12·(φ/φ0)².

    Parameters
    ----------
    off_axis, width : array_like
        Angle off the axis φ and full half-power width φ0 in that direction, degrees, broadcastable.

    Examples
    --------
    >>> gaussian_gain([0.0, 1.0], 2.0).tolist()
    [-0.0, -3.0]
    """
    return -12.0 * (np.asarray(off_axis, dtype=np.float64) / np.asarray(width, dtype=np.float64)) ** 2


def appendix30_gain(off_axis: ArrayLike, width: ArrayLike) -> Array:
    """Co-polar pattern of a satellite antenna, Radio Regulations Appendix 30, Annex 5, Regions 1 and 3.

    −12·(φ/φ0)² to 1.58·φ0, −30 dB to 3.16·φ0, −(17.5 + 25·log10(φ/φ0)) beyond; dB relative to the axis.
    The floor at 0 dBi belongs to the beam, see `relative_gain`. The Annex is cited from memory.

    Examples
    --------
    >>> appendix30_gain([1.0, 4.0, 20.0], 2.0).round(2).tolist()
    [-3.0, -30.0, -42.5]
    """
    ratio = _ratio(off_axis, width)
    far = -(17.5 + 25.0 * np.log10(np.maximum(ratio, 1.0)))
    return _pieces(ratio, [(1.58, -12.0 * ratio**2), (3.16, np.full_like(ratio, -30.0)), (np.inf, far)])


def fast_roll_off_gain(
    off_axis: ArrayLike, width: ArrayLike, *, narrowest_deg: float = FAST_ROLL_OFF_NARROWEST_DEG
) -> Array:
    """Co-polar pattern with a fast roll-off in the main lobe, Resolution 553 (WRC-15), Figure 1.

    Parameters
    ----------
    off_axis, width : array_like
        Angle off the axis φ and full half-power width φ0 in that direction, degrees, broadcastable.
    narrowest_deg : float, optional
        Half-power width of the narrowest beam, degrees; a width below it has no value (NaN).

    Examples
    --------
    >>> float(fast_roll_off_gain(1.9729, 3.0597).round(2))
    -18.4
    """
    ratio = _ratio(off_axis, width)
    share = narrowest_deg / np.asarray(width, dtype=np.float64)
    shift = 0.5 * (1.0 - share)
    pieces: list[tuple[float | Array, Array]] = [
        (0.5, -12.0 * ratio**2),
        (1.45 * share + shift, -12.0 * ((ratio - shift) / share) ** 2),
        (1.45, np.full_like(ratio, -25.23)),
        (np.inf, -(22.0 + 20.0 * np.log10(np.maximum(ratio, 1.0)))),
    ]
    return np.where(share <= 1.0, _pieces(ratio, pieces), np.nan)


def cross_polar_gain(off_axis: ArrayLike, width: ArrayLike) -> Array:
    """Cross-polar pattern of a satellite antenna, Radio Regulations Appendix 30, Annex 5, Regions 1 and 3.

    −(40 + 40·log10|φ/φ0 − 1|) to 0.33·φ0 and from 1.67·φ0 on, −33 dB between; dB relative to the
    co-polar gain on the axis; floor as `relative_gain`. The Annex is cited from memory.

    Examples
    --------
    >>> cross_polar_gain([0.0, 2.0], 2.0).tolist()
    [-40.0, -33.0]
    """
    ratio = _ratio(off_axis, width)
    curve = -(40.0 + 40.0 * np.log10(np.maximum(np.abs(ratio - 1.0), 0.5)))
    return _pieces(ratio, [(0.33, curve), (1.67, np.full_like(ratio, -33.0)), (np.inf, curve)])


PATTERNS: Final[dict[str, Callable[[ArrayLike, ArrayLike], Array]]] = {
    "gaussian": gaussian_gain,
    "appendix-30": appendix30_gain,
    "fast-roll-off": fast_roll_off_gain,
}


def relative_gain(
    off_axis: ArrayLike,
    position_angle: ArrayLike,
    *,
    major_deg: float,
    minor_deg: float,
    orientation_deg: float = 0.0,
    pattern: str = "gaussian",
) -> Array:
    """Gain of an elliptical beam relative to its axis.

    Parameters
    ----------
    off_axis, position_angle : array_like
        Direction, degrees, broadcastable.
    major_deg, minor_deg, orientation_deg : float
        The half-power ellipse, degrees.
    pattern : str, optional
        One of `PATTERNS`, or "cross-polar".

    Returns
    -------
    ndarray
        dB, at most 0, beyond the half-power ellipse never below 0 dBi (minus the gain on the axis), the
        broadcast shape; NaN for NaN.

    Raises
    ------
    InputError
        For a pattern of another name, or a beam too narrow for the fast roll-off.
    """
    shapes = PATTERNS | {"cross-polar": cross_polar_gain}
    if pattern not in shapes:
        raise InputError(f"no beam pattern {pattern!r}; known are {', '.join(shapes)}")
    if pattern == "fast-roll-off" and minor_deg < FAST_ROLL_OFF_NARROWEST_DEG:
        raise InputError(
            f"beam: minor_deg {minor_deg:g} is below {FAST_ROLL_OFF_NARROWEST_DEG}, the narrowest beam of"
            ' the fast roll-off pattern; take pattern = "gaussian" or "appendix-30"'
        )
    width = half_power_width(
        position_angle, major_deg=major_deg, minor_deg=minor_deg, orientation_deg=orientation_deg
    )
    gain = shapes[pattern](off_axis, width)
    # The Annex draws its floor through the side lobes; the cross-polar dip around the axis stays.
    floor = -max(on_axis_gain(major_deg, minor_deg), 0.0)
    return np.where(_ratio(off_axis, width) > 1.0, np.maximum(gain, floor), gain)


def beam_eirp(
    off_axis: ArrayLike,
    position_angle: ArrayLike,
    *,
    peak_dbw: float,
    major_deg: float,
    minor_deg: float,
    orientation_deg: float = 0.0,
    pattern: str = "gaussian",
) -> Array:
    """EIRP of one elliptical beam, dBW: its peak plus `relative_gain`, whose arguments these are.

    Examples
    --------
    >>> float(beam_eirp(0.8, 90.0, peak_dbw=52.0, major_deg=3.2, minor_deg=1.6))
    49.0
    """
    return peak_dbw + relative_gain(
        off_axis,
        position_angle,
        major_deg=major_deg,
        minor_deg=minor_deg,
        orientation_deg=orientation_deg,
        pattern=pattern,
    )


def beam_isolation(
    off_axis: ArrayLike,
    position_angle: ArrayLike,
    *,
    major_deg: float,
    minor_deg: float,
    orientation_deg: float = 0.0,
    pattern: str = "appendix-30",
) -> Array:
    """Cross-polar isolation of an elliptical beam, dB, never negative: co-polar less cross-polar gain.

    Arguments and shapes as `relative_gain`; `pattern` is the co-polar one.

    Examples
    --------
    >>> float(beam_isolation(0.0, 0.0, major_deg=1.0, minor_deg=1.0))
    40.0
    """
    ellipse = {"major_deg": major_deg, "minor_deg": minor_deg, "orientation_deg": orientation_deg}
    co = relative_gain(off_axis, position_angle, pattern=pattern, **ellipse)
    cross = relative_gain(off_axis, position_angle, pattern="cross-polar", **ellipse)
    return np.maximum(co - cross, 0.0)


def strongest(eirps: Sequence[Array]) -> tuple[Array, NDArray[np.intp]]:
    """EIRP of the strongest of several beams at each place, and the number of that beam, 0 for the first.

    A beam without a value (NaN) serves nobody; where no beam has one the EIRP is NaN and the number −1.

    Examples
    --------
    >>> eirp, beam = strongest([np.array([50.0, np.nan]), np.array([51.0, np.nan])])
    >>> eirp.tolist(), beam.tolist()
    ([51.0, nan], [1, -1])
    """
    stack = np.stack(np.broadcast_arrays(*eirps))
    filled = np.where(np.isnan(stack), -np.inf, stack)
    best = filled.max(axis=0)
    number = np.where(np.isneginf(best), -1, filled.argmax(axis=0))
    return np.where(np.isneginf(best), np.nan, best), number


def _ratio(off_axis: ArrayLike, width: ArrayLike) -> Array:
    """Angle off the axis in half-power widths."""
    return np.abs(np.asarray(off_axis, dtype=np.float64)) / np.asarray(width, dtype=np.float64)


def _pieces(ratio: Array, pieces: Sequence[tuple[float | Array, Array]]) -> Array:
    """Value of the first piece whose upper limit the ratio does not pass; NaN for NaN."""
    conditions = [np.broadcast_to(ratio <= limit, ratio.shape) for limit, _ in pieces]
    return np.asarray(np.select(conditions, [value for _, value in pieces], default=np.nan))
