"""Rounds of several days for sites beyond a day's reach: the crew sleeps where its day ends.

A round starts and ends at the base and takes consecutive calendar days on which the crew works. A long
road is cut by a night where the day's kilometres run out.
"""

from __future__ import annotations

from dataclasses import dataclass
from datetime import timedelta

import numpy as np
from numpy.typing import NDArray

from geoskew.fieldwork.visits.allot import Limits, allot_to_crews, legs_of, tours_by_savings
from geoskew.fieldwork.visits.days import CrewDay
from geoskew.fieldwork.visits.draft import Draft, Round
from geoskew.fieldwork.visits.routing import shorter_tours


@dataclass(frozen=True, slots=True)
class Itinerary:
    """A tour cut into days: the day of each stop (from 0), the km of each day, and where nights fall.

    A night is (leg, share of it driven); leg k leads to stop k, the last one home.
    """

    day_of_stop: tuple[int, ...]
    km_of_day: tuple[float, ...]
    nights: tuple[tuple[int, float], ...]


def itinerary(legs: list[float], limits: Limits) -> Itinerary:
    """Cut a tour into days, each as full as it gets; ``legs`` in km, the last one leads home."""
    day_of_stop: list[int] = []
    km_of_day: list[float] = []
    nights: list[tuple[int, float]] = []
    left, visits = limits.km, 0
    for k, leg in enumerate(legs):
        driven = 0.0
        while leg - driven > left + 1e-6:
            driven += left
            km_of_day.append(limits.km)
            nights.append((k, driven / leg))
            left, visits = limits.km, 0
        left -= leg - driven
        if k == len(legs) - 1:
            break
        if visits == limits.visits:
            km_of_day.append(limits.km - left)
            nights.append((k, 1.0))
            left, visits = limits.km, 0
        visits += 1
        day_of_stop.append(len(km_of_day))
    km_of_day.append(limits.km - left)
    return Itinerary(tuple(day_of_stop), tuple(km_of_day), tuple(nights))


def longest_stretch(days: tuple[CrewDay, ...]) -> int:
    """The most consecutive calendar days among a crew's working days."""
    return max((len(stretch) for stretch in _stretches(days)), default=0)


def _stretches(days: tuple[CrewDay, ...]) -> list[list[CrewDay]]:
    stretches: list[list[CrewDay]] = []
    for day in days:
        if stretches and day.day - stretches[-1][-1].day == timedelta(days=1):
            stretches[-1].append(day)
        else:
            stretches.append([day])
    return stretches


def add_rounds(draft: Draft) -> None:
    """Plan rounds for the sites that are left, and give them days where that serves more.

    Day tours and rounds of a crew compete for its days by what they are worth a day. A round never
    displaces tours that are worth more together, since each of them is worth less a day than it is.
    """
    rounds = _candidates(draft)
    if not rounds:
        return
    chosen: list[Round] = []
    tours: list[tuple[int, list[int]]] = []
    free: list[tuple[CrewDay, ...]] = []
    for crew in range(draft.crews):
        own = [tour for number, tour in draft.tours if number == crew]
        kept, taken, days = _choose(draft, crew, own, rounds.get(crew, []))
        tours += [(crew, tour) for tour in kept]
        chosen += taken
        free.append(days)
    served = {site for _, tour in tours for site in tour} | {site for one in chosen for site in one.tour}
    everyone = {site for _, tour in draft.tours for site in tour} | set(draft.left)
    # In this order an interrupt in between leaves every site in one place at most.
    draft.tours = tours
    draft.days = tuple(free)
    draft.rounds = chosen
    draft.left = sorted(everyone - served)


def _candidates(draft: Draft) -> dict[int, list[list[int]]]:
    """Rounds of each crew over the sites that are left, no longer than its longest stretch of days."""
    sites = np.array(sorted(draft.left), dtype=np.intp)
    stretch = np.array(draft.stretch, dtype=np.intp)
    if len(sites) == 0 or draft.crews == 0 or stretch.max(initial=0) < 2:
        return {}
    days = np.array([len(some) for some in draft.days], dtype=np.intp)
    visits = np.array([limits.visits for limits in draft.limits], dtype=np.intp)
    room = np.where(stretch > 1, days * visits, 0).astype(np.intp)
    reach = np.array([limits.km for limits in draft.limits]) * stretch.astype(np.float64)
    km_to_base = draft.distances.km(sites[:, None], np.arange(draft.crews)[None, :])
    crew_of = allot_to_crews(km_to_base, draft.value[sites], room, reach)
    return {
        crew: rounds_of(draft, crew, sites[crew_of == crew])
        for crew in range(draft.crews)
        if stretch[crew] > 1
    }


def rounds_of(draft: Draft, crew: int, sites: NDArray[np.intp]) -> list[list[int]]:
    """Cut sites into rounds of a crew, none longer than its longest stretch of days."""
    day = draft.limits[crew]
    most = draft.stretch[crew]

    def fits(tour: list[int]) -> bool:
        return days_needed(draft, crew, tour) <= most

    sites = np.array([site for site in sites.tolist() if fits([site])], dtype=np.intp)
    whole = Limits(day.visits * most, day.km * most)
    rounds = tours_by_savings(crew, sites, draft.distances, whole, fits=fits)
    shorter = [shorter_tours(crew, [tour], draft.distances, whole)[0] for tour in rounds]
    return [
        new if days_needed(draft, crew, new) <= days_needed(draft, crew, old) else old
        for old, new in zip(rounds, shorter, strict=True)
    ]


def days_needed(draft: Draft, crew: int, tour: list[int]) -> int:
    """Days of a crew that a tour takes."""
    return len(itinerary(legs_of(crew, tour, draft.distances), draft.limits[crew]).km_of_day)


def _choose(
    draft: Draft, crew: int, tours: list[list[int]], rounds: list[list[int]]
) -> tuple[list[list[int]], list[Round], tuple[CrewDay, ...]]:
    """Day tours and rounds that get days, by what a day of them is worth, and the days left for tours."""
    options = [(draft.worth(tour), 1, tour) for tour in tours]
    for tour in rounds:
        need = days_needed(draft, crew, tour)
        options.append((draft.worth(tour) / need, need, tour))
    options.sort(key=lambda option: (-option[0], option[1], option[2]))
    free = draft.days[crew]
    kept: list[list[int]] = []
    taken: list[Round] = []
    for _, need, tour in options:
        if len(free) - need < len(kept):
            continue
        if need == 1:
            kept.append(tour)
            continue
        stretch = next((some for some in _stretches(free) if len(some) >= need), None)
        if stretch is not None:
            taken.append(Round(crew, tuple(stretch[:need]), tour))
            free = tuple(day for day in free if day not in stretch[:need])
    return kept, taken, free
