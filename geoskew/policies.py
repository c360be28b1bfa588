"""The setting that serves both satellites, and its window.

A curve is a `Response` of one carrier at one moment, and a level that this moment is held to. Its
excess is its margin less that level. The shared setting maximises the least excess of all curves.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Final, NamedTuple

import numpy as np
from numpy.typing import ArrayLike, NDArray

from geoskew.angles import fold
from geoskew.link import WHOLE_CIRCLE, Array, Response, merged_arcs

# The excess is found to this: some 1e-6° of a curve's flank. At a smooth peak the middle of what is left is
# taken.
EXCESS_TOLERANCE_DB: Final = 1e-8
# Enough to halve 200 dB down to the tolerance.
MOST_STEPS: Final = 40

# Two settings whose turns differ by less than this are the same turn to either side.
TIE_DEG: Final = 1e-6

# Below the level found the arcs overlap by more than rounding: 1e-9 dB is some 1e-9° of a curve's flank.
BACK_OFF_DB: Final = 1e-9

# The end of one arc counts as within another that ends there as well, whatever rounding says.
ARC_ROUNDING_DEG: Final = 1e-9

# The least excess worth telling apart; it bounds the search from below, not the results.
LOWEST_EXCESS_DB: Final = -200.0


class Curve(NamedTuple):
    """One carrier at one moment and the margin (dB, broadcastable) that the moment is held to."""

    response: Response
    held_to: Array


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


def held_to(best: ArrayLike, *, reserve_db: float, allowed_loss_db: float) -> Array:
    """What a moment is held to, dB: the reserve; where the best misses it, the best less what is allowed."""
    best = np.asarray(best, dtype=np.float64)
    return np.where(best < reserve_db, best - allowed_loss_db, np.where(np.isnan(best), np.nan, reserve_db))


def least_excess(curves: Sequence[Curve], setting: ArrayLike) -> Array:
    """The least excess of all curves at settings in degrees, dB."""
    excess = [curve.response.margin(setting) - curve.held_to for curve in curves]
    return np.asarray(np.minimum.reduce(np.broadcast_arrays(*excess)))


def _arcs(curves: Sequence[Curve], level: Array) -> tuple[list[Array], list[Array]]:
    arcs = merged_arcs([curve.response for curve in curves], [level + curve.held_to for curve in curves])
    return [middle for middle, _ in arcs], [half for _, half in arcs]


def _in_all(
    setting: Array, middles: Sequence[Array], halves: Sequence[Array], skip: int
) -> NDArray[np.bool_]:
    """Whether a setting is in every arc but number `skip` (where it is an end, rounding must not decide)."""
    good = np.ones(np.shape(setting), dtype=bool)
    for number, (middle, half) in enumerate(zip(middles, halves, strict=True)):
        if number != skip:
            good = good & (np.abs(fold(setting - middle)) <= half + ARC_ROUNDING_DEG)
    return good


def _overlap(middles: Sequence[Array], halves: Sequence[Array]) -> Array:
    """How far the arcs overlap: negative where they have no setting in common.

    Of two arcs in degrees, so that a search can follow it; of more, only +1 or −1.
    """
    if len(middles) == 1:
        return halves[0]
    if len(middles) == 2:
        gap = np.abs(fold(middles[0] - middles[1]))
        both = (halves[0] >= 0.0) & (halves[1] >= 0.0)
        return np.where(both, halves[0] + halves[1] - gap, -1.0)
    none_empty = np.logical_and.reduce([half >= 0.0 for half in halves])
    found = np.logical_and.reduce([half >= WHOLE_CIRCLE for half in halves])
    # If the arcs have anything in common, the lower end of one of them is in all the others.
    for number, (middle, half) in enumerate(zip(middles, halves, strict=True)):
        found = found | ((half < WHOLE_CIRCLE) & _in_all(middle - half, middles, halves, number))
    return np.where(none_empty & found, 1.0, -1.0)


def _search(curves: Sequence[Curve], shape: tuple[int, ...]) -> Array:
    """The greatest level of excess at which all arcs still meet, to the tolerance and from below.

    Regula falsi after Illinois on the overlap of the arcs, every third step a bisection, for all
    places at once.
    """
    bound = [curve.response.best_bound() - curve.held_to for curve in curves]
    high = np.broadcast_to(np.minimum.reduce(np.broadcast_arrays(*bound)), shape) + BACK_OFF_DB
    starts = {id(curve.response.suits): curve.response.suits for curve in curves}
    reached = [np.broadcast_to(least_excess(curves, suits), shape) for suits in starts.values()]
    # The best of the curves' own settings is reached; a hair below it rounding cannot unmake it.
    low = np.maximum(np.maximum.reduce(reached), LOWEST_EXCESS_DB) - BACK_OFF_DB
    value_low = np.maximum(_overlap(*_arcs(curves, low)), 0.0)
    value_high = np.minimum(_overlap(*_arcs(curves, high)), -1e-12)
    for step in range(MOST_STEPS):
        if not np.any(high - low > EXCESS_TOLERANCE_DB):
            break
        middle = 0.5 * (low + high)
        if step % 3 != 2:
            with np.errstate(invalid="ignore", divide="ignore"):
                falsi = low + (high - low) * value_low / (value_low - value_high)
            middle = np.where((falsi > low) & (falsi < high), falsi, middle)
        value = _overlap(*_arcs(curves, middle))
        met = value >= 0.0
        # Illinois: an end that stays counts half, so that the other one does not creep.
        value_high = np.where(met, 0.5 * value_high, value)
        value_low = np.where(met, value, 0.5 * value_low)
        low, high = np.where(met, middle, low), np.where(met, high, middle)
    return np.asarray(low)


def _place_in_arcs(curves: Sequence[Curve], level: Array, present: Array) -> Array:
    """The turn to the middle of what the arcs at `level` have in common; ties as in `shared_setting`.

    Each part of the intersection begins at the lower end of some arc; its upper end is the nearest
    upper end above that.
    """
    middles, halves = _arcs(curves, level)
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
        good = (half < WHOLE_CIRCLE) & (half >= 0.0) & _in_all(start, middles, halves, number)
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
    low = _search(curves, shape)
    turn = _place_in_arcs(curves, low - BACK_OFF_DB, np.broadcast_to(present, shape))
    excess = least_excess(curves, present + turn)
    window_low, window_high = _window(curves, present, turn)
    # The setting lies in the window exactly when a window exists.
    has = np.isfinite(turn) & (excess >= -2.0 * EXCESS_TOLERANCE_DB)
    return Shared(turn, excess, np.where(has, window_low, np.nan), np.where(has, window_high, np.nan))


def _window(curves: Sequence[Curve], present: Array, turn: Array) -> tuple[Array, Array]:
    """Turns at which the first curve is left, going down and going up from the shared setting."""
    middles, halves = _arcs(curves, np.zeros(np.shape(turn)))
    down = np.full(np.shape(turn), np.inf)
    up = np.full(np.shape(turn), np.inf)
    for middle, half in zip(middles, halves, strict=True):
        offset = fold(present + turn - middle)
        whole = half >= WHOLE_CIRCLE
        down = np.where(whole, down, np.minimum(down, np.maximum(half + offset, 0.0)))
        up = np.where(whole, up, np.minimum(up, np.maximum(half - offset, 0.0)))
    everything = np.isinf(down)
    return np.where(everything, -90.0, turn - down), np.where(everything, 90.0, turn + up)
