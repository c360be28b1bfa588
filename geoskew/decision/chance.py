"""How likely a feed fails, given how settings and the satellite's EIRP scatter."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from itertools import pairwise
from typing import Final

import numpy as np
from numpy.typing import ArrayLike

from geoskew.angles import fold
from geoskew.decision.powers import Scattered, failing_with_eirp
from geoskew.link import WHOLE_CIRCLE, Array, Response, merged_arcs

# The largest spread of settings that is told apart, degrees: the most that a scenario may state.
WIDEST_SPREAD_DEG: Final = 45.0
# Halvings of that down to below 0.001 degrees.
SPREAD_STEPS: Final = 16


def fail_probability(
    responses: Sequence[Response],
    intended: ArrayLike,
    *,
    spread_deg: ArrayLike,
    eirp_spread_db: float = 0.0,
    level_db: float = 0.0,
) -> Array:
    """Chance in percent that the least margin is below a level when settings scatter normally.

    Parameters
    ----------
    responses : sequence of Response
        All carriers of the moment.
    intended : array_like
        The setting about which the real ones scatter, degrees.
    spread_deg : array_like
        Standard deviation of the setting, degrees; 0 gives 0 or 100.
    eirp_spread_db : float
        Standard deviation of the satellite's EIRP, dB. Noise and neighbours weigh by it; the satellite's
        own crossed carrier and the uplink do not.
    level_db : float
        The margin that must be kept.

    Returns
    -------
    ndarray
        Percent, broadcast shape; NaN where a carrier has no value.

    Notes
    -----
    The settings that fail are parts of the circle of 180°, found in closed form; the normal
    distribution is integrated over them and wrapped. Where EIRP scatters too, its share is in closed form
    at each setting, and a quadrature runs over the settings (to 0.2 percent at the worst). No random draws.
    """
    chance = _chance_by_spread(Scattered(responses, eirp_spread_db), intended, level_db)
    return 100.0 * chance(spread_deg)


def widest_spread(
    moments: Sequence[Scattered], intended: ArrayLike, *, percent: float, level_db: float = 0.0
) -> Array:
    """The largest spread of settings at which each moment's chance of failure stays at or below a level.

    Parameters
    ----------
    moments : sequence of Scattered
        The larger of their chances counts.
    intended : array_like
        The setting about which the real ones scatter, degrees.
    percent : float
        The chance that must not be exceeded.
    level_db : float
        The margin below which a moment fails.

    Returns
    -------
    ndarray
        Standard deviation in degrees, found to 0.001 from below; `WIDEST_SPREAD_DEG` where any spread
        is small enough, 0 where none is, NaN where a carrier has no value.

    Notes
    -----
    The settings that fail do not depend on the spread: they are found once, then the spread is
    bisected for all places at once.
    """
    chances = [_chance_by_spread(one, intended, level_db) for one in moments]

    def chance(spread: Array) -> Array:
        return np.asarray(100.0 * np.maximum.reduce(np.broadcast_arrays(*(one(spread) for one in chances))))

    at_widest = chance(np.asarray(WIDEST_SPREAD_DEG))
    low, high = np.zeros(at_widest.shape), np.full(at_widest.shape, WIDEST_SPREAD_DEG)
    for _ in range(SPREAD_STEPS):
        middle = 0.5 * (low + high)
        good = chance(middle) <= percent
        low, high = np.where(good, middle, low), np.where(good, high, middle)
    low = np.where(at_widest <= percent, WIDEST_SPREAD_DEG, low)
    return np.where(np.isnan(at_widest), np.nan, low)


def _chance_by_spread(
    moment: Scattered, intended: ArrayLike, level_db: float
) -> Callable[[ArrayLike], Array]:
    """The share (0..1) that fails as a function of the spread of settings."""
    if moment.eirp_spread_db > 0.0:
        return lambda spread: failing_with_eirp(moment, intended, spread, level_db)
    arcs = merged_arcs(moment.responses, [one.allowed(level_db) for one in moment.responses])
    return lambda spread: _failing(arcs, intended, spread)


def _failing(arcs: Sequence[tuple[Array, Array]], intended: ArrayLike, spread_deg: ArrayLike) -> Array:
    """Share (0..1) of settings outside of the arcs."""
    meant = np.asarray(intended, dtype=np.float64)
    middles = [fold(middle - meant) for middle, _ in arcs]
    halves = [half for _, half in arcs]
    unknown = np.logical_or.reduce(np.broadcast_arrays(*(np.isnan(half) for half in halves)))
    if len(arcs) == 1:
        # All that is not the one good arc is bad: from its upper end to its lower one, half a turn on.
        inside = np.clip(halves[0], 0.0, WHOLE_CIRCLE)
        failing = _wrapped_normal(middles[0] + inside, middles[0] - inside + 180.0, spread_deg)
        failing = np.where(halves[0] < 0.0, 1.0, failing)
    else:
        failing = _outside_all(middles, halves, intended, spread_deg)
    return np.where(unknown, np.nan, np.clip(failing, 0.0, 1.0))


def _outside_all(
    middles: Sequence[Array], halves: Sequence[Array], intended: ArrayLike, spread_deg: ArrayLike
) -> Array:
    """Share of settings that are outside of at least one arc."""
    shape = np.broadcast_shapes(
        np.shape(intended), np.shape(spread_deg), *(np.shape(half) for half in halves)
    )
    # Ends of all arcs, counted up from 90° below the intended setting; between two all is good or all bad.
    ends = [np.zeros(shape), np.full(shape, 180.0)]
    for middle, half in zip(middles, halves, strict=True):
        inside = np.clip(half, 0.0, WHOLE_CIRCLE)
        ends += [np.broadcast_to(np.mod(middle + side * inside + 90.0, 180.0), shape) for side in (-1.0, 1.0)]
    ladder = np.sort(np.stack(ends), axis=0) - 90.0
    failing = np.zeros(shape)
    for low, high in pairwise(ladder):
        centre = 0.5 * (low + high)
        good = np.logical_and.reduce(
            [np.abs(fold(centre - middle)) <= half for middle, half in zip(middles, halves, strict=True)]
        )
        failing = failing + np.where(good, 0.0, _wrapped_normal(low, high, spread_deg))
    return failing


def _wrapped_normal(low: Array, high: Array, spread_deg: ArrayLike) -> Array:
    """Normal distribution about 0 over [low, high], within −90..270°, and its images 180° away."""
    from scipy.special import ndtr

    spread = np.maximum(np.asarray(spread_deg, dtype=np.float64), 1e-9)
    reach = int(np.ceil((90.0 + 8.5 * float(np.max(spread))) / 180.0))
    total = np.zeros(np.broadcast_shapes(low.shape, spread.shape))
    for image in range(-reach - 1, reach + 1):
        lower, upper = (low + 180.0 * image) / spread, (high + 180.0 * image) / spread
        # Taken from the side where both tails are small, rare failures keep their digits.
        flip = lower > 0.0
        total = total + ndtr(np.where(flip, -lower, upper)) - ndtr(np.where(flip, -upper, lower))
    return total
