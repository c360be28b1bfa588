"""The planner's report of a study: two to four pages of what changes, for whom, and how sure that is."""

from __future__ import annotations

from collections.abc import Callable
from datetime import timedelta
from typing import TYPE_CHECKING, Any, Final

import numpy as np

from geoskew.decision import ACTIONS
from geoskew.layers import REGISTRY
from geoskew.outputs import summary
from geoskew.outputs.report import (
    Block,
    Bullets,
    Figures,
    Grid,
    Heading,
    LoadFigure,
    MapFigure,
    Report,
    Words,
)
from geoskew.study import reporttables as tables
from geoskew.study.facts import CAUTIONS, edition
from geoskew.study.pictures import Canvas, lesser
from geoskew.study.plan import Planned, can_plan, judged_suffix, plan_of
from geoskew.study.sensitivity import RISK_PERCENT, sensitivity

if TYPE_CHECKING:
    from geoskew.study.core import Study

Progress = Callable[[str, float, float], None]

WORST_SHOWN: Final = 6
UNREACHED_SHOWN: Final = 6
MARGIN_LIMITS: Final = (-8.0, 8.0)
BASE_THANKS: Final = "coast and borders: Natural Earth 1:50 million, public domain"


def report_of(
    study: Study,
    *,
    planned: Planned | None = None,
    rows: list[dict[str, Any]] | None = None,
    progress: Progress = lambda phase, done, total: None,
) -> Report:
    """Compose the report.

    Parameters
    ----------
    study : Study
    planned : Planned, optional
        The plan of visits, if it was made already.
    rows : list of dict, optional
        The table of sensitivity, if it was made already.

    Raises
    ------
    MissingPartError
        The scenario lacks the changeover, or both region and sites.
    """
    scenario = study.scenario
    scenario.require("changeover", for_what="a report")
    scenario.require_any("region", "sites", for_what="a report")
    assert scenario.changeover is not None  # for the type checker: require() has seen it
    if scenario.has_sites:
        if planned is None and can_plan(study):
            planned = plan_of(study, on_progress=lambda done, total: progress("plan of visits", done, total))
        if rows is None:
            rows = sensitivity_rows(study, progress)
    progress("figures", 0, 1)
    canvas = Canvas(study, _layers(study))
    blocks: list[Block] = [Heading("In short"), Bullets(_in_short(study, planned, rows))]
    blocks += [Heading("What changes"), tables.what_changes(scenario)]
    blocks += [Heading("What is to be done"), *_actions(study, canvas)]
    blocks += [Heading("Skew and margins", new_page=True), *_figures(study, canvas)]
    blocks += _risk(study, rows)
    blocks += _crews(planned)
    blocks += [Heading("Assumptions and editions"), Bullets(_assumptions(study, planned), small=True)]
    blocks += [Heading("Cautions"), Bullets(CAUTIONS, small=True)]
    progress("figures", 1, 1)
    return Report(
        title=f"Changeover report: {scenario.title}",
        subtitle=f"{scenario.outgoing.name} to {scenario.incoming.name}, "
        f"{scenario.changeover:%d %B %Y %H:%M} UTC; {study.judged}",
        foot=f"{scenario.title} · {edition(scenario)}",
        dated=scenario.changeover,
        blocks=tuple(blocks),
    )


def sensitivity_rows(study: Study, progress: Progress) -> list[dict[str, Any]]:
    """The table of sensitivity of the study's sites."""
    return sensitivity(
        study.scenario,
        study.sites.places,
        study.inputs,
        on_progress=lambda done, total: progress("sensitivity", done, total),
    )


def _layers(study: Study) -> tuple[str, ...]:
    suffix = judged_suffix(study.scenario.judged_in)
    margins = ("margin_untouched", "margin_shared_before", "margin_shared_after")
    return ("action", "skew_before", "skew_after", *(f"{name}{suffix}" for name in margins))


def _in_short(study: Study, planned: Planned | None, rows: list[dict[str, Any]] | None) -> tuple[str, ...]:
    """The few sentences that a reader takes along."""
    scenario = study.scenario
    if not scenario.has_sites:
        return ("The scenario has no site list: the figures hold for its default terminal.",)
    table, suffix = study.assessed.table, judged_suffix(scenario.judged_in)
    counts = summary.counts_by_class(table["action"], ACTIONS)
    lost = int((table[f"margin_untouched{suffix}"].astype(float) < 0.0).sum())
    lines = [
        f"{len(table)} sites: {counts['leave']} can be left alone, {counts['preset']} need one visit ahead "
        f"of time, {counts['turn-at-changeover']} must be turned and {counts['re-aim']} re-aimed at the "
        f"changeover, {counts['upgrade']} need better equipment, {counts['no-sight']} do not see it.",
        f"If nothing were done, {lost} sites would lose the signal under the conditions that decide.",
    ]
    if planned is not None and len(planned.plan.visits) + len(planned.plan.unreached):
        plan = planned.plan
        line = f"The crews make {len(plan.visits)} visits on {len(plan.days)} crew days, {plan.km:,.0f} km"
        missing = f"; {plan.missing_crew_days} crew days are missing" if plan.missing_crew_days else ""
        lines.append(f"{line}; {len(plan.unreached)} sites are not reached in time{missing}.")
    if rows:
        worst = max(rows[1:], key=lambda row: int(row["sites_that_change"]), default=None)
        if worst is not None and worst["sites_that_change"]:
            changed = f"{worst['assumption']} {worst['value']}".replace("-", "−")
            lines.append(
                f'Of the assumptions tried, "{changed}" moves the plan most: {worst["sites_that_change"]} '
                "sites would have another action."
            )
        lines.append(
            f"As planned, {rows[0]['at_risk']} of the sites served keep a chance of failure above "
            f"{RISK_PERCENT:g} %, given how feeds are set and how EIRP scatters."
        )
    return tuple(lines)


def _actions(study: Study, canvas: Canvas) -> list[Block]:
    counts = {name: 0 for _, name in ACTIONS}
    actions: list[object] = []
    if study.scenario.has_sites:
        actions = list(study.assessed.table["action"])
        counts = summary.counts_by_class(actions, ACTIONS)
    areas = None if study.scenario.region is None else _areas(canvas)
    return [tables.by_action(counts, areas)]


def _areas(canvas: Canvas) -> dict[str, dict[str, float]]:
    """Shares of the region by action, weighted by the cosine of latitude (cells of a figure are small)."""
    codes = canvas.values["action"]
    weight = np.broadcast_to(np.cos(np.deg2rad(canvas.places.latitude)), codes.shape)
    sums = {name: float(weight[codes == code].sum()) for code, name in ACTIONS}
    total = sum(sums.values())
    return {name: {"percent": 100.0 * one / total if total else float("nan")} for name, one in sums.items()}


def _figures(study: Study, canvas: Canvas) -> list[Block]:
    scenario, suffix = study.scenario, judged_suffix(study.scenario.judged_in)
    source = f"Source: {edition(scenario)}; {BASE_THANKS}."
    values = canvas.values
    marks = None
    if scenario.has_sites:
        table = study.assessed.table
        marks = canvas.marks(table["lon"], table["lat"], list(table["action"]))
    sky = "in rain at the stated availability" if suffix else "in clear sky"
    reserve = scenario.decision.reserve_db
    thick = (0.0, reserve)
    keys = f"Unit: dB; dashed lines are negative, the thick ones are 0 and the reserve of {reserve:g} dB."
    shared = np.minimum(values[f"margin_shared_before{suffix}"], values[f"margin_shared_after{suffix}"])
    action = REGISTRY["action"]
    shown = canvas.field(action, values["action"]) if scenario.region is not None else None
    parts = ["areas for the default terminal"] if shown else []
    what = ", ".join(parts + (["each site with its own equipment"] if marks else []))
    first = MapFigure(
        f"What is to be done: {what}. Unit: none (classes of Table 2). {source}",
        "Map of the actions by area and site",
        canvas.base,
        shown,
        marks,
    )
    skew = MapFigure(
        "Skew of the new satellite's V axis, clockwise positive looking towards the satellite; dashed lines "
        f"are negative. Unit: degrees. {source}",
        "Contour map of the skew after the changeover",
        canvas.base,
        canvas.field(
            REGISTRY["skew_after"], values["skew_after"], thick=(0.0,), limits=_span(values["skew_after"])
        ),
    )
    untouched = MapFigure(
        f"Margin after the changeover when nothing is touched, {sky}, default terminal. {keys} {source}",
        "Contour map of the untouched margin",
        canvas.base,
        canvas.field(
            REGISTRY[f"margin_untouched{suffix}"],
            values[f"margin_untouched{suffix}"],
            thick=thick,
            limits=MARGIN_LIMITS,
        ),
    )
    at_shared = MapFigure(
        f"Lesser margin of both moments with every feed at its shared setting, {sky}, default terminal. "
        f"{keys} {source}",
        "Contour map of the margin at the shared setting",
        canvas.base,
        canvas.field(lesser(suffix), shared, thick=thick, limits=MARGIN_LIMITS),
    )
    return [Figures((first, skew)), Figures((untouched, at_shared))]


def _span(values: Any) -> tuple[float, float]:
    """Limits of the colours, even about zero, from the values that there are."""
    most = float(np.nanmax(np.abs(values))) if np.isfinite(values).any() else 90.0
    reach = min(90.0, max(10.0, 10.0 * np.ceil(most / 10.0)))
    return -reach, reach


def _risk(study: Study, rows: list[dict[str, Any]] | None) -> list[Block]:
    if rows is None:
        return []
    suffix = judged_suffix(study.scenario.judged_in)
    return [
        Heading("How sure is the plan", new_page=True),
        tables.sensitivity_table(rows),
        Words(
            "An action follows from margins alone: the spread of settings changes no action, only the risk.",
            small=True,
        ),
        Heading("Sites that lose most"),
        tables.worst_table(study.assessed.table, suffix, WORST_SHOWN),
    ]


def _crews(planned: Planned | None) -> list[Block]:
    if planned is None or planned.plan.days.empty:
        return []
    plan = planned.plan
    crews = tuple(sorted(plan.days["crew"].astype(str).unique()))
    first, last = min(plan.days["day"]), max(plan.days["day"])
    days = tuple(first + timedelta(days=one) for one in range((last - first).days + 1))
    visits = np.zeros((len(crews), len(days)), dtype=np.int64)
    for row in plan.days.itertuples(index=False):
        visits[crews.index(str(row.crew)), (row.day - first).days] += int(str(row.visits))
    load = LoadFigure(
        "Load of the crews. Unit: visits a day. Source: the plan of visits of this study.",
        "Bars of the visits a day of each crew",
        days,
        crews,
        visits,
        planned.sheets.changeover.date(),
    )
    blocks: list[Block] = [Heading("Crews"), Figures((load,)), tables.crew_table(planned)]
    if len(plan.unreached):
        blocks.append(_unreached(plan.unreached))
    return blocks


def _unreached(table: Any) -> Grid:
    rows = tuple(
        (str(row.id), str(row.action), str(row.reason))
        for row in table.head(UNREACHED_SHOWN).itertuples(index=False)
    )
    more = (
        f" (the first {UNREACHED_SHOWN} of {len(table)}; the plan of visits lists all)"
        if len(table) > len(rows)
        else ""
    )
    return Grid(
        f"Sites that are not reached in time{more}.", ("site", "action", "reason"), rows, "lll", (18, 20, 62)
    )


def _assumptions(study: Study, planned: Planned | None) -> tuple[str, ...]:
    scenario = study.scenario
    notes: list[str] = []
    if planned is not None:
        notes += [f"Plan of visits: {note}" for note in planned.plan.notes]
    if scenario.weather is not None:
        from geoskew.weather import EDITIONS

        notes += [f"{line}." for line in EDITIONS]
    inputs = ", ".join(f"{name} ({digest[:12]})" for name, digest in sorted(scenario.input_files.items()))
    notes.append(f"Inputs (SHA-256): scenario {scenario.digest}; files: {inputs or 'none'}.")
    versions = ", ".join(f"{name} {version}" for name, version in summary.versions().items())
    notes.append(f"Made with {versions}.")
    return tables.assumptions_list(scenario, study.judged, tuple(notes))
