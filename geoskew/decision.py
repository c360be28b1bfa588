"""What is to be done at each place, and how likely an untouched feed fails."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace
from typing import Final

import numpy as np
from numpy.typing import ArrayLike, NDArray

from geoskew.angles import fold
from geoskew.link import WHOLE_CIRCLE, Array, Response, merged_arcs, ratio

# Codes and names of the layer `action`.
ACTIONS: Final[tuple[tuple[int, str], ...]] = (
    (0, "leave"),
    (1, "preset"),
    (2, "turn-at-changeover"),
    (3, "re-aim"),
    (4, "upgrade"),
    (5, "no-sight"),
)
LEAVE, PRESET, TURN_AT_CHANGEOVER, RE_AIM, UPGRADE, NO_SIGHT = range(6)

# Nodes of the Gauss-Hermite rule over the spread of EIRP.
SPREAD_NODES: Final = 16


def action(
    *,
    new_satellite_usable: ArrayLike,
    margin_untouched: ArrayLike,
    margin_realigned: ArrayLike,
    best_without_aiming: ArrayLike,
    window_exists: ArrayLike,
    reserve_db: float,
    slots_differ: bool,
    turning_helps: bool = True,
) -> NDArray[np.uint8]:
    """The first action that applies, by code.

    Parameters
    ----------
    new_satellite_usable : array_like of bool
        False: below the lowest usable elevation, or blocked.
    margin_untouched, margin_realigned, best_without_aiming : array_like
        Deciding margins after the changeover, dB: nothing done; dish and feed set for the new
        satellite; feed alone set for it while the dish keeps the old aim. NaN (no coverage, or the
        old satellite never seen) keeps no reserve.
    window_exists : array_like of bool
        Whether one setting keeps what both moments are held to.
    turning_helps : bool
        False for circular polarisation, where no turn changes anything.

    Returns
    -------
    ndarray of uint8
        Broadcast shape; `no-sight` where the new satellite serves nobody.
    """
    conditions = np.broadcast_arrays(
        ~np.asarray(new_satellite_usable, dtype=bool),
        ~(np.asarray(margin_realigned) >= reserve_db),
        np.asarray(margin_untouched) >= reserve_db,
        np.asarray(window_exists, dtype=bool) & turning_helps,
        slots_differ & ~(np.asarray(best_without_aiming) >= reserve_db),
    )
    codes = [NO_SIGHT, UPGRADE, LEAVE, PRESET, RE_AIM]
    return np.select(list(conditions), codes, default=TURN_AT_CHANGEOVER).astype(np.uint8)


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
        Standard deviation of the satellite's EIRP, dB; integrated by Gauss-Hermite quadrature.
    level_db : float
        The margin that must be kept.

    Returns
    -------
    ndarray
        Percent, broadcast shape; NaN where a carrier has no value.

    Notes
    -----
    The settings that fail are parts of the circle of 180°, found in closed form; the normal
    distribution is integrated over them and wrapped. No random draws.
    """
    if eirp_spread_db <= 0.0:
        return 100.0 * _failing(responses, intended, spread_deg, level_db)
    nodes, weights = np.polynomial.hermite.hermgauss(SPREAD_NODES)
    shifts = np.sqrt(2.0) * eirp_spread_db * nodes
    parts = [
        weight * _failing([_stronger(one, shift) for one in responses], intended, spread_deg, level_db)
        for shift, weight in zip(shifts, weights, strict=True)
    ]
    return np.asarray(100.0 * np.sum(parts, axis=0) / np.sqrt(np.pi))


def _stronger(response: Response, decibels: float) -> Response:
    """The same carrier sent with more EIRP: noise and neighbours weigh less, its own crossed carrier does not."""
    factor = 1.0 / ratio(decibels)
    return replace(
        response,
        noise=response.noise * factor,
        neighbour_even=response.neighbour_even * factor,
        neighbour_cosine=response.neighbour_cosine * factor,
        neighbour_sine=response.neighbour_sine * factor,
    )


def _failing(
    responses: Sequence[Response], intended: ArrayLike, spread_deg: ArrayLike, level_db: float
) -> Array:
    """Share (0..1) of settings below the level."""
    arcs = merged_arcs(responses, [level_db] * len(responses))
    middles = [fold(middle - intended) for middle, _ in arcs]
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
    shape = np.broadcast_shapes(np.shape(intended), np.shape(spread_deg), *(np.shape(half) for half in halves))
    # Ends of all arcs, counted up from 90° below the intended setting; between neighbours all is good or all bad.
    ends = [np.zeros(shape), np.full(shape, 180.0)]
    for middle, half in zip(middles, halves, strict=True):
        inside = np.clip(half, 0.0, WHOLE_CIRCLE)
        ends += [np.broadcast_to(np.mod(middle + side * inside + 90.0, 180.0), shape) for side in (-1.0, 1.0)]
    ladder = np.sort(np.stack(ends), axis=0) - 90.0
    failing = np.zeros(shape)
    for low, high in zip(ladder[:-1], ladder[1:], strict=True):
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
