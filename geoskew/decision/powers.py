"""The share of settings and powers that fail where the satellite's EIRP scatters too."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Final, NamedTuple

import numpy as np
from numpy.typing import ArrayLike

from geoskew.link import Array, Response

# The quadrature over settings: from −4.75 to 4.75 standard deviations in 32 steps, doubled as often
# as it takes to keep a step within 1.2°.
REACH: Final = 4.75
LEAST_STEPS: Final = 32
WIDEST_STEP_DEG: Final = 1.2
# A step over which the room for noise changes by less is level: difference quotients would lose digits.
LEAST_RISE: Final = 1e-3


class Scattered(NamedTuple):
    """All carriers of one moment and the standard deviation of their satellite's EIRP, dB."""

    responses: Sequence[Response]
    eirp_spread_db: float


def failing_with_eirp(
    moment: Scattered, intended: ArrayLike, spread_deg: ArrayLike, level_db: float
) -> Array:
    """Share (0..1) of settings and powers below the level.

    At one setting the powers that fail are those below the margin's room for noise: a lognormal share. Over
    a step of the quadrature that room and the density of settings are taken as linear, for which the mean
    has a closed form: steep flanks (a small spread of EIRP) and flat ones come out alike.
    """
    spread = np.asarray(spread_deg, dtype=np.float64)
    needed = 2.0 * REACH * spread / (WIDEST_STEP_DEG * LEAST_STEPS)
    doublings = np.ceil(np.log2(np.maximum(needed, 1.0)))
    failing: Array = np.zeros(())
    # Steps follow each place's own spread, so that a place has one value in whatever company.
    for count in np.unique(doublings):
        steps = LEAST_STEPS * 2 ** int(count)
        found = _along_settings(moment, intended, spread, level_db, steps)
        failing = np.where(doublings == count, found, failing)
    return failing


def _along_settings(
    moment: Scattered, intended: ArrayLike, spread: Array, level_db: float, steps: int
) -> Array:
    """Quadrature of the failing share over the settings in a number of steps."""
    nodes = np.linspace(-REACH, REACH, steps + 1)

    def at(node: float) -> _Lognormal:
        setting = np.asarray(intended, dtype=np.float64) + node * spread
        rooms = [one.room_for_noise(level_db, setting) for one in moment.responses]
        return _Lognormal.at(np.minimum.reduce(np.broadcast_arrays(*rooms)), moment.eirp_spread_db)

    end = at(nodes[0])
    failing = np.zeros(end.room.shape)
    for (share, slant), node in zip(_linear_shares(nodes), nodes[1:], strict=True):
        start, end = end, at(node)
        failing = failing + share * _mean_share(start, end, slant)
    return np.clip(failing, 0.0, 1.0)


def _linear_shares(nodes: Array) -> list[tuple[float, float]]:
    """Share of the normal distribution in each step, and the slant of its density there.

    With t from 0 to 1 along the step the density is share·(1 + slant·(t − ½)): mass and mean are the
    distribution's own. The tails count with the outer steps.
    """
    from scipy.special import ndtr

    ends = np.concatenate(([-np.inf], nodes[1:-1], [np.inf]))
    shares = np.diff(ndtr(ends))
    means = -np.diff(np.exp(-0.5 * ends**2)) / np.sqrt(2.0 * np.pi) / shares
    position = (means - nodes[:-1]) / np.diff(nodes)
    return [(float(share), 12.0 * (float(t) - 0.5)) for share, t in zip(shares, position, strict=True)]


class _Lognormal(NamedTuple):
    """Share of powers for which noise exceeds a room r, and the integrals of it and of r times it, 0 to r.

    Noise over carrier falls as power rises: with EIRP normal in dB it is lognormal about 1. Below 0 there is
    no room, and all powers fail.
    """

    room: Array
    share: Array
    integral: Array
    moment: Array

    @classmethod
    def at(cls, room: Array, spread_db: float) -> _Lognormal:
        from scipy.special import ndtr

        a = 10.0 / (np.log(10.0) * spread_db)
        log = np.log(np.maximum(room, np.finfo(np.float64).tiny))
        share = ndtr(-a * log)
        integral = room * share + np.exp(0.5 / a**2) * ndtr(a * log - 1.0 / a)
        moment = 0.5 * (room**2 * share + np.exp(2.0 / a**2) * ndtr(a * log - 2.0 / a))
        return cls(room, share, integral, moment)


def _mean_share(start: _Lognormal, end: _Lognormal, slant: float) -> Array:
    """Mean share along a step, the room linear in t from 0 to 1, under a density of 1 + slant·(t − ½)."""
    rise = end.room - start.room
    level = np.abs(rise) < LEAST_RISE * np.maximum(np.abs(start.room), np.abs(end.room))
    rise = np.where(level, 1.0, rise)
    area = end.integral - start.integral
    plain = area / rise
    # ∫ t·share dt with t = (room − start)/rise.
    first = (end.moment - start.moment - start.room * area) / rise**2
    even = 0.5 * (start.share + end.share) + slant * (end.share - start.share) / 12.0
    return np.where(level, even, plain + slant * (first - 0.5 * plain))
