"""The report of two plans compared, and the files beside it."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Any, Final

import numpy as np

from geoskew.decision import ACTIONS
from geoskew.outputs import raster, tables
from geoskew.outputs.report import Block, Bullets, Figures, Grid, Heading, MapFigure, Report
from geoskew.study.comparison import (
    MAPPED,
    MARGINS,
    Other,
    change_counts,
    compared_table,
    gain_blocks,
    gain_layers,
    table_columns,
)
from geoskew.study.core import Study
from geoskew.study.facts import CAUTIONS, edition
from geoskew.study.pictures import Canvas
from geoskew.study.plan import judged_suffix
from geoskew.study.rasters import raster_tags
from geoskew.study.report import BASE_THANKS
from geoskew.study.reporttables import number

if TYPE_CHECKING:
    import pandas as pd

CHANGED_SHOWN: Final = 18


def comparison_names(study: Study, out: Path) -> list[Path]:
    """The files beside a comparison's report: table, the same as layer of points, differences as rasters."""
    names = []
    if study.scenario.has_sites:
        names += [out.with_name(f"{out.stem}-sites.csv"), out.with_name(f"{out.stem}-sites.gpkg")]
    if study.scenario.region is not None:
        names += [out.with_name(f"{layer.name}.tif") for layer in gain_layers()]
    return names


def write_beside(study: Study, other: Other, out: Path) -> list[Path]:
    """Write what stands beside the report; returns the files."""
    table = compared_table(study, other)
    written: list[Path] = []
    if table is not None:
        for ending in (".csv", ".gpkg"):
            path = out.with_name(f"{out.stem}-sites{ending}")
            tables.write_table(path, table, columns=table_columns(table))
            written.append(path)
    if study.scenario.region is not None:
        tags = {**raster_tags(study), "COMPARED_WITH": other.name}
        written += raster.write_rasters(
            gain_blocks(study, other), grid=study.grid, layers=gain_layers(), folder=out.parent, tags=tags
        )
    return written


def comparison_of(study: Study, other: Other) -> Report:
    """Compose the report of what differs from another plan.

    Raises
    ------
    MissingPartError
        The scenario lacks the changeover, or both region and sites.
    """
    scenario = study.scenario
    scenario.require("changeover", for_what="a report")
    scenario.require_any("region", "sites", for_what="a report")
    assert scenario.changeover is not None  # for the type checker: require() has seen it
    table = compared_table(study, other)
    blocks: list[Block] = [Heading("What is compared"), Bullets(_compared(study, other))]
    if table is not None:
        blocks += [
            Heading("Sites that change action"),
            Bullets(_in_short(table)),
            _matrix(table),
            _margins(table),
        ]
    blocks += _figures(study, other, table)
    if table is not None and table["changed"].any():
        blocks += [Heading("Sites by the margin gained or lost"), _changed(table)]
    blocks += [Heading("Cautions"), Bullets(CAUTIONS, small=True)]
    return Report(
        title=f"Plans compared: {scenario.title}",
        subtitle=f"against {other.name}; differences are this plan less the other",
        foot=f"{scenario.title} · {edition(scenario)}",
        dated=scenario.changeover,
        blocks=tuple(blocks),
    )


def _compared(study: Study, other: Other) -> tuple[str, ...]:
    source = "the folder of a run" if other.folder is None else f"results of a run in {other.folder.name}"
    if other.study is not None:
        source = f"scenario {other.study.scenario.path.name}, {edition(other.study.scenario)}"
    return (
        f"This plan: {study.scenario.title} (scenario {study.scenario.path.name}, "
        f"{edition(study.scenario)}); "
        f"{study.judged}.",
        f"The other plan: {other.name} ({source}); {other.judged}.",
        "Each plan's margins are those that decide in it.",
    )


def _in_short(table: pd.DataFrame) -> tuple[str, ...]:
    both = table[table["only_in"] == ""]
    gain = both["gain_margin_untouched"].astype(float)
    lines = [
        f"{int(both['changed'].sum())} of {len(both)} sites that both plans have change their action.",
        f"Left untouched, {int((gain > 0.05).sum())} sites gain margin after the changeover and "
        f"{int((gain < -0.05).sum())} lose some (more than 0.05 dB).",
    ]
    for word, name in (("this", "this plan"), ("other", "the other plan")):
        if count := int((table["only_in"] == word).sum()):
            lines.append(f"{count} sites are in {name} alone.")
    return tuple(lines)


def _matrix(table: pd.DataFrame) -> Grid:
    names = [name for _, name in ACTIONS]
    return Grid(
        "Sites from the action of the other plan (rows) to that of this plan (columns).",
        ("other plan", *names, "all"),
        tuple(change_counts(table)),
        "l" + "r" * (len(names) + 1),
        (20, 10, 10, 20, 11, 11, 11, 7),
    )


def _margins(table: pd.DataFrame) -> Grid:
    rows = []
    for name in MARGINS:
        gain = table[f"gain_{name}"].astype(float).dropna()
        ends = (gain.min(), gain.median(), gain.max()) if len(gain) else (np.nan,) * 3
        counts = (int((gain > 0.05).sum()), int((gain < -0.05).sum()))
        rows.append((name, *(number(float(one), 2) for one in ends), *(str(one) for one in counts)))
    return Grid(
        "Margins of this plan less those of the other, over sites that both have. Unit: dB; counts: none.",
        ("margin", "least", "median", "most", "sites that gain", "sites that lose"),
        tuple(rows),
        "lrrrrr",
        (30, 12, 12, 12, 17, 17),
    )


def _figures(study: Study, other: Other, table: pd.DataFrame | None) -> list[Block]:
    suffix = judged_suffix(study.scenario.judged_in)
    canvas = Canvas(study, tuple(f"{name}{suffix}" for name in MAPPED))
    source = f"Source: both plans, this one {edition(study.scenario)}; {BASE_THANKS}."
    marks = None
    if table is not None:
        changed = table[(table["changed"] == 1)]
        marks = canvas.marks(changed["lon"], changed["lat"], list(changed["action"]))
    shown: list[Any] = [None, None]
    if study.scenario.region is not None or other.study is not None:
        differences = [
            canvas.values[f"{name}{suffix}"] - other.values(name, canvas.places) for name in MAPPED
        ]
        shown = [
            canvas.field(layer, values, thick=(0.0,), limits=_limits(values))
            for layer, values in zip(gain_layers(), differences, strict=True)
        ]
    maps = (
        MapFigure(
            "Margin gained (solid) or lost (dashed) after the changeover when nothing is touched, default "
            f"terminal, and the sites that change, by their action in this plan. Unit: dB; thick: 0. "
            f"{source}",
            "Map of the difference of the untouched margins",
            canvas.base,
            shown[0],
            marks,
        ),
        MapFigure(
            "Margin gained (solid) or lost (dashed) with dish and feed set for the new satellite, default "
            f"terminal. Unit: dB; thick: 0. {source}",
            "Map of the difference of the realigned margins",
            canvas.base,
            shown[1],
        ),
    )
    return [Heading("Where"), Figures(maps)]


def _limits(values: Any) -> tuple[float, float]:
    """Limits of the colours, even about zero, from the differences that there are."""
    most = float(np.nanmax(np.abs(values))) if np.isfinite(values).any() else 1.0
    reach = min(12.0, next(step for step in (0.5, 1.0, 2.0, 5.0, 10.0, np.inf) if most <= step))
    return -reach, reach


def _changed(table: pd.DataFrame) -> Grid:
    changed = table[table["changed"] == 1].copy()
    gain = changed["gain_margin_untouched"].astype(float)
    changed = changed.loc[gain.abs().sort_values(ascending=False, kind="stable").index]
    rows = tuple(
        (
            str(row.id),
            str(row.action_other),
            str(row.action),
            *(
                number(float(getattr(row, f"gain_{name}")), 2)
                for name in ("margin_untouched", "margin_realigned")
            ),
        )
        for row in changed.head(CHANGED_SHOWN).itertuples(index=False)
    )
    more = f" (the first {len(rows)} of {len(changed)}; the table beside this report has all)"
    return Grid(
        f"Sites that change action{more if len(changed) > len(rows) else ''}, largest difference first.",
        ("site", "other plan", "this plan", "untouched, dB", "realigned, dB"),
        rows,
        "lllrr",
        (24, 22, 22, 16, 16),
    )
