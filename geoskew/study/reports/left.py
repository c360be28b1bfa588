"""What is left to do after the reports: at which sites, on which day, by which crew."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from datetime import date, timedelta
from typing import TYPE_CHECKING, Any, Final

import numpy as np

from geoskew.fieldwork.reports import STATES, Reconciled
from geoskew.fieldwork.visits import Plan, place_numbers, plan_visits, read_distances
from geoskew.outputs.tables import ColumnInfo
from geoskew.outputs.visits import VisitSheets
from geoskew.study.plan import DEFAULT_DETOUR
from geoskew.study.reports.orders import VISITED
from geoskew.study.table import ports_of
from geoskew.study.turns import turns_of

if TYPE_CHECKING:
    import pandas as pd

    from geoskew.study.core import Study

PEAK: Final = "peak-dish"
READ: Final = "send-reading"
# How far ahead visits are planned once the new satellite carries the traffic, days.
HORIZON_DAYS: Final = 120
# An estimate is taken for wrong by no more than so many times its error.
TWO_SIGMA: Final = 2.0

_WHAT: Final = {
    "not-reported": "no report: do what the card says",
    "undone": "found as it was: do what the card says",
    "wrong-way": "turned the wrong way: turn back and on to the card's setting",
    "half-turn": "turned too little: turn on to the card's setting",
    "wrong-port": "a quarter turn off or leads exchanged: check the port first, then set what the card says",
    "elsewhere": "stands at another setting: measure it, then set what the card says",
    "contradicted": "reports contradict each other: measure the setting, then do what the card says",
    "unclear": "the reports do not tell: measure the setting, then do what the card says",
    "done": "set about as planned, but by its reading beyond what is tolerated: correct it",
}
_PEAK: Final = (
    "dish out of aim: peak it on the satellite in service, leave the feed, tighten, read the signal"
)
_READ: Final = "nothing was read that tells: ask the crew for a setting by inclinometer"

COLUMNS: Final = (
    ColumnInfo("crew", "", "crew that is to go"),
    ColumnInfo("day", "", "calendar day at the crew's base"),
    ColumnInfo("order", "", "place in the order of driving, from 1"),
    ColumnInfo("id", "", "identifier of the site"),
    ColumnInfo("state", "", "what became of the site by its reports"),
    ColumnInfo("action", "", "what is to be done"),
    ColumnInfo("what", "", "in words"),
    ColumnInfo("turn", "deg", "turn of the feed, positive clockwise seen from behind the dish", "layer"),
    ColumnInfo("turn_remark", "", "what goes with the turn: leads to exchange, a stop, or why there is none"),
    ColumnInfo("setting_deg", "deg", "setting that the feed is thought to have", "layer"),
    ColumnInfo("setting_error", "deg", "root mean square error of that setting", "layer"),
    ColumnInfo("reason", "", "why no crew and day are given"),
    ColumnInfo("lat", "deg", "latitude, WGS 84"),
    ColumnInfo("lon", "deg", "longitude, WGS 84"),
)


@dataclass(frozen=True)
class Left:
    """Sites with something left to do: ``todo`` by day and crew, ``visits`` as the plan's sheets.

    ``for_cards`` are the rows whose feed is to be turned: a dish to be peaked has no card.
    """

    todo: pd.DataFrame
    for_cards: pd.DataFrame
    sheets: VisitSheets | None
    plan: Plan | None
    remarks: tuple[str, ...] = ()


def left_of(
    study: Study, found: Reconciled, *, on_progress: Callable[[int, int], None] | None = None
) -> Left:
    """What is left of an updated study.

    A site that was set as planned is finished, unless its estimated setting lies outside of the window
    by more than the estimate may be wrong. A faulty one is finished, too, where its estimated setting
    keeps what both moments are held to.
    """
    scenario = study.scenario
    assert scenario.changeover is not None  # for the type checker: the command requires it
    days = [day for day in found.day if day is not None]
    first_day = _first_day(study, max(days) if days else None)
    # No visit ahead of the changeover is possible any more.
    late = first_day > scenario.changeover.date()
    table = study.assessed.table
    action = _actions(table, found, late=late)
    rows = np.flatnonzero(action != "")
    todo = table.iloc[rows].copy()
    todo["action"] = action[rows]
    # What is left need not be what was planned: a dish to be peaked has no turn.
    turns = turns_of(todo, np.broadcast_to(ports_of(scenario, study.sites.places), len(table))[rows])
    todo["turn"] = todo["turn_to_make"] = turns.turn
    todo["turn_remark"] = turns.remark
    for_cards = todo[todo["action"].isin(VISITED)]
    sheets = plan = None
    if scenario.crews:
        plan = _plan(study, todo, first_day, late=late, on_progress=on_progress)
        sheets = VisitSheets(
            title=scenario.title,
            changeover=scenario.changeover,
            visits=plan.visits,
            days=plan.days,
            unreached=plan.unreached,
            missing_crew_days=plan.missing_crew_days,
            notes=plan.notes,
        )
    peaks = int((todo["action"] == PEAK).sum())
    remarks = (f"{peaks} dishes are out of aim: they have no card, see to_do.csv",) if peaks else ()
    return Left(_list(todo, plan), for_cards, sheets, plan, remarks)


def _first_day(study: Study, last: date | None) -> date:
    """The day after the last report, and not before the plan's first day."""
    visits: Any = study.scenario.visits
    planned = None if visits is None else visits.first_day
    if last is None:
        assert study.scenario.changeover is not None  # for the type checker
        return planned or (study.scenario.changeover - timedelta(weeks=4)).date()
    following = last + timedelta(days=1)
    return following if planned is None else max(following, planned)


def _actions(table: pd.DataFrame, found: Reconciled, *, late: bool) -> np.ndarray:
    """What is left to do at every site; empty text where nothing is."""
    asked = table["action"].astype(str).to_numpy()
    visit = np.isin(asked, VISITED)
    if late:
        # A setting for both satellites is of no use any more.
        asked = np.where(asked == "preset", "turn-at-changeover", asked)
    state = found.state.astype(str)
    finished = np.isin(state, ("done", "not-planned"))
    action = np.where(visit & ~finished, asked, "")
    outside = np.maximum(table["window_low"].to_numpy(), -table["window_high"].to_numpy())
    off = (state == "done") & (asked == "preset") & (outside > TWO_SIGMA * found.error)
    action = np.where(off, asked, action)
    action = np.where((state == "unclear") & (action == ""), READ, action)
    return np.where(state == "out-of-aim", PEAK, action).astype(object)


def _plan(
    study: Study,
    todo: pd.DataFrame,
    first_day: date,
    *,
    late: bool,
    on_progress: Callable[[int, int], None] | None,
) -> Plan:
    """Crews and days for what is left, with the action in each stop as it is meant here."""
    scenario = study.scenario
    assert scenario.changeover is not None  # for the type checker
    table = todo[todo["action"] != READ].reset_index(drop=True)
    meant = dict(zip(table["id"], table["action"], strict=True))
    turns = dict(zip(table["id"], table["turn"], strict=True))
    # A dish is peaked as soon as can be; so is a feed that should have been turned by now.
    soon = (table["action"] == PEAK) | late
    table["action"] = np.where(soon, "preset", table["action"])
    until = scenario.changeover
    if late:
        until = scenario.changeover + timedelta(
            days=(first_day - scenario.changeover.date()).days + HORIZON_DAYS
        )
    visits: Any = scenario.visits
    distances = None
    if visits is not None and visits.distances is not None:
        distances = read_distances(visits.distances, place_numbers(table, scenario.crews))
    plan = plan_visits(
        table,
        crews=scenario.crews,
        first_day=first_day,
        changeover=until,
        overlap_hours=scenario.overlap_hours,
        detour=DEFAULT_DETOUR if visits is None else visits.detour,
        distances=distances,
        solver_seconds=None if visits is None else visits.solver_seconds,
        on_progress=on_progress,
    )
    for sheet in (plan.visits, plan.unreached):
        sheet["action"] = [meant[site] for site in sheet["id"]]
    plan.visits["turn"] = [turns[site] for site in plan.visits["id"]]
    if not late:
        return plan
    notes = tuple(note for note in plan.notes if "changeover" not in note)
    own = f"The changeover is past: what is left is planned from {first_day} on, as soon as crews can."
    return Plan(
        plan.visits, plan.days, plan.unreached, plan.missing_crew_days, (*notes, own), plan.interrupted
    )


def _list(todo: pd.DataFrame, plan: Plan | None) -> pd.DataFrame:
    """The list by day, crew and order of driving; behind them what has no day."""
    import pandas as pd

    known = {one.name: one.meaning for one in STATES}
    table = todo.copy()
    table["what"] = [
        _PEAK if action == PEAK else _READ if action == READ else _WHAT.get(state, known.get(state, ""))
        for state, action in zip(table["state"], table["action"], strict=True)
    ]
    stops = {} if plan is None else {row["id"]: row for row in plan.visits.to_dict("records")}
    lost = {} if plan is None else dict(zip(plan.unreached["id"], plan.unreached["reason"], strict=True))
    none = "the scenario names no crew" if plan is None else ""
    table["crew"] = [stops.get(site, {}).get("crew") for site in table["id"]]
    table["day"] = [str(stops[site]["day"]) if site in stops else None for site in table["id"]]
    table["order"] = pd.array([stops.get(site, {}).get("order") for site in table["id"]], dtype="Int64")
    table["reason"] = [
        None if site in stops else "no visit needed yet" if action == READ else lost.get(site, none)
        for site, action in zip(table["id"], table["action"], strict=True)
    ]
    table = table.sort_values(["day", "crew", "order"], kind="stable", na_position="last")
    return table[[one.name for one in COLUMNS]].reset_index(drop=True)
