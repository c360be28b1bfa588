"""The fewest settings that serve spans of settings on the circle of 180°.

A setting serves a span [low, high] of wanted settings when it lies within a tolerance t of all of it, that is
in the arc [high − t, low + t]. So the fewest settings are the fewest points that pierce all those arcs.

Why the search finds the fewest. Any point of a solution can be moved up to the nearest upper end of the
arcs that it pierces without losing one, so points at upper ends are enough. After a point c, the next arc to
be pierced is the one whose upper end is the lowest among the arcs that begin above c; a point above that end
misses it, a point below pierces no arc more, so the next point is that end (the classical greedy piercing of
intervals). On the circle only the first point is left open: one arc, whichever, must be pierced at an upper
end within it, and all of those are tried.

Single places are spans of no length: their arcs are 2·t long, and the greedy points are the middles of bands
of width 2·t laid from the lowest value not yet served. The lower ends of these bands are more than 2·t apart,
no setting serves two of them, and so there is no partition into fewer zones. On a circle that the values fill
all around, the same argument gives at least one less.
"""

from __future__ import annotations

from typing import Final, TypeAlias

import numpy as np
from numpy.typing import NDArray

Array: TypeAlias = NDArray[np.float64]

PERIOD: Final = 180.0
# Rounding must not cost a zone: a span that ends on the tolerance is served.
HAIR_DEG: Final = 1e-9
# Halvings when the tolerance is tightened without more settings.
TIGHTENINGS: Final = 16
# First points tried while tightening; all are tried for the number of settings.
MOST_STARTS: Final = 2000


def fewest_settings(low: Array, high: Array, tolerance: float) -> Array:
    """The fewest settings that serve all spans, and of those sets one with a small worst deviation.

    Parameters
    ----------
    low, high : ndarray, shape (N,)
        Spans of wanted settings in degrees, low ≤ high ≤ low + 2·tolerance, anywhere on the circle of
        180°; N at least 1.
    tolerance : float
        Degrees, above 0.

    Returns
    -------
    ndarray, shape (K,)
        Settings in degrees, ascending from the lowest span after the widest gap; not folded.
    """
    starts, ends = _arcs(low, high, tolerance)
    best = _pierced(starts, ends, None)
    widest = float(np.max(high - low))
    least, most = 0.5 * widest, tolerance
    for _ in range(TIGHTENINGS):
        middle = 0.5 * (least + most)
        found = _pierced(*_arcs(low, high, middle), MOST_STARTS)
        if len(found) <= len(best):
            best, most = found, middle
        else:
            least = middle
    return best


def needed_at_least(low: Array, high: Array, tolerance: float) -> int:
    """A lower bound of the number of settings: spans so far apart that no setting serves two of them.

    Parameters
    ----------
    low, high, tolerance
        As in `fewest_settings`.

    Returns
    -------
    int
        Equal to the fewest where the spans leave a gap that no setting's reach closes, else at most one less.
    """
    starts, ends = _arcs(low, high, tolerance)
    first = _after_widest_gap(starts, ends)
    begin = np.mod(starts - first, PERIOD)
    end = begin + (ends - starts)
    order = np.argsort(begin, kind="stable")
    begins, lowest = begin[order], np.minimum.accumulate(end[order][::-1])[::-1]
    count, index, at = 0, 0, 0.0
    while index < len(begins):
        at = float(lowest[index])
        index = int(np.searchsorted(begins, at, side="right"))
        count += 1
    # Arcs taken one after the other are apart, but around the circle the last may meet the first.
    meets = at >= float(begin[int(np.argmin(end))]) + PERIOD
    return max(1, count - 1) if meets else count


def _arcs(low: Array, high: Array, tolerance: float) -> tuple[Array, Array]:
    """Where a setting serves each span: lower ends within the first turn, upper ends above them."""
    start = high - tolerance - HAIR_DEG
    length = np.minimum(low - high + 2.0 * (tolerance + HAIR_DEG), PERIOD)
    start = np.mod(start, PERIOD)
    return start, start + length


def _after_widest_gap(starts: Array, ends: Array) -> float:
    """The beginning of the first arc after the widest stretch that no arc covers; else of any arc."""
    order = np.argsort(starts, kind="stable")
    reach = np.maximum.accumulate(ends[order])
    # What reaches over the end of the turn covers the beginning of the next one.
    reach = np.maximum(reach, reach[-1] - PERIOD)
    following = np.append(starts[order][1:], starts[order][0] + PERIOD)
    gaps = following - reach
    return float(np.mod(following[int(np.argmax(gaps))], PERIOD))


def _pierced(starts: Array, ends: Array, most_starts: int | None) -> Array:
    """Points that pierce all arcs: the fewest over all first points, or over some of them."""
    first = _after_widest_gap(starts, ends)
    begin = np.mod(starts - first, PERIOD)
    # Three turns, so that every next point can be looked up.
    length = ends - starts
    unrolled = np.concatenate([begin, begin + PERIOD, begin + 2.0 * PERIOD])
    order = np.argsort(unrolled, kind="stable")
    begins = unrolled[order]
    lowest = np.minimum.accumulate((unrolled + np.tile(length, 3))[order][::-1])[::-1]
    opening = int(np.argmin(begin + length))
    candidates = np.unique(np.mod(begin + length - begin[opening], PERIOD)) + begin[opening]
    candidates = candidates[candidates <= begin[opening] + length[opening]]
    if most_starts is not None and len(candidates) > most_starts:
        candidates = candidates[np.linspace(0, len(candidates) - 1, most_starts).astype(np.int64)]
    counts = _counts(candidates, begins, lowest)
    at = float(candidates[int(np.argmin(counts))])
    points = [at]
    while (
        after := float(lowest[np.searchsorted(begins, points[-1], side="right")])
    ) < at + PERIOD - HAIR_DEG:
        points.append(after)
    return np.asarray(points) + first


def _counts(candidates: Array, begins: Array, lowest: Array) -> NDArray[np.int64]:
    """How many points each first point leads to, once around."""
    counts = np.ones(len(candidates), dtype=np.int64)
    at = candidates.copy()
    going = np.arange(len(candidates))
    while going.size:
        at[going] = lowest[np.searchsorted(begins, at[going], side="right")]
        going = going[at[going] < candidates[going] + PERIOD - HAIR_DEG]
        counts[going] += 1
    return counts
