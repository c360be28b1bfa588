"""Which levels of a field are drawn: multiples of a step within the range of the data."""

from __future__ import annotations

import math
from typing import Any, Final

import numpy as np
from numpy.typing import NDArray

from geoskew.errors import InputError
from geoskew.layers import Layer

MOST_LEVELS: Final = 200
_BINS: Final = 720


def levels_of(
    values: NDArray[Any], step: float, *, layer: Layer, widen: bool = False
) -> tuple[list[float], float]:
    """Multiples of a step strictly within the range of the values.

    The range of a circular layer is the arc that its values fill, which may run across the wrap; its
    levels lie in the layer's own range, so that the wrap is one level (0° and not 360°, 90° and not
    -90°).

    Parameters
    ----------
    values : ndarray
        Any shape; NaN = no value.
    step : float
        In the layer's unit, above 0.
    layer : Layer
    widen : bool
        Whether too many levels make the step larger (2, 5, 10, ... times) instead of an error.

    Returns
    -------
    list of float, float
        Levels in ascending order, and the step.

    Raises
    ------
    InputError
        More than ``MOST_LEVELS`` levels.
    """
    arcs = _arcs(values, layer.period) if layer.kind == "circular" else _range(values)
    wanted = sum(high - low for low, high in arcs) / step
    if wanted > MOST_LEVELS and not widen:
        raise InputError(
            f"layer {layer.name}: contours every {step:g} {layer.unit} would be about {wanted:.0f} levels; "
            f"at most {MOST_LEVELS} are drawn, give a larger step"
        )
    factors = (scale * 10**power for power in range(300) for scale in (1, 2, 5))
    step *= next(factor for factor in factors if wanted / factor <= MOST_LEVELS)
    return sorted({level for low, high in arcs for level in _multiples(low, high, step)}), step


def _multiples(low: float, high: float, step: float) -> list[float]:
    """Multiples of the step in (low, high), written as the short decimals that they are."""
    numbers = range(math.floor(low / step), math.ceil(high / step) + 1)
    levels = (round(number * step, 9) + 0.0 for number in numbers)
    return [level for level in levels if low < level < high]


def _range(values: NDArray[Any]) -> list[tuple[float, float]]:
    valid = values[~np.isnan(values)]
    return [(float(valid.min()), float(valid.max()))] if valid.size else []


def _arcs(values: NDArray[Any], period: float) -> list[tuple[float, float]]:
    """The arc that angles fill, cut at the wrap into open intervals of the layer's own range.

    The wrap itself is one angle with two numbers; it is kept by the number that belongs to the range:
    0 of [0, 360), 90 of (-90, 90].
    """
    valid = values[~np.isnan(values)]
    if not valid.size:
        return []
    bottom, hair = (0.0 if period == 360.0 else -period / 2.0), 1e-9
    first, gap = _longest_gap(valid, period)
    if gap < period / 8.0:
        # all around: neighbours may well cross what no cell has
        return [(bottom - hair, bottom + period)] if period == 360.0 else [(bottom, bottom + period + hair)]
    turned = np.mod(valid - first, period)
    low, high = first + float(turned.min()), first + float(turned.max())
    shift = math.floor((low - bottom) / period) * period
    low, high = low - shift, high - shift
    top = bottom + period
    if high < top or (high == top and period == 360.0):
        return [(low, high)]
    # the arc runs across the wrap
    if period == 360.0:
        return [(low, top), (bottom - hair, high - period)]
    return [(low, top + hair), (bottom, high - period)]


def _longest_gap(valid: NDArray[Any], period: float) -> tuple[float, float]:
    """Where the longest run of empty bins around the circle ends, and how long it is at least."""
    taken = np.zeros(_BINS, dtype=np.bool_)
    taken[np.floor(np.mod(valid, period) / period * _BINS).astype(np.int64) % _BINS] = True
    ends = np.flatnonzero(taken)
    gaps = np.diff(ends, prepend=ends[-1] - _BINS)
    longest = int(np.argmax(gaps))
    return float(ends[longest]) * period / _BINS, float(gaps[longest] - 1) * period / _BINS
