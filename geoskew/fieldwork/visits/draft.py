"""A plan in the making: tours of crews, the days they are driven on, and the sites left over."""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from geoskew.fieldwork.visits.allot import Limits, allot_to_crews, tour_km, tours_by_savings
from geoskew.fieldwork.visits.days import CrewDay
from geoskew.fieldwork.visits.distances import Distances


@dataclass(frozen=True)
class Round:
    """A tour of several days, on consecutive calendar days of one crew."""

    crew: int
    days: tuple[CrewDay, ...]
    tour: list[int]


@dataclass
class Draft:
    """Tours of one kind of visit.

    Places are numbered: crew c's base is place c, site s is place ``crews + s``.

    Attributes
    ----------
    distances : Distances
        Between all places.
    limits : tuple of Limits
        Of each crew.
    days : tuple of tuple of CrewDay
        Each crew's working days of this kind that no round takes, in order.
    stretch : tuple of int
        The most consecutive days of each crew, before rounds took any.
    value : ndarray (places,)
        What a visit is worth.
    tours : list of (crew, sites)
        At most as many of one crew as it has days, once ``settle`` was called.
    left : list of int
        Sites without a tour.
    rounds : list of Round
        Tours with nights on the road.
    """

    distances: Distances
    limits: tuple[Limits, ...]
    days: tuple[tuple[CrewDay, ...], ...]
    stretch: tuple[int, ...]
    value: NDArray[np.float64]
    tours: list[tuple[int, list[int]]] = field(default_factory=list)
    left: list[int] = field(default_factory=list)
    rounds: list[Round] = field(default_factory=list)

    @property
    def crews(self) -> int:
        """Number of crews."""
        return len(self.limits)

    def km(self) -> float:
        """Kilometres of all tours."""
        return sum(tour_km(crew, tour, self.distances) for crew, tour in self.tours)

    def worth(self, tour: list[int]) -> float:
        """What a tour's visits are worth together."""
        return float(self.value[tour].sum())

    def merit(self) -> tuple[float, int, float]:
        """For comparing drafts: value served, sites served, kilometres (fewer are better)."""
        served = [site for _, tour in self.tours for site in tour]
        return round(self.worth(served), 6), len(served), -round(self.km(), 6)


def build(draft: Draft, sites: NDArray[np.intp]) -> None:
    """Fill an empty draft: sites to crews, tours, days, and whatever still fits in between."""
    room = np.array(
        [len(days) * limits.visits for days, limits in zip(draft.days, draft.limits, strict=True)],
        dtype=np.intp,
    )
    reach = np.array([limits.km for limits in draft.limits])
    bases = np.arange(draft.crews)
    draft.left = sites.tolist()
    if draft.crews == 0 or len(sites) == 0:
        return
    km_to_base = draft.distances.km(sites[:, None], bases[None, :])
    crew_of = allot_to_crews(km_to_base, draft.value[sites], room, reach)
    for crew in range(draft.crews):
        own = sites[crew_of == crew]
        draft.tours += [
            (crew, tour) for tour in tours_by_savings(crew, own, draft.distances, draft.limits[crew])
        ]
    settle(draft, sites)
    fill(draft)


def settle(draft: Draft, sites: NDArray[np.intp]) -> None:
    """Keep no more tours of a crew than it has days, those worth most, and note who is left over."""
    kept: list[tuple[int, list[int]]] = []
    for crew in range(draft.crews):
        own = [tour for number, tour in draft.tours if number == crew]
        own.sort(key=lambda tour: (-draft.worth(tour), tour))
        kept += [(crew, tour) for tour in own[: len(draft.days[crew])]]
    draft.tours = kept
    served = {site for _, tour in kept for site in tour}
    draft.left = [int(site) for site in sites if int(site) not in served]


def fill(draft: Draft) -> None:
    """Put sites that are left over where a day still has room, those worth most first."""
    for crew in range(draft.crews):
        empty = len(draft.days[crew]) - sum(1 for number, _ in draft.tours if number == crew)
        draft.tours += [(crew, []) for _ in range(empty)]
    lengths = [tour_km(crew, tour, draft.distances) for crew, tour in draft.tours]
    waiting = sorted(draft.left, key=lambda site: (-draft.value[site], site))
    still: list[int] = []
    for site in waiting:
        place = _cheapest_place(draft, lengths, site)
        if place is None:
            still.append(site)
            continue
        which, at, more = place
        draft.tours[which][1].insert(at, site)
        lengths[which] += more
    draft.tours = [(crew, tour) for crew, tour in draft.tours if tour]
    draft.left = sorted(still)


def _cheapest_place(draft: Draft, lengths: list[float], site: int) -> tuple[int, int, float] | None:
    """The tour and the place in it where a site costs the fewest kilometres, if any keeps the limits."""
    origin: list[int] = []
    target: list[int] = []
    where: list[tuple[int, int]] = []
    for which, (crew, tour) in enumerate(draft.tours):
        if len(tour) >= draft.limits[crew].visits:
            continue
        stops = [crew, *tour, crew]
        origin += stops[:-1]
        target += stops[1:]
        where += [(which, at) for at in range(len(stops) - 1)]
    if not where:
        return None
    a, b = np.array(origin), np.array(target)
    more = draft.distances.km(a, site) + draft.distances.km(site, b) - draft.distances.km(a, b)
    room = np.array([draft.limits[draft.tours[which][0]].km - lengths[which] for which, _ in where])
    more[(more > room) | ~np.isfinite(more)] = np.inf
    best = int(np.argmin(more))
    if not np.isfinite(more[best]):
        return None
    return (*where[best], float(more[best]))


def nearest_neighbour(draft: Draft, sites: NDArray[np.intp]) -> None:
    """Fill an empty draft the plain way: each day drives on to the nearest site that is still open.

    Kept as a second start: where it serves more, or as much with fewer kilometres, it is taken.
    """
    km_home = draft.distances.km(np.arange(draft.crews)[:, None], np.arange(len(draft.value))[None, :])
    waiting = np.array(sorted(sites.tolist()), dtype=np.intp)
    turns = sorted((day.day, day.crew) for days in draft.days for day in days)
    for _, crew in turns:
        tour: list[int] = []
        driven, here = 0.0, crew
        while len(waiting) and len(tour) < draft.limits[crew].visits:
            km = draft.distances.km(here, waiting)
            km = np.where(driven + km + km_home[crew, waiting] <= draft.limits[crew].km, km, np.inf)
            nearest = int(np.argmin(km))
            if not np.isfinite(km[nearest]):
                break
            here = int(waiting[nearest])
            tour.append(here)
            driven += float(km[nearest])
            waiting = np.delete(waiting, nearest)
        if tour:
            draft.tours.append((crew, tour))
    draft.left = waiting.tolist()
