"""The search for the greatest excess that some setting reaches, for all places at once."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace
from typing import Any, Final

import numpy as np
from numpy.typing import NDArray

from geoskew.link import Array
from geoskew.policies.curves import Curve, arcs, least_excess, overlap

# The excess is found to this: some 1e-6° of a curve's flank. At a smooth peak the middle of what is left is
# taken.
EXCESS_TOLERANCE_DB: Final = 1e-8
# Of two arcs the search aims at this much of an overlap, which leaves the setting exact to as much.
AIM_DEG: Final = 5e-8
# Enough to halve 200 dB down to the tolerance.
MOST_STEPS: Final = 40

# Below the level found the arcs overlap by more than rounding: 1e-9 dB is some 1e-9° of a curve's flank.
BACK_OFF_DB: Final = 1e-9

# The least excess worth telling apart; it bounds the search from below, not the results.
LOWEST_EXCESS_DB: Final = -200.0

_BY_PLACE: Final = (
    *("suits", "noise", "crossed", "leak", "uplink"),
    *("neighbour_even", "neighbour_cosine", "neighbour_sine"),
)


def greatest_excess(curves: Sequence[Curve], shape: tuple[int, ...]) -> Array:
    """The greatest level of excess at which all arcs still meet, to the tolerance and from below."""
    bound = [curve.response.best_bound() - curve.held_to for curve in curves]
    high = np.broadcast_to(np.minimum.reduce(np.broadcast_arrays(*bound)), shape) + BACK_OFF_DB
    starts = {id(curve.response.suits): curve.response.suits for curve in curves}
    reached = [np.broadcast_to(least_excess(curves, suits), shape) for suits in starts.values()]
    # The best of the curves' own settings is reached; a hair below it rounding cannot unmake it.
    low = np.maximum(np.maximum.reduce(reached), LOWEST_EXCESS_DB) - BACK_OFF_DB
    value_low = np.maximum(overlap(*arcs(curves, low)), 0.0)
    value_high = np.minimum(overlap(*arcs(curves, high)), -1e-12)
    neither = np.zeros(())
    bracket = np.stack(np.broadcast_arrays(low, high, value_low, value_high, neither)).reshape(5, -1)

    found = bracket[0].copy()
    todo = np.arange(found.size)
    going = _is_open(bracket)
    some = _of_places(curves, shape, None)
    for step in range(MOST_STEPS):
        if 4 * np.count_nonzero(going) <= 3 * going.size:
            # Most places are found early; the rest goes on alone.
            found[todo] = bracket[0]
            todo, bracket = todo[going], bracket[:, going]
            going = np.ones(todo.size, dtype=bool)
            some = _of_places(curves, shape, todo)
        if not todo.size:
            break
        # A place that is found stays as it is: its digits do not depend on the others'.
        bracket = np.where(going, _narrowed(some, bracket, bisect=step % 4 == 3), bracket)
        going = going & _is_open(bracket)
    found[todo] = bracket[0]
    return np.asarray(found.reshape(shape))


def _is_open(bracket: Array) -> NDArray[np.bool_]:
    return np.asarray(bracket[1] - bracket[0] > EXCESS_TOLERANCE_DB)


def _narrowed(curves: Sequence[Curve], bracket: Array, *, bisect: bool) -> Array:
    """One step of regula falsi after Illinois on the overlap of the arcs, or a bisection.

    A bracket is (low, high, overlap at low, overlap at high, end that moved last: 1 low, −1 high) by places.
    """
    low, high, value_low, value_high, moved = bracket
    middle = 0.5 * (low + high)
    if not bisect:
        with np.errstate(invalid="ignore", divide="ignore"):
            falsi = low + (high - low) * value_low / (value_low - value_high)
        middle = np.where((falsi > low) & (falsi < high), falsi, middle)
    value = overlap(*arcs(curves, middle)) - AIM_DEG
    # Between 0 and twice the aim the arcs just meet: the place is found.
    there = np.abs(value) <= AIM_DEG
    met = there | (value >= 0.0)
    # Illinois: an end that stays a second time counts half, so that the other one does not creep.
    value_high = np.where(moved > 0.0, 0.5 * value_high, value_high)
    value_low = np.where(moved < 0.0, 0.5 * value_low, value_low)
    return np.stack(
        [
            np.where(met, middle, low),
            np.where(met & ~there, high, middle),
            np.where(met, value, value_low),
            np.where(met, value_high, value),
            np.where(met, 1.0, -1.0),
        ]
    )


def _of_places(
    curves: Sequence[Curve], shape: tuple[int, ...], chosen: NDArray[np.intp] | None
) -> list[Curve]:
    """Curves of some places, or of all, flattened; arrays that carriers share stay shared."""
    where = np.unravel_index(chosen, shape) if chosen is not None and shape else ()
    known: dict[int, Array] = {}

    def pick(value: Array) -> Array:
        if np.ndim(value) == 0:
            return value
        if id(value) not in known:
            full = np.broadcast_to(value, shape)
            known[id(value)] = full.ravel() if chosen is None else full[where]
        return known[id(value)]

    picked = []
    for response, held in curves:
        arrays: dict[str, Any] = {name: pick(getattr(response, name)) for name in _BY_PLACE}
        picked.append(Curve(replace(response, **arrays), pick(held)))
    return picked
