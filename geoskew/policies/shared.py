"""The shared setting and its window, out of the arcs at the level that the search found."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.typing import ArrayLike, NDArray

from geoskew.angles import fold
from geoskew.link import WHOLE_CIRCLE, Array
from geoskew.policies.curves import Curve, arcs, in_all, least_excess
from geoskew.policies.search import BACK_OFF_DB, EXCESS_TOLERANCE_DB, LOWEST_EXCESS_DB, greatest_excess

# Two settings whose turns differ by less than this are the same turn to either side.
TIE_DEG: Final = 1e-6


@dataclass(frozen=True)
class Shared:
    """The shared setting of each place, all in degrees and dB, NaN where there is none.

    ``turn`` is from the present setting, in (−90, 90]; ``low`` and ``high`` are the window, as turns
    from the present setting that are not folded: low ≤ turn ≤ high. ``excess`` is the least excess.
    """

    turn: Array
    excess: Array
    low: Array
    high: Array


def _place_in_arcs(curves: Sequence[Curve], level: Array, present: Array) -> Array:
    """The turn to the middle of what the arcs at `level` have in common; ties as in `shared_setting`.

    Each part of the intersection begins at the lower end of some arc; its upper end is the nearest
    upper end above that.
    """
    middles, halves = arcs(curves, level)
    flat = _flat(curves, level)
    best = np.full(np.shape(level), np.nan)
    for number, (middle, half) in enumerate(zip(middles, halves, strict=True)):
        start = middle - half
        reach = np.full(np.shape(level), np.inf)
        for other, (other_middle, other_half) in enumerate(zip(middles, halves, strict=True)):
            ahead = np.mod(other_middle + other_half - start, 180.0)
            if other != number:
                # An arc that ends where this one begins, not one that reaches half a turn further.
                ahead = np.where(ahead > 180.0 - TIE_DEG, 0.0, ahead)
            reach = np.where(other_half >= WHOLE_CIRCLE, reach, np.minimum(reach, ahead))
        good = (half < WHOLE_CIRCLE) & (half >= 0.0) & in_all(start, middles, halves, number)
        turn = _turn_into_part(start - present, np.where(np.isfinite(reach), reach, 0.0), flat)
        better = np.isnan(best) | (np.abs(turn) < np.abs(best) - TIE_DEG)
        clockwise = (np.abs(np.abs(turn) - np.abs(best)) <= TIE_DEG) & (turn > best)
        best = np.where(good & (better | clockwise), turn, best)
    # All settings are alike where every arc is the whole circle, and where no level is low enough.
    whole = np.logical_and.reduce(np.broadcast_arrays(*(half >= WHOLE_CIRCLE for half in halves)))
    alike = np.isnan(best) & (whole | (level <= LOWEST_EXCESS_DB))
    return np.where(alike, 0.0 * present, best)


def _flat(curves: Sequence[Curve], level: Array) -> NDArray[np.bool_]:
    """Where a curve binds that no setting changes (circular polarisation): a whole part is best."""
    flat = np.zeros(np.shape(level), dtype=bool)
    for response, held in curves:
        if response.fixed is not None:
            flat = flat | (response.margin(0.0) - held <= level + 4.0 * EXCESS_TOLERANCE_DB)
    return flat


def _turn_into_part(start: Array, reach: Array, flat: NDArray[np.bool_]) -> Array:
    """The turn into the part of good settings that begins at the turn `start` and is `reach` degrees wide.

    To its middle, where the one best setting is; where all of it is `flat`, the smallest turn, and of two
    alike the clockwise one.
    """
    middle = fold(start + 0.5 * reach)
    if not np.any(flat):
        return middle
    low = fold(start)
    high = low + reach
    other = fold(high)
    nearest = np.where(np.abs(np.abs(low) - np.abs(other)) <= TIE_DEG, np.maximum(low, other), other)
    nearest = np.where(np.abs(low) < np.abs(other) - TIE_DEG, low, nearest)
    nearest = np.where(((low <= 0.0) & (high >= 0.0)) | (high >= 180.0), 0.0, nearest)
    return np.where(flat, nearest, middle)


def shared_setting(curves: Sequence[Curve], present: ArrayLike) -> Shared:
    """The setting that maximises the least excess of all curves, and its window.

    Parameters
    ----------
    curves : sequence of Curve
        At least one before and one after, linear carriers. Broadcastable over the places.
    present : array_like
        The present setting, degrees.

    Returns
    -------
    Shared
        NaN where any curve has no value. Ties go to the smaller turn, then clockwise. Where no
        setting keeps what both moments are held to, only ``low`` and ``high`` are NaN.

    Notes
    -----
    Settings that keep a level are one arc a curve in closed form, so the search runs over the level
    (for all places at once) and never over settings; the optimum may sit on a kink.
    """
    present = np.asarray(present, dtype=np.float64)
    shape = np.broadcast_shapes(
        present.shape,
        *(array.shape for response, held in curves for array in (response.suits, response.noise, held)),
    )
    low = greatest_excess(curves, shape)
    turn = _place_in_arcs(curves, low - BACK_OFF_DB, np.broadcast_to(present, shape))
    excess = least_excess(curves, present + turn)
    window_low, window_high = _window(curves, present, turn)
    # The setting lies in the window exactly when a window exists.
    has = np.isfinite(turn) & (excess >= -2.0 * EXCESS_TOLERANCE_DB)
    return Shared(turn, excess, np.where(has, window_low, np.nan), np.where(has, window_high, np.nan))


def _window(curves: Sequence[Curve], present: Array, turn: Array) -> tuple[Array, Array]:
    """Turns at which the first curve is left, going down and going up from the shared setting."""
    middles, halves = arcs(curves, np.zeros(np.shape(turn)))
    down = np.full(np.shape(turn), np.inf)
    up = np.full(np.shape(turn), np.inf)
    for middle, half in zip(middles, halves, strict=True):
        offset = fold(present + turn - middle)
        whole = half >= WHOLE_CIRCLE
        down = np.where(whole, down, np.minimum(down, np.maximum(half + offset, 0.0)))
        up = np.where(whole, up, np.minimum(up, np.maximum(half - offset, 0.0)))
    everything = np.isinf(down)
    return np.where(everything, -90.0, turn - down), np.where(everything, 90.0, turn + up)
