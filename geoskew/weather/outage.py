"""From attenuations at a ladder of percentages to the part of a year in which a margin is lost."""

from __future__ import annotations

from collections.abc import Sequence
from typing import NamedTuple

import numpy as np
from numpy.typing import ArrayLike, NDArray

FloatArray = NDArray[np.float64]

# Hours of an average year: 365.25 days.
HOURS_PER_YEAR = 8766.0

# Percentages of an average year over the range of the rain method, close enough that an outage between
# two of them is found to 1.5 % of itself.
PERCENTAGES: tuple[float, ...] = (
    *(0.001, 0.002, 0.003, 0.005, 0.01, 0.02, 0.03, 0.05),
    *(0.1, 0.2, 0.3, 0.5, 1.0, 2.0, 3.0, 5.0),
)


class Crossing(NamedTuple):
    """Where along the ladder of percentages a value reaches a threshold.

    Attributes
    ----------
    percentage : ndarray
        Percent of an average year, an end of the ladder where the crossing lies beyond it; NaN where
        a value is NaN.
    below, above : ndarray of bool
        The crossing lies below the least, or above the greatest, percentage of the ladder.
    """

    percentage: FloatArray
    below: NDArray[np.bool_]
    above: NDArray[np.bool_]


def hours(percentage: ArrayLike) -> FloatArray:
    """Hours of an average year (8 766 h) that a percentage stands for. Any shape."""
    return np.asarray(np.asarray(percentage, dtype=np.float64) * (HOURS_PER_YEAR / 100.0))


def percentage_where(
    values: ArrayLike, percentages: Sequence[float] = PERCENTAGES, threshold: ArrayLike = 0.0
) -> Crossing:
    """Percentage of an average year in which a margin is below a threshold.

    The margin at a percentage is the one that is not kept for that part of the year: it grows with
    the percentage. Where the method's own curve falls by a little, its running maximum is taken.
    Between the steps of the ladder the logarithm of the percentage is a monotone cubic function of
    the value (Fritsch and Carlson, SIAM J. Numer. Anal. 17, 1980, with the weighted harmonic mean of
    Fritsch and Butland for the slopes).

    Parameters
    ----------
    values : array_like, shape (steps, ...)
        Margin, dB, at each percentage of the ladder. For attenuations give their negatives.
    percentages : sequence of float
        Rising.
    threshold : array_like
        Same unit as the values; broadcasts with one step of them.

    Returns
    -------
    Crossing
        Of the shape of one step. A value that equals the threshold at a step crosses there; a margin
        that is kept at the least percentage is `below`, one that is lost at the greatest is `above`.

    Raises
    ------
    ValueError
        The percentages do not rise, or there is not one value per percentage.
    """
    margins = np.asarray(values, dtype=np.float64)
    steps = np.log(np.asarray(percentages, dtype=np.float64))
    if len(steps) < 2 or margins.shape[:1] != steps.shape or not np.all(np.diff(steps) > 0.0):
        raise ValueError(
            f"values of shape {margins.shape} for percentages {tuple(percentages)}: "
            "give one value per percentage, and at least two percentages that rise"
        )
    rising = np.maximum.accumulate(margins, axis=0)
    shape = np.broadcast_shapes(rising.shape[1:], np.shape(threshold))
    level = np.broadcast_to(np.asarray(threshold, dtype=np.float64), shape)
    rising = np.broadcast_to(rising.reshape((len(steps),) + _padded(rising, shape)), (len(steps), *shape))
    unknown = np.isnan(rising[-1]) | np.isnan(level)
    # The step above the crossing, kept inside of the ladder.
    upper = np.clip((rising < level).sum(axis=0), 1, len(steps) - 1)
    logarithm = _between(rising, steps, upper, level)
    below, above = rising[0] > level, rising[-1] < level
    percentage = np.exp(logarithm)
    percentage = np.where(below, percentages[0], np.where(above, percentages[-1], percentage))
    return Crossing(np.where(unknown, np.nan, percentage), below & ~unknown, above & ~unknown)


def _padded(array: FloatArray, shape: tuple[int, ...]) -> tuple[int, ...]:
    inner = array.shape[1:]
    return (1,) * (len(shape) - len(inner)) + inner


def _between(values: FloatArray, steps: FloatArray, upper: NDArray[np.intp], level: FloatArray) -> FloatArray:
    """Cubic interpolation of the steps as a function of the values, in the interval below `upper`."""

    def pick(index: NDArray[np.intp]) -> tuple[FloatArray, FloatArray]:
        index = np.clip(index, 0, len(steps) - 1)
        return np.take_along_axis(values, index[None], axis=0)[0], steps[index]

    (v0, s0), (v1, s1), (v2, s2), (v3, s3) = (pick(upper + offset) for offset in (-2, -1, 0, 1))
    width, width_below, width_above = v2 - v1, v1 - v0, v3 - v2
    slope, below, above = _ratio(s2 - s1, width), _ratio(s1 - s0, width_below), _ratio(s3 - s2, width_above)
    left = np.where(
        below == 0.0, _at_end(slope, above, width, width_above), _inside(below, slope, width_below, width)
    )
    right = np.where(
        above == 0.0, _at_end(slope, below, width, width_below), _inside(above, slope, width_above, width)
    )
    t = np.clip(_ratio(level - v1, width), 0.0, 1.0)
    # Cubic Hermite polynomial with the slopes at both ends.
    rest = 1.0 - t
    value = s1 * (1.0 + 2.0 * t) * rest * rest + s2 * (3.0 - 2.0 * t) * t * t
    return np.asarray(value + width * t * rest * (left * rest - right * t))


def _ratio(numerator: FloatArray, denominator: FloatArray) -> FloatArray:
    """Quotient; 0 where the denominator is 0: a step of no height turns no corner."""
    safe = np.where(denominator == 0.0, 1.0, denominator)
    return np.asarray(np.where(denominator == 0.0, 0.0, numerator / safe))


def _inside(outer: FloatArray, inner: FloatArray, outer_width: FloatArray, width: FloatArray) -> FloatArray:
    """Slope at a step between two intervals: the weighted harmonic mean of theirs."""
    weight_outer, weight_inner = 2.0 * width + outer_width, width + 2.0 * outer_width
    resistance = _ratio(weight_outer, outer) + _ratio(weight_inner, inner)
    return _ratio(weight_outer + weight_inner, resistance)


def _at_end(inner: FloatArray, beyond: FloatArray, width: FloatArray, width_beyond: FloatArray) -> FloatArray:
    """Slope at an end of the ladder: three-point formula, held to what stays monotone."""
    curved = _ratio((2.0 * width + width_beyond) * inner - width * beyond, width + width_beyond)
    return np.asarray(np.where(beyond == 0.0, inner, np.clip(curved, 0.0, 3.0 * inner)))
