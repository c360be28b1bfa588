"""The whole job into one folder."""

from __future__ import annotations

import json
from collections.abc import Callable
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any, Final, Literal

import numpy as np

from geoskew.decision import ACTIONS
from geoskew.layers import REGISTRY
from geoskew.outputs import cards, contours, fieldmap, summary, tables, visits
from geoskew.outputs.report import write_report
from geoskew.outputs.tables import ColumnInfo, layer_column
from geoskew.study import database
from geoskew.study.core import Study
from geoskew.study.facts import CAUTIONS, card_facts
from geoskew.study.mapcontent import background, contour_names, map_content, overlay_names, provenance
from geoskew.study.outfiles import folder_of_results, require_free
from geoskew.study.plan import Planned, can_plan, judged_suffix, plan_of
from geoskew.study.rasters import contoured, write_study_rasters
from geoskew.study.reasons import measured_remarks, scenario_notes
from geoskew.study.report import report_of, sensitivity_rows

Report = Callable[[str, float, float], None]

WORST_SITES: Final = 20
VISIT_ENDINGS: Final = (".csv", ".gpkg", ".ics", ".xlsx")
REPORTS: Final = ("report.html", "report.pdf")


@dataclass(frozen=True)
class Settings:
    """How to write; the defaults of the command line."""

    overwrite: bool = False
    precision: Literal["standard", "full"] = "standard"
    compress: str = "DEFLATE"
    nodata: float | None = None
    workers: int | None = None
    tiles: str | None = None
    cluster: str | None = None


@dataclass
class Written:
    """What a run left in its folder, and what the reader should know."""

    files: list[Path] = field(default_factory=list)
    remarks: list[str] = field(default_factory=list)


def final_names(study: Study, folder: Path) -> list[Path]:
    """Every file that a run of this scenario writes."""
    scenario = study.scenario
    names = ["summary.json", "columns.csv", "fieldmap.html"]
    if scenario.region is not None:
        names += [f"layers/{name}.tif" for name in study.raster_names] + ["contours.gpkg"]
    if scenario.has_sites:
        names += ["sites.gpkg", "sites.csv", "rejected.csv"]
        if scenario.changeover is not None:
            names += ["cards.html", "cards.pdf"]
    if scenario.changeover is not None:
        names += REPORTS
    if can_plan(study):
        names += [f"visits{ending}" for ending in VISIT_ENDINGS]
    return [folder / name for name in names]


def run(study: Study, folder: Path, settings: Settings, report: Report) -> Written:
    """Everything that the scenario has inputs for.

    Raises
    ------
    InputError
        An input is wrong.
    ExistingFileError
        A file that is not ours stands under a final name.
    OutputError
        A result could not be written.
    """
    study.scenario.require_any("region", "sites", for_what="a run")
    # All inputs are read before anything is written.
    study.read()
    background(settings.tiles)
    require_free(study, final_names(study, folder), overwrite=settings.overwrite)
    target = _tables_for_results(study)
    written = Written(remarks=scenario_notes(study.scenario))
    with folder_of_results(folder):
        rasters = _rasters(study, folder, settings, written, report)
        planned = _sites_and_plan(study, folder, written, report)
        report("field map", 0, 1)
        overlays = overlay_names(study, None)
        content = map_content(study, rasters, overlays=overlays, planned=planned, tiles=settings.tiles)
        size = fieldmap.write_fieldmap(folder / "fieldmap.html", content)
        written.files.append(folder / "fieldmap.html")
        if remark := fieldmap.size_remark(size):
            written.remarks.append(remark)
        report("field map", 1, 1)
        rows = sensitivity_rows(study, report) if study.scenario.has_sites else None
        _report(study, folder, planned, rows, written, report)
        _lists(study, folder, rasters, planned, rows, written)
        if target is not None:
            lines = folder / "contours.gpkg" if target.region else None
            written.remarks += database.write_tables(target, contours=lines)
    if study.scenario.has_sites:
        written.remarks += study.sites.warnings
    return written


def _tables_for_results(study: Study) -> database.Target | None:
    """The database's tables where the scenario names some, found fit to take the results."""
    if not database.wants_tables(study):
        return None
    scenario = study.scenario
    target = database.target_of(study, sites=scenario.has_sites, region=scenario.region is not None)
    database.require_ready(target)
    return target


def _rasters(
    study: Study, folder: Path, settings: Settings, written: Written, report: Report
) -> dict[str, Path]:
    if study.scenario.region is None:
        return {}
    names = study.raster_names
    made = write_study_rasters(
        study,
        folder / "layers",
        names,
        nodata=settings.nodata,
        precision=settings.precision,
        compress=settings.compress,
        workers=settings.workers,
        cluster=settings.cluster,
        overwrite=settings.overwrite,
        report=report,
    )
    rasters = dict(zip(names, made, strict=True))
    wanted = contoured(None, study)
    report("contours", 0, 1)
    written.remarks += contours.folded(
        contours.write_contours(
            folder / "contours.gpkg",
            {name: rasters[name] for name in wanted},
            layers=[REGISTRY[name] for name in wanted],
        )
    )
    report("contours", 1, 1)
    written.files += [*made, folder / "contours.gpkg"]
    return rasters


def _sites_and_plan(study: Study, folder: Path, written: Written, report: Report) -> Planned | None:
    if not study.scenario.has_sites:
        return None
    assessed = study.assessed
    for name in ("sites.gpkg", "sites.csv"):
        tables.write_table(folder / name, assessed.table, columns=assessed.columns)
        written.files.append(folder / name)
    tables.write_rejected(folder / "rejected.csv", study.sites.rejected)
    written.files.append(folder / "rejected.csv")
    written.remarks += measured_remarks(assessed.table)
    planned = None
    if can_plan(study):
        planned = plan_of(study, on_progress=lambda done, total: report("plan of visits", done, total))
        for ending in VISIT_ENDINGS:
            visits.write_visits(folder / f"visits{ending}", planned.sheets)
            written.files.append(folder / f"visits{ending}")
        if planned.plan.interrupted:
            raise KeyboardInterrupt
        written.remarks += planned.plan.notes
    if study.scenario.changeover is not None:
        report("job cards", 0, 1)
        order = None if planned is None else planned.plan.visits
        written.remarks += cards.write_cards(
            folder / "cards.html", folder / "cards.pdf", assessed.table, card_facts(study), order=order
        )
        written.files += [folder / "cards.html", folder / "cards.pdf"]
        report("job cards", 1, 1)
    return planned


def _report(
    study: Study,
    folder: Path,
    planned: Planned | None,
    rows: list[dict[str, Any]] | None,
    written: Written,
    report: Report,
) -> None:
    """The planner's report, where the scenario says when the changeover is."""
    if study.scenario.changeover is None:
        return
    paths = [folder / name for name in REPORTS]
    written.remarks += write_report(report_of(study, planned=planned, rows=rows, progress=report), *paths)
    written.files += paths


def _lists(
    study: Study,
    folder: Path,
    rasters: dict[str, Path],
    planned: Planned | None,
    rows: list[dict[str, Any]] | None,
    written: Written,
) -> None:
    columns: list[ColumnInfo] = []
    if study.scenario.has_sites:
        columns += study.assessed.columns
    known = {column.name for column in columns}
    columns += [layer_column(REGISTRY[name]) for name in rasters if name not in known]
    tables.write_dictionary(folder / "columns.csv", columns)
    content = summary_of(study, rasters, planned)
    if rows is not None:
        content["sensitivity"] = rows
    summary.write_summary(folder / "summary.json", content)
    written.files += [folder / "columns.csv", folder / "summary.json"]


def summary_of(study: Study, rasters: dict[str, Path], planned: Planned | None) -> dict[str, Any]:
    """Counts by action, worst sites, area shares, versions, checksums of the inputs."""
    scenario = study.scenario
    content: dict[str, Any] = {
        "title": scenario.title,
        "changeover": scenario.changeover,
        "scenario": scenario.path.name,
        "scenario_sha256": scenario.digest,
        "input_files_sha256": scenario.input_files,
        "versions": summary.versions(),
        "judged_in": scenario.judged_in,
        "judged": study.judged,
        "reserve_db": scenario.decision.reserve_db,
        "allowed_loss_db": scenario.decision.allowed_loss_db,
        "provenance": provenance(study),
        "cautions": list(CAUTIONS),
    }
    if scenario.has_sites:
        content["sites"] = _site_summary(study)
    if "action" in rasters:
        content["area_by_action"] = summary.area_by_class(rasters["action"], ACTIONS)
    if planned is not None:
        plan = planned.plan
        content["visits"] = {
            "planned": len(plan.visits),
            "crew_days": len(plan.days),
            "km": round(plan.km, 1),
            "not_reached": len(plan.unreached),
            "missing_crew_days": plan.missing_crew_days,
            "interrupted": plan.interrupted,
        }
    return content


def _site_summary(study: Study) -> dict[str, Any]:
    table = study.assessed.table
    suffix = judged_suffix(study.scenario.judged_in)
    shared = table[f"margin_shared_before{suffix}"], table[f"margin_shared_after{suffix}"]
    return {
        "assessed": len(table),
        "rejected": len(study.sites.rejected),
        "by_action": summary.counts_by_class(table["action"], ACTIONS),
        "worst_untouched": summary.worst_sites(table, f"margin_untouched{suffix}", count=WORST_SITES),
        "worst_realigned": summary.worst_sites(table, f"margin_realigned{suffix}", count=WORST_SITES),
        "least_margin_shared_db": float(np.nanmin(np.stack(shared)))
        if np.isfinite(np.stack(shared)).any()
        else None,
    }


def map_layers(study: Study) -> tuple[str, ...]:
    """Layers that the map needs as rasters when nothing else asks for any."""
    return tuple(dict.fromkeys((*overlay_names(study, None), *contour_names(study))))


def summary_line(folder: Path) -> str:
    """One line on what a run found."""
    content = json.loads((folder / "summary.json").read_text(encoding="utf-8"))
    parts = []
    if "sites" in content:
        sites = content["sites"]
        counts = ", ".join(f"{count} {name}" for name, count in sites["by_action"].items() if count)
        parts.append(f"{sites['assessed']} sites assessed ({counts}), {sites['rejected']} rows rejected")
    if "visits" in content:
        plan = content["visits"]
        parts.append(
            f"{plan['planned']} visits on {plan['crew_days']} crew days, {plan['not_reached']} not reached"
        )
    parts.append(content["judged"])
    return "; ".join(parts)
