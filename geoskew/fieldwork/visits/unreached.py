"""Who cannot be reached in time, why, and how many crew days are missing."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from geoskew.fieldwork.visits.allot import tours_by_savings
from geoskew.fieldwork.visits.days import Crew
from geoskew.fieldwork.visits.draft import Draft
from geoskew.fieldwork.visits.rounds import days_needed, rounds_of

if TYPE_CHECKING:
    import pandas


def reasons(
    table: pandas.DataFrame,
    crews: Sequence[Crew],
    drafts: Sequence[tuple[Draft, NDArray[np.intp]]],
    served: set[int],
    *,
    interrupted: bool,
) -> tuple[list[dict[str, Any]], int]:
    """List the sites that have to be visited and are not, and count the missing crew days.

    Crew days are counted by cutting the sites that are out of time, each given to its nearest crew, into
    further days or rounds of that crew. Sites beyond every crew's longest round are not counted: no number
    of days helps.
    """
    lost: list[dict[str, Any]] = []
    missing = 0
    for draft, sites in drafts:
        open_sites = np.array([site for site in sites if int(site) not in served], dtype=np.intp)
        if len(open_sites) == 0:
            continue
        km = draft.distances.km(open_sites[:, None], np.arange(draft.crews)[None, :])
        lon, lat = draft.distances.longitude, draft.distances.latitude
        day = np.array([limits.km for limits in draft.limits])
        # A crew without days in this time counts with one, to tell "too far" from "no day".
        within = 2.0 * km <= day * np.maximum(draft.stretch, 1)
        for place, near, way in zip(open_sites, within, km, strict=True):
            row = table.iloc[int(place) - draft.crews]
            reason = _reason(crews, draft, near, way, interrupted=interrupted)
            where = {"lon": float(lon[place]), "lat": float(lat[place])}
            lost.append({"id": row["id"], "action": row["action"], "reason": reason} | where)
        nearest = np.where(within, km, np.inf)
        for crew in range(draft.crews):
            own = within.any(axis=1) & (nearest.argmin(axis=1) == crew)
            a_day = 2.0 * km[:, crew] <= day[crew]
            missing += len(
                tours_by_savings(crew, open_sites[own & a_day], draft.distances, draft.limits[crew])
            )
            missing += sum(
                days_needed(draft, crew, tour) for tour in rounds_of(draft, crew, open_sites[own & ~a_day])
            )
    lost += _without_place(table, drafts)
    return lost, missing


def _reason(
    crews: Sequence[Crew],
    draft: Draft,
    near: NDArray[np.bool_],
    way: NDArray[np.float64],
    *,
    interrupted: bool,
) -> str:
    if not crews:
        return "no crew is named"
    if not near.any():
        crew = int(np.argmin(way))
        name, day, row = crews[crew].name, draft.limits[crew].km, max(draft.stretch[crew], 1)
        days = f"{row} working days in a row" if row > 1 else "one working day"
        there_and_back = f"{2.0 * way[crew]:.0f} km there and back"
        return f"out of reach: {there_and_back} from the base of {name}, which has {days} of {day:g} km"
    if interrupted:
        return "the planning was interrupted before this site had its turn"
    if not any(draft.stretch[crew] for crew in np.flatnonzero(near)):
        return "no crew that could reach it works in the time that is open for it"
    return "out of time: the days of every crew that could reach it are full"


def _without_place(
    table: pandas.DataFrame, drafts: Sequence[tuple[Draft, NDArray[np.intp]]]
) -> list[dict[str, Any]]:
    """Sites with a visit to make and without coordinates, which a caller may hand over."""
    if not drafts:
        return []
    draft = drafts[0][0]
    lon, lat = draft.distances.longitude[draft.crews :], draft.distances.latitude[draft.crews :]
    due = table["action"].isin(("preset", "turn-at-changeover", "re-aim")).to_numpy()
    rows = np.flatnonzero(due & ~(np.isfinite(lon) & np.isfinite(lat)))
    return [
        {"id": table.iloc[k]["id"], "action": table.iloc[k]["action"], "reason": "it has no coordinates"}
        | {"lon": np.nan, "lat": np.nan}
        for k in rows
    ]
