"""The plan of visits of a study."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from datetime import timedelta
from functools import cache
from typing import TYPE_CHECKING, Any, Final

from geoskew.fieldwork.visits import Plan, place_numbers, plan_visits, read_distances
from geoskew.outputs.visits import VisitSheets

if TYPE_CHECKING:
    from geoskew.study.core import Study

# Without [visits] work starts four weeks before the changeover.
WEEKS_AHEAD: Final = 4
DEFAULT_DETOUR: Final = 1.3


@dataclass(frozen=True)
class Planned:
    """A plan, as it is and as the outputs take it."""

    plan: Plan
    sheets: VisitSheets


def can_plan(study: Study) -> bool:
    """Whether the scenario has what a plan of visits needs."""
    scenario = study.scenario
    return scenario.changeover is not None and bool(scenario.crews) and scenario.has_sites


def plan_of(study: Study, *, on_progress: Callable[[int, int], None] | None = None) -> Planned:
    """Plan the visits.

    Raises
    ------
    MissingPartError
        The scenario lacks the changeover's time, crews or sites.
    """
    scenario = study.scenario
    scenario.require("changeover", "crews", "sites", for_what="a plan of visits")
    assert scenario.changeover is not None  # for the type checker: require() has seen it
    table = study.assessed.table
    visits: Any = scenario.visits
    distances = None
    if visits is not None and visits.distances is not None:
        distances = read_distances(visits.distances, place_numbers(table, scenario.crews))
    plan = plan_visits(
        table,
        crews=scenario.crews,
        first_day=visits.first_day
        if visits is not None and visits.first_day is not None
        else (scenario.changeover - timedelta(weeks=WEEKS_AHEAD)).date(),
        changeover=scenario.changeover,
        overlap_hours=scenario.overlap_hours,
        detour=visits.detour if visits is not None else DEFAULT_DETOUR,
        distances=distances,
        solver_seconds=visits.solver_seconds if visits is not None else None,
        on_progress=on_progress,
    )
    sheets = VisitSheets(
        title=scenario.title,
        changeover=scenario.changeover,
        visits=plan.visits,
        days=plan.days,
        unreached=plan.unreached,
        missing_crew_days=plan.missing_crew_days,
        notes=plan.notes,
    )
    return Planned(plan, sheets)


@cache
def judged_suffix(judged_in: str) -> str:
    """Ending of the names of the deciding margins."""
    return "_rain" if judged_in == "rain" else ""
