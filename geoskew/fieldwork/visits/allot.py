"""Giving sites to crews, and a crew's sites to days: which sites, whose, and in which tour.

Tours are made by the savings method (Clarke and Wright, "Scheduling of vehicles from a central depot to
a number of delivery points", Operations Research 12, 1964): two tours are joined at their ends where
that saves the most kilometres, as long as a day's limits allow it.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.typing import NDArray

from geoskew.fieldwork.visits.distances import Distances

# Joins are only tried with so many nearest sites; far pairs save little.
_NEIGHBOURS: Final = 40


@dataclass(frozen=True, slots=True)
class Limits:
    """What a crew can do on one day."""

    visits: int
    km: float


def allot_to_crews(
    km_to_base: NDArray[np.float64],
    value: NDArray[np.float64],
    room: NDArray[np.intp],
    reach: NDArray[np.float64],
) -> NDArray[np.intp]:
    """Give each site to one crew, near ones first, within the visits that a crew can make in all.

    Parameters
    ----------
    km_to_base : ndarray (sites, crews)
        One way.
    value : ndarray (sites,)
        What a visit is worth; the sites of most value are served where not all can be.
    room : ndarray (crews,)
        Visits that each crew can make.
    reach : ndarray (crews,)
        Kilometres of a crew's day: a site further than half of it is out of reach.

    Returns
    -------
    ndarray (sites,)
        The crew's number; −1 where none is left or none reaches it.
    """
    possible = (2.0 * km_to_base <= reach[None, :]) & (room[None, :] > 0)
    cost = np.where(possible, km_to_base, np.inf)
    crew_of = np.full(len(value), -1, dtype=np.intp)
    reachable = np.flatnonzero(possible.any(axis=1))
    ranked = reachable[np.lexsort((reachable, -value[reachable]))][: int(room.sum())]
    nearest = np.sort(cost[ranked], axis=1)
    # What it costs to be refused by the nearest crew: those with most to lose choose first.
    second = nearest[:, 1] if cost.shape[1] > 1 else np.full(len(ranked), np.inf)
    left = room.copy()
    for site in ranked[np.lexsort((ranked, -(second - nearest[:, 0])))]:
        open_cost = np.where(left > 0, cost[site], np.inf)
        crew = int(np.argmin(open_cost))
        if np.isfinite(open_cost[crew]):
            crew_of[site] = crew
            left[crew] -= 1
    return crew_of


@dataclass
class _Joining:
    """Tours of one crew while they are joined; sites are counted from 0 within the crew."""

    from_base: NDArray[np.float64]
    limits: Limits
    tours: list[list[int]]
    length: list[float]
    tour_of: list[int]
    fits: Callable[[list[int]], bool]

    def join(self, i: int, j: int, saved: float) -> bool:
        """Join the tours that end in i and in j, where both are ends and the limits allow it."""
        a, b = self.tour_of[i], self.tour_of[j]
        if a == b or len(self.tours[a]) + len(self.tours[b]) > self.limits.visits:
            return False
        joined = self.length[a] + self.length[b] - saved
        ends = i in (self.tours[a][0], self.tours[a][-1]) and j in (self.tours[b][0], self.tours[b][-1])
        if not ends or joined > self.limits.km:
            return False
        first = self.tours[a] if self.tours[a][-1] == i else self.tours[a][::-1]
        second = self.tours[b] if self.tours[b][0] == j else self.tours[b][::-1]
        if not self.fits(first + second):
            return False
        self.tours[a], self.tours[b] = first + second, []
        self.length[a] = joined
        for k in second:
            self.tour_of[k] = a
        return True


def tours_by_savings(
    base: int,
    sites: NDArray[np.intp],
    distances: Distances,
    limits: Limits,
    *,
    fits: Callable[[list[int]], bool] | None = None,
) -> list[list[int]]:
    """Cut sites into tours that start and end at the base.

    ``base`` and ``sites`` are numbers of places; each site must be reachable on its own within the
    limits. Every tour keeps them, and passes ``fits`` where that is given.
    """
    if len(sites) == 0:
        return []
    from_base = distances.km(base, sites)
    count = range(len(sites))
    joining = _Joining(
        from_base,
        limits,
        [[k] for k in count],
        (2.0 * from_base).tolist(),
        list(count),
        (lambda tour: True) if fits is None else lambda tour: fits(sites[tour].tolist()),
    )
    for i, j, saved in _savings(sites, from_base, distances):
        joining.join(i, j, saved)
    _join_short_tours(joining, sites, distances)
    return [[int(sites[k]) for k in tour] for tour in joining.tours if tour]


def _join_short_tours(joining: _Joining, sites: NDArray[np.intp], distances: Distances) -> None:
    """Join what is left of half-empty days, near or far: a day that is not needed serves others."""
    short = [k for k, tour in enumerate(joining.tours) if tour and 2 * len(tour) <= joining.limits.visits]
    for which in sorted(short, key=lambda k: (len(joining.tours[k]), k)):
        tour = joining.tours[which]
        if not tour:
            continue
        others = [k for k, other in enumerate(joining.tours) if other and k != which]
        ends = np.array([(joining.tours[k][0], joining.tours[k][-1]) for k in others], dtype=np.intp).ravel()
        choices = [
            (float(saved), i, int(j))
            for i in {tour[0], tour[-1]}
            for saved, j in zip(
                joining.from_base[i] + joining.from_base[ends] - distances.km(sites[i], sites[ends]),
                ends,
                strict=True,
            )
        ]
        for saved, i, j in sorted(choices, key=lambda choice: (-choice[0], choice[1:])):
            if joining.join(i, j, saved):
                break


def _savings(
    sites: NDArray[np.intp], from_base: NDArray[np.float64], distances: Distances
) -> list[tuple[int, int, float]]:
    """Pairs of sites with what joining them saves, most first."""
    count = min(_NEIGHBOURS, len(sites) - 1)
    pairs: list[NDArray[np.float64]] = []
    for k in range(len(sites)):
        km = distances.km(sites[k], sites)
        km[k] = np.inf
        near = np.argpartition(km, count - 1)[:count] if 0 < count < len(sites) - 1 else np.arange(len(sites))
        near = near[near > k] if count == len(sites) - 1 else near[near != k]
        saved = from_base[k] + from_base[near] - km[near]
        pairs.append(np.column_stack((np.full(len(near), float(k)), near, saved)))
    table = np.concatenate(pairs)
    table = table[table[:, 2] > 0.0]
    order = np.lexsort((table[:, 1], table[:, 0], -table[:, 2]))
    return [(int(i), int(j), float(saved)) for i, j, saved in table[order]]


def legs_of(base: int, tour: list[int], distances: Distances) -> list[float]:
    """Kilometres to each stop of a tour, and home."""
    stops = np.array([base, *tour, base], dtype=np.intp)
    legs: list[float] = distances.km(stops[:-1], stops[1:]).tolist()
    return legs


def tour_km(base: int, tour: list[int], distances: Distances) -> float:
    """Length of a tour with the way out and the way home, km."""
    return sum(legs_of(base, tour, distances))
