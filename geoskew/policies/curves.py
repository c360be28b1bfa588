"""Curves of excess, and the arcs of settings on which they keep a level."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Final, NamedTuple

import numpy as np
from numpy.typing import ArrayLike, NDArray

from geoskew.angles import fold
from geoskew.link import WHOLE_CIRCLE, Array, Response, merged_arcs, ratio

# The end of one arc counts as within another that ends there as well, whatever rounding says.
ARC_ROUNDING_DEG: Final = 1e-9


class Curve(NamedTuple):
    """One carrier at one moment and the margin (dB, broadcastable) that the moment is held to."""

    response: Response
    held_to: Array


def held_to(best: ArrayLike, *, reserve_db: float, allowed_loss_db: float) -> Array:
    """What a moment is held to, dB: the reserve; where the best misses it, the best less what is allowed."""
    best = np.asarray(best, dtype=np.float64)
    return np.where(best < reserve_db, best - allowed_loss_db, np.where(np.isnan(best), np.nan, reserve_db))


def least_excess(curves: Sequence[Curve], setting: ArrayLike) -> Array:
    """The least excess of all curves at settings in degrees, dB."""
    excess = [curve.response.margin(setting) - curve.held_to for curve in curves]
    return np.asarray(np.minimum.reduce(np.broadcast_arrays(*excess)))


def arcs(curves: Sequence[Curve], level: Array) -> tuple[list[Array], list[Array]]:
    """Settings that keep an excess of `level` dB, an arc a curve (or a moment): middles and half-widths."""
    factor = ratio(-level)
    found = merged_arcs(
        [curve.response for curve in curves],
        [factor * curve.response.allowed(curve.held_to) for curve in curves],
    )
    return [middle for middle, _ in found], [half for _, half in found]


def in_all(setting: Array, middles: Sequence[Array], halves: Sequence[Array], skip: int) -> NDArray[np.bool_]:
    """Whether a setting is in every arc but number `skip` (where it is an end, rounding must not decide)."""
    good = np.ones(np.shape(setting), dtype=bool)
    for number, (middle, half) in enumerate(zip(middles, halves, strict=True)):
        if number != skip:
            good = good & (np.abs(fold(setting - middle)) <= half + ARC_ROUNDING_DEG)
    return good


def overlap(middles: Sequence[Array], halves: Sequence[Array]) -> Array:
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
        found = found | ((half < WHOLE_CIRCLE) & in_all(middle - half, middles, halves, number))
    return np.where(none_empty & found, 1.0, -1.0)
