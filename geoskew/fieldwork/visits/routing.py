"""Shortening tours with OR-tools' routing library, a few tours of one crew at a time.

One model for all crews and days is far too large; slices of neighbouring tours take a fraction of a
second each. The search has no random part and ends at a local optimum, so that a plan repeats.
"""

from __future__ import annotations

import math
import time
from collections.abc import Callable
from typing import Any, Final

import numpy as np
from numpy.typing import NDArray

from geoskew.fieldwork.visits.allot import Limits, tour_km
from geoskew.fieldwork.visits.distances import Distances
from geoskew.fieldwork.visits.draft import Draft

# Sites of one model. Measured on two cores: 30 sites end in about a tenth of a second.
_SLICE_SITES: Final = 30
_METRE: Final = 1000.0
# The longest that one slice may take, seconds: a guard that the measured cases never reach.
_SLICE_SECONDS: Final = 5


def shorten(
    draft: Draft, *, seconds_per_crew: float | None = None, on_slice: Callable[[], None] | None = None
) -> int:
    """Shorten all tours in place; returns the number of slices that the time did not allow.

    Limits of a day are kept, every site stays in the plan, and a slice whose model is not better keeps
    the tours it had.
    """
    skipped = 0
    for crew in range(draft.crews):
        started = time.monotonic()
        for shift in (0, 1):
            for members in _slices(draft, crew, shift):
                if seconds_per_crew is not None and time.monotonic() - started > seconds_per_crew:
                    skipped += 1
                    continue
                tours = [draft.tours[k][1] for k in members]
                better = shorter_tours(crew, tours, draft.distances, draft.limits[crew])
                changed = dict(zip(members, better, strict=True))
                # One assignment: an interrupt must not leave a site in two tours, or in none.
                draft.tours = [(number, changed.get(k, tour)) for k, (number, tour) in enumerate(draft.tours)]
                if on_slice is not None:
                    on_slice()
    draft.tours = [(crew, tour) for crew, tour in draft.tours if tour]
    return skipped


def _slices(draft: Draft, crew: int, shift: int) -> list[list[int]]:
    """Tours of one crew in groups of neighbours, by bearing from the base; the second round is shifted."""
    own = [k for k, (number, tour) in enumerate(draft.tours) if number == crew and tour]
    own.sort(key=lambda k: (_bearing(draft, crew, draft.tours[k][1]), k))
    if not own:
        return []
    count = math.ceil(sum(len(draft.tours[k][1]) for k in own) / _SLICE_SITES)
    if count == 1:
        return [own] if shift == 0 else []
    size = math.ceil(len(own) / count)
    if shift:
        turn = max(1, size // 2)
        own = own[turn:] + own[:turn]
    return [own[k : k + size] for k in range(0, len(own), size)]


def _bearing(draft: Draft, crew: int, tour: list[int]) -> float:
    """Direction of a tour's middle from the base, as an angle that only serves for sorting."""
    lon, lat = draft.distances.longitude, draft.distances.latitude
    east = float(np.mean((lon[tour] - lon[crew] + 180.0) % 360.0 - 180.0)) * math.cos(math.radians(lat[crew]))
    return math.atan2(east, float(np.mean(lat[tour])) - float(lat[crew]))


def shorter_tours(base: int, tours: list[list[int]], distances: Distances, limits: Limits) -> list[list[int]]:
    """The same sites in the same number of tours or fewer (an empty list stands for none), in fewer km."""
    places = [base, *(site for tour in tours for site in tour)]
    if len(places) < 3:
        return tours
    metres = np.rint(distances.matrix(places) * _METRE).astype(np.int64)
    number = {place: k for k, place in enumerate(places)}
    start = [[number[site] for site in tour] for tour in tours]
    found = _search(metres, start, limits)
    if found is None:
        return tours
    better = [[places[k] for k in tour] for tour in found]
    before = sum(tour_km(base, tour, distances) for tour in tours)
    after = sum(tour_km(base, tour, distances) for tour in better)
    keeps = all(tour_km(base, tour, distances) <= limits.km for tour in better)
    return better if keeps and after < before - 1e-9 else tours


def _search(metres: NDArray[np.int64], start: list[list[int]], limits: Limits) -> list[list[int]] | None:
    """Local search of OR-tools from the given tours; None where it finds nothing."""
    from ortools.constraint_solver import pywrapcp, routing_enums_pb2

    manager = pywrapcp.RoutingIndexManager(len(metres), len(start), 0)
    model = pywrapcp.RoutingModel(manager)
    cost = model.RegisterTransitMatrix(metres.tolist())
    model.SetArcCostEvaluatorOfAllVehicles(cost)
    model.AddDimension(cost, 0, math.floor(limits.km * _METRE), True, "metres")
    one = model.RegisterUnaryTransitVector([0] + [1] * (len(metres) - 1))
    model.AddDimension(one, 0, limits.visits, True, "visits")
    parameters = pywrapcp.DefaultRoutingSearchParameters()
    parameters.local_search_metaheuristic = routing_enums_pb2.LocalSearchMetaheuristic.GREEDY_DESCENT
    parameters.time_limit.seconds = _SLICE_SECONDS
    model.CloseModelWithParameters(parameters)
    first = model.ReadAssignmentFromRoutes(start, True)
    if first is None:
        return None
    solution = model.SolveFromAssignmentWithParameters(first, parameters)
    if solution is None:
        return None
    return [_tour(model, manager, solution, vehicle) for vehicle in range(len(start))]


def _tour(model: Any, manager: Any, solution: Any, vehicle: int) -> list[int]:
    """The places of one vehicle in driving order."""
    tour: list[int] = []
    index = model.Start(vehicle)
    while not model.IsEnd(index):
        index = solution.Value(model.NextVar(index))
        if not model.IsEnd(index):
            tour.append(int(manager.IndexToNode(index)))
    return tour


def count_slices(draft: Draft) -> int:
    """How many groups of tours ``shorten`` works on, for a progress bar."""
    return sum(len(_slices(draft, crew, shift)) for crew in range(draft.crews) for shift in (0, 1))
