"""Places parted into the fewest zones of one setting each."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final, TypeAlias

import numpy as np
from numpy.typing import ArrayLike, NDArray

from geoskew.angles import fold
from geoskew.fieldwork.zones.cover import HAIR_DEG, PERIOD, fewest_settings, needed_at_least

Array: TypeAlias = NDArray[np.float64]
NO_ZONE: Final = -1
NO_DISTRICT: Final = -1


@dataclass(frozen=True)
class Partition:
    """Zones of places.

    Attributes
    ----------
    labels : ndarray of int32
        The zone of each place, from 0; `NO_ZONE` where there is no value.
    settings : ndarray, shape (K,)
        The setting of each zone, degrees in (−90, 90].
    needed_at_least : int
        No partition has fewer zones than this.
    split : tuple of int
        Districts in which no one setting is within the tolerance of every place; their places stand each
        for itself.
    """

    labels: NDArray[np.int32]
    settings: Array
    needed_at_least: int
    split: tuple[int, ...] = ()

    def deviation(self, wanted: ArrayLike) -> Array:
        """How far each place's own setting lies from its zone's, degrees; NaN where there is no zone."""
        here = np.where(self.labels == NO_ZONE, np.nan, self.settings[np.maximum(self.labels, 0)])
        return np.abs(fold(np.asarray(wanted, dtype=np.float64) - here))


def partition(wanted: ArrayLike, tolerance: float, *, districts: ArrayLike | None = None) -> Partition:
    """Part places into the fewest zones within which one setting is within the tolerance of every place.

    A zone is a set of places with one setting. It need not hang together: on a smooth field zones are bands
    between two lines of equal setting, which may come in several pieces.

    Parameters
    ----------
    wanted : array_like
        The setting that each place wants, degrees modulo 180, any shape; NaN: no value, no zone.
    tolerance : float
        Degrees, above 0.
    districts : array_like of int, optional
        The district of each place, `NO_DISTRICT` for none. Places of a district share a zone, unless the
        district spans more than twice the tolerance.

    Returns
    -------
    Partition
        Zones numbered by ascending setting from the widest gap of settings on. Of the partitions with the
        fewest zones one whose largest deviation is small.

    Raises
    ------
    ValueError
        No place has a value, or the tolerance is not above 0.
    """
    values = np.asarray(wanted, dtype=np.float64)
    known = np.isfinite(values)
    if not known.any():
        raise ValueError("no place has a value: there is nothing to part")
    if not tolerance > 0.0:
        raise ValueError(f"a tolerance of {tolerance:g} degrees is not above 0")
    flat = values[known]
    given = None if districts is None else np.asarray(districts)[known]
    group, low, high, split = _spans(flat, tolerance, given)
    settings = fewest_settings(low, high, tolerance)
    bound = needed_at_least(low, high, tolerance)
    nearest = _nearest(0.5 * (low + high), settings)
    # A zone's setting goes to the middle of what it serves: the worst deviation falls, nothing is lost.
    apart = _fold(0.5 * (low + high) - settings[nearest])
    half = 0.5 * (high - low)
    lowest, highest = np.full(len(settings), np.inf), np.full(len(settings), -np.inf)
    np.minimum.at(lowest, nearest, apart - half)
    np.maximum.at(highest, nearest, apart + half)
    settings = settings + 0.5 * (lowest + highest)
    labels = np.full(values.shape, NO_ZONE, dtype=np.int32)
    labels[known] = nearest[group]
    return Partition(labels, fold(settings), bound, split)


def _spans(
    flat: Array, tolerance: float, districts: NDArray[np.int64] | None
) -> tuple[NDArray[np.int64], Array, Array, tuple[int, ...]]:
    """Spans of settings that stay together: the number of each place's span, both ends, split districts."""
    whole = np.mod(flat, PERIOD)
    if districts is None:
        single, group = np.unique(whole, return_inverse=True)
        return group.reshape(-1), single, single, ()
    names, of = np.unique(districts, return_inverse=True)
    of = of.reshape(-1)
    # Any place of a district serves as the origin of its angles while it spans less than a right angle.
    origin = np.zeros(len(names))
    origin[of] = whole
    beyond = _fold(whole - origin[of])
    low, high = np.full(len(names), np.inf), np.full(len(names), -np.inf)
    np.minimum.at(low, of, beyond)
    np.maximum.at(high, of, beyond)
    joined = (
        (high - low <= 2.0 * (tolerance - HAIR_DEG)) & (high - low < 0.5 * PERIOD) & (names != NO_DISTRICT)
    )
    kept = np.flatnonzero(joined)
    number = np.full(len(names), -1)
    number[kept] = np.arange(len(kept))
    alone = ~joined[of]
    single, within = np.unique(whole[alone], return_inverse=True)
    group = number[of]
    group[alone] = len(kept) + within.reshape(-1)
    split = tuple(int(name) for name in names[~joined] if name != NO_DISTRICT)
    lows = np.concatenate([(origin + low)[kept], single])
    highs = np.concatenate([(origin + high)[kept], single])
    return group, lows, highs, split


def _nearest(middles: Array, settings: Array) -> NDArray[np.int64]:
    """Number of the setting nearest to each middle, on the circle."""
    around = np.mod(settings, PERIOD)
    order = np.argsort(around, kind="stable")
    ring = np.concatenate([[around[order[-1]] - PERIOD], around[order], [around[order[0]] + PERIOD]])
    numbers = np.concatenate([[order[-1]], order, [order[0]]])
    place = np.mod(middles, PERIOD)
    above = np.clip(np.searchsorted(ring, place), 1, len(ring) - 1)
    lower = place - ring[above - 1] <= ring[above] - place
    return np.asarray(numbers[np.where(lower, above - 1, above)], dtype=np.int64)


def _fold(angle: Array) -> Array:
    return np.asarray(fold(angle))
