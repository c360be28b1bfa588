"""The whole of ``geoskew reports``: history first, then every output out of history and scenario alone."""

from __future__ import annotations

import json
from collections import Counter
from collections.abc import Callable, Sequence
from dataclasses import dataclass, field
from datetime import timedelta
from pathlib import Path
from typing import TYPE_CHECKING, Any, Final

import numpy as np

from geoskew.fieldwork.reports import (
    STATES,
    Accuracy,
    Gathered,
    Gathering,
    History,
    Read,
    Reconciled,
    read_reports,
    reconcile,
    slots_of,
)
from geoskew.outputs import cards, fieldmap, files, tables, visits
from geoskew.sites import Rejected
from geoskew.study.facts import CAUTIONS, card_facts
from geoskew.study.mapcontent import map_content, provenance
from geoskew.study.reports import left as remaining
from geoskew.study.reports.left import Left, left_of
from geoskew.study.reports.meter import SiteMeter, some
from geoskew.study.reports.orders import facts_of, orders_of
from geoskew.study.reports.updates import updated

if TYPE_CHECKING:
    from geoskew.study.core import Study

Report = Callable[[str, float, float], None]

HISTORY: Final = "history.sqlite"
VISIT_ENDINGS: Final = (".csv", ".gpkg", ".ics", ".xlsx")


@dataclass
class Outcome:
    """What came of it: files, remarks, rows that were new and that could not be used, sites by state."""

    files: list[Path] = field(default_factory=list)
    remarks: list[str] = field(default_factory=list)
    added: int = 0
    kept: int = 0
    rejected: int = 0
    states: dict[str, int] = field(default_factory=dict)
    left: int = 0


def report_on(
    study: Study, given: Sequence[Path], folder: Path, *, overwrite: bool, report: Report
) -> Outcome:
    """Take reports into the history of a folder and write what follows from all of them.

    Raises
    ------
    MissingPartError
        The scenario lacks sites or the time of the changeover.
    InputError
        A file cannot be read, or what stands under the history's name is no history.
    ExistingFileError
        A file that is not ours stands under a final name.
    OutputError
        History or result could not be written.
    """
    scenario = study.scenario
    scenario.require("changeover", "sites", for_what="reports from the field")
    assert scenario.changeover is not None  # for the type checker: require() has seen it
    carriers = [one.name for one in scenario.carriers_before]
    read = [
        read_reports(path, sites=study.sites.ids, carriers=carriers, changeover=scenario.changeover)
        for path in given
    ]
    history = History(folder / HISTORY)
    history.check()
    files.require_free(_names(study, folder), overwrite=overwrite)
    files.make_folder(folder)
    outcome = Outcome()
    for one in read:
        outcome.added += history.add(one.reports)
        outcome.remarks += one.warnings
    found, gathered = _reconciled(study, history, report)
    outcome.kept = len(history.reports())
    outcome.remarks += _remarks(gathered, found)
    rejected = _rejected(read, gathered)
    outcome.rejected = len(rejected)
    outcome.states = dict(Counter(found.state.tolist()))
    after = updated(study, found)
    left = left_of(after, found, on_progress=lambda done, total: report("plan of visits", done, total))
    outcome.left = len(left.todo)
    outcome.remarks += left.remarks
    _write(after, left, rejected, folder, outcome, report)
    _write_facts(study, found, outcome, folder)
    return outcome


def _names(study: Study, folder: Path) -> list[Path]:
    names = ["sites.csv", "sites.gpkg", "rejected.csv", "rejected_reports.csv", "to_do.csv", "columns.csv"]
    names += ["cards.html", "cards.pdf", "fieldmap.html", "reports.json"]
    if study.scenario.crews:
        names += [f"visits{ending}" for ending in VISIT_ENDINGS]
    return [folder / name for name in names]


def _reconciled(study: Study, history: History, report: Report) -> tuple[Reconciled, Gathered]:
    scenario = study.scenario
    assert scenario.changeover is not None  # for the type checker
    carriers = [one.name for one in scenario.carriers_before]
    slots = slots_of(len(carriers))
    orders = orders_of(study)
    overlap = timedelta(hours=scenario.overlap_hours)
    gathering = Gathering(facts_of(study), slots, carriers, scenario.changeover, overlap)
    gathered = gathering.gather(history.reports())
    accuracy = Accuracy(
        spread_before=scenario.outgoing.eirp_spread_db, spread_after=scenario.incoming.eirp_spread_db
    )
    report("reconciling", 0, 1)
    found = reconcile(
        orders,
        gathered.rounds,
        lambda numbers: SiteMeter(study, some(study.sites.places, numbers), orders.at_changeover[numbers]),
        slots,
        accuracy,
    )
    report("reconciling", 1, 1)
    return found, gathered


def _rejected(read: Sequence[Read], gathered: Gathered) -> list[Rejected]:
    """Rows of these files that could not be read, and rows of the history that contradict each other.

    The latter have the line of the file at hand, or line 0 where they came with an earlier one.
    """
    lines = {one.key: line for file in read for one, line in zip(file.reports, file.lines, strict=True)}
    rows = [one for file in read for one in file.rejected]
    rows += [
        Rejected(lines.get(one.key, 0), one.site, reason, one.text())
        for one, reason in gathered.contradictory
    ]
    return sorted(rows, key=lambda one: (one.line, one.id, one.row))


def _remarks(gathered: Gathered, found: Reconciled) -> list[str]:
    remarks = []
    if gathered.contradictory:
        count = len(gathered.contradictory)
        remarks.append(f"{count} reports contradict others and are not used; see rejected_reports.csv")
    if gathered.scales_unknown:
        remarks.append(
            f"{gathered.scales_unknown} readings of a scale are not used: "
            "the site list has no scale_zero_deg there"
        )
    if gathered.moments_unknown:
        remarks.append(
            f"{gathered.moments_unknown} signals are not used: on the day of the changeover the date does "
            "not tell which satellite was read; give times, or a column moment with 'before' or 'after'"
        )
    for number, (alone, measured) in enumerate(found.thresholds, start=1):
        remarks.append(
            f"visit {number}: accused above a chance of a fault of {100 * alone:.0f} % by signals alone, "
            f"{100 * measured:.0f} % with a measured setting, so that at most 2 % of good sites are"
        )
    remarks += [
        f"visit {number}: the measured settings scatter by {spread:.1f}°, which is taken where the stated "
        "spread of a site is wider"
        for number, spread in enumerate(found.spreads, start=1)
        if np.isfinite(spread)
    ]
    return remarks


def _write(
    after: Study, left: Left, rejected: list[Rejected], folder: Path, outcome: Outcome, report: Report
) -> None:
    assessed = after.assessed
    for name in ("sites.gpkg", "sites.csv"):
        tables.write_table(folder / name, assessed.table, columns=assessed.columns)
    tables.write_rejected(folder / "rejected.csv", after.sites.rejected)
    tables.write_rejected(folder / "rejected_reports.csv", rejected)
    tables.write_table(folder / "to_do.csv", left.todo, columns=remaining.COLUMNS)
    known = {one.name for one in assessed.columns}
    tables.write_dictionary(
        folder / "columns.csv",
        [*assessed.columns, *(one for one in remaining.COLUMNS if one.name not in known)],
    )
    if left.sheets is not None and left.plan is not None:
        for ending in VISIT_ENDINGS:
            visits.write_visits(folder / f"visits{ending}", left.sheets)
        outcome.remarks += left.plan.notes
    report("job cards", 0, 1)
    order = None if left.plan is None else left.plan.visits
    outcome.remarks += cards.write_cards(
        folder / "cards.html", folder / "cards.pdf", left.for_cards, card_facts(after), order=order
    )
    report("job cards", 1, 1)
    fieldmap.write_fieldmap(folder / "fieldmap.html", map_content(after, {}, overlays=(), planned=None))
    outcome.files += [path for path in _names(after, folder) if path.exists()]


def _write_facts(study: Study, found: Reconciled, outcome: Outcome, folder: Path) -> None:
    """Counts and assumptions; nothing in it tells when or in how many files the reports came."""
    facts: dict[str, Any] = {
        "title": study.scenario.title,
        "scenario_sha256": study.scenario.digest,
        "reports_kept": outcome.kept,
        "sites": len(found.state),
        "by_state": dict(sorted(outcome.states.items())),
        "accused": int(found.accused.sum()),
        "left_to_do": outcome.left,
        "thresholds": [
            {"signals_alone": round(alone, 4), "setting_measured": round(measured, 4)}
            for alone, measured in found.thresholds
        ],
        "observed_spread_deg": [None if np.isnan(one) else round(one, 3) for one in found.spreads],
        "chances_beforehand": {
            one.name: {"after_a_visit": one.after_visit, "without": one.without_visit} for one in STATES
        },
        "provenance": provenance(study),
        "cautions": list(CAUTIONS),
    }
    with files.writing(folder / "reports.json") as part:
        part.write_text(json.dumps(facts, indent=1, ensure_ascii=False) + "\n", encoding="utf-8")
