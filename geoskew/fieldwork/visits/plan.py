"""The plan of visits: which crew goes where on which day, and who cannot be reached in time."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Mapping, Sequence
from datetime import date, datetime
from typing import TYPE_CHECKING, Final

import numpy as np
from numpy.typing import NDArray

from geoskew.fieldwork.visits.allot import Limits
from geoskew.fieldwork.visits.days import Crew, days_ahead, days_at
from geoskew.fieldwork.visits.distances import Distances
from geoskew.fieldwork.visits.draft import Draft, build, fill, nearest_neighbour
from geoskew.fieldwork.visits.rounds import add_rounds, longest_stretch
from geoskew.fieldwork.visits.routing import count_slices, shorten
from geoskew.fieldwork.visits.sheets import AHEAD, AT_CHANGEOVER, Plan, Rows, plan_of

if TYPE_CHECKING:
    import pandas

# How often tours are shortened and filled up again, as long as that serves further sites.
_ROUNDS: Final = 3


def plan_visits(
    table: pandas.DataFrame,
    *,
    crews: Sequence[Crew],
    first_day: date,
    changeover: datetime,
    overlap_hours: float = 0.0,
    detour: float = 1.3,
    distances: Mapping[tuple[int, int], float] | None = None,
    solver_seconds: float | None = None,
    on_progress: Callable[[int, int], None] | None = None,
) -> Plan:
    """Plan the visits of all sites whose action asks for one.

    Sites worth most come first: ``weight`` × (``fail_probability`` + 1), a missing weight counting as 1
    and a missing chance of failure as 100 %. ``preset`` sites are visited from the first day up to the
    changeover; ``turn-at-changeover`` and ``re-aim`` sites on the days that touch the hours in which both
    satellites work, else on a crew's nearest working day after it. Days start and end at the base; sites
    beyond a day's reach are visited on rounds of consecutive working days.

    Parameters
    ----------
    table : DataFrame
        The assessed table: ``id``, ``lat``, ``lon``, ``action``, and what there is of ``weight``,
        ``fail_probability``, ``turn_shared``, ``turn_realigned``, ``name``, ``district``, ``access``. Sites
        that see no satellite have another action and are left out.
    crews : sequence of Crew
        Bases, working days and limits of a day.
    first_day : date
        The first day of work.
    changeover : datetime
        Aware.
    overlap_hours : float
        How long both satellites carry the traffic.
    detour : float
        Road over great circle.
    distances : mapping, optional
        Roads out of a file (``read_distances`` with ``place_numbers``).
    solver_seconds : float, optional
        The longest that the tours of one crew may be worked on; None: until nothing gets shorter. Only
        where the time runs out can two runs differ, and a note says so.
    on_progress : callable, optional
        Called with (done, total).

    Returns
    -------
    Plan
        Interrupted by the keyboard, the best plan so far, flagged.
    """
    rows = Rows.of(table)
    places = Distances(
        np.concatenate(([crew.base.lon_deg for crew in crews], rows.longitude)),
        np.concatenate(([crew.base.lat_deg for crew in crews], rows.latitude)),
        detour,
        distances or {},
    )
    limits = tuple(Limits(int(crew.visits_per_day), float(crew.km_per_day)) for crew in crews)
    value = np.concatenate((np.zeros(len(crews)), rows.value))
    ahead = [
        tuple(days_ahead(crew, c, first_day=first_day, changeover=changeover)) for c, crew in enumerate(crews)
    ]
    at = [
        tuple(days_at(crew, c, first_day=first_day, changeover=changeover, overlap_hours=overlap_hours))
        for c, crew in enumerate(crews)
    ]
    # The sites that can only be served at the changeover are planned first: they have the fewest days.
    kinds = ((AT_CHANGEOVER, tuple(at)), (AHEAD, tuple(ahead)))
    drafts = [
        (
            Draft(places, limits, days, tuple(map(longest_stretch, days)), value),
            rows.places(actions, len(crews)),
        )
        for actions, days in kinds
    ]
    interrupted = False
    skipped = 0
    try:
        drafts = [(_best_start(draft, sites), sites) for draft, sites in drafts]
        skipped = _shorten_all([draft for draft, _ in drafts], solver_seconds, on_progress)
    except KeyboardInterrupt:
        interrupted = True
    notes = _notes(crews, changeover, detour, distances, skipped, interrupted)
    return plan_of(rows, crews, drafts, notes, interrupted=interrupted)


def place_numbers(table: pandas.DataFrame, crews: Sequence[Crew]) -> dict[str, int]:
    """Numbers of places by name, for ``read_distances``: ``base:NAME`` for bases, ids for sites."""
    names = {f"base:{crew.name}": c for c, crew in enumerate(crews)}
    return names | {str(site): len(crews) + k for k, site in enumerate(table["id"])}


def _best_start(empty: Draft, sites: NDArray[np.intp]) -> Draft:
    """The better of the two ways to begin, by what is served and then by kilometres."""
    plain = Draft(empty.distances, empty.limits, empty.days, empty.stretch, empty.value)
    build(empty, sites)
    nearest_neighbour(plain, sites)
    best = max((empty, plain), key=Draft.merit)
    add_rounds(best)
    return best


def _shorten_all(
    drafts: Iterable[Draft], seconds: float | None, on_progress: Callable[[int, int], None] | None
) -> int:
    drafts = list(drafts)
    total = max(1, sum(count_slices(draft) for draft in drafts))
    done = 0

    def step() -> None:
        nonlocal done
        done = min(done + 1, total)
        if on_progress is not None:
            on_progress(done, total)

    skipped = 0
    for draft in drafts:
        for _ in range(_ROUNDS):
            waiting = len(draft.left)
            skipped += shorten(draft, seconds_per_crew=seconds, on_slice=step)
            fill(draft)  # shorter tours leave kilometres for sites that did not fit before
            if len(draft.left) == waiting:
                break
    if on_progress is not None:
        on_progress(total, total)
    return skipped


def _notes(
    crews: Sequence[Crew],
    changeover: datetime,
    detour: float,
    distances: Mapping[tuple[int, int], float] | None,
    skipped: int,
    interrupted: bool,
) -> tuple[str, ...]:
    roads = f"Distances are great circles times {detour:g}"
    notes = [
        f"{roads} where the file has none." if distances else f"{roads}.",
        f"Days are calendar days at each crew's base; the changeover is {changeover:%Y-%m-%d %H:%M} UTC.",
    ]
    if crews:
        notes.append(
            "Days start and end at the base; only sites beyond a day's reach are visited on rounds with "
            "nights on the road, on consecutive working days."
        )
    if skipped:
        notes.append(
            f"The time for shortening tours ran out; {skipped} groups of tours stay as first laid out."
        )
    if interrupted:
        notes.append("The planning was interrupted; this is the best plan so far.")
    if not crews:
        notes.append("The scenario names no crew.")
    return tuple(notes)
