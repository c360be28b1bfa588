"""Validate every input of a scenario and foretell what a run writes."""

from __future__ import annotations

from pathlib import Path
from typing import Final

from geoskew.errors import InputError, Problem
from geoskew.layers import REGISTRY
from geoskew.study.core import Study
from geoskew.study.run import final_names

# Bytes a cell that a stored layer takes after compression, as the bundled scenarios have them.
BYTES_A_CELL: Final = 0.7
BYTES_A_CLASS_CELL: Final = 0.03
# Bytes a site of all tables, cards and map together.
BYTES_A_SITE: Final = 12_000


def check(path: Path) -> tuple[list[Problem], list[str]]:
    """All problems found, and lines on what a run would write.

    Raises
    ------
    InputError
        The scenario file itself has problems; all of them are in it.
    """
    study = Study(path, needs_sites=True)
    problems: list[Problem] = []
    lines = [f"{study.scenario.title}", study.judged]
    for read in (_footprints, _region, _sites):
        try:
            lines += read(study, problems)
        except InputError as error:
            problems += error.problems
    if not problems:
        names = final_names(study, Path("DIR"))
        lines.append(f"a run writes {len(names)} files, about {_size(_bytes(study))} in all:")
        lines += [f"  {name.as_posix()}" for name in names]
    return problems, lines


def _footprints(study: Study, problems: list[Problem]) -> list[str]:
    _ = study.inputs
    return []


def _region(study: Study, problems: list[Problem]) -> list[str]:
    if study.scenario.region is None:
        return ["no [region]: no rasters, no contours"]
    grid = study.grid
    unit = "°" if grid.is_geographic else " m"
    return [f"region: {grid.columns} × {grid.rows} cells of {grid.step:g}{unit}, {grid.cells:,} in all"]


def _sites(study: Study, problems: list[Problem]) -> list[str]:
    scenario = study.scenario
    if scenario.sites is None:
        return ["no [sites]: no site table, no cards, no visits"]
    found = study.sites
    problems += [Problem(one.reason, file=scenario.sites.file, line=one.line) for one in found.rejected]
    return [f"sites: {len(found)} usable rows of {scenario.sites.file.name}", *found.warnings]


def _bytes(study: Study) -> float:
    total = 0.0
    if study.scenario.region is not None:
        for name in study.raster_names:
            total += study.grid.cells * (BYTES_A_CLASS_CELL if REGISTRY[name].is_class else BYTES_A_CELL)
    if study.scenario.sites is not None:
        total += len(study.sites) * BYTES_A_SITE
    return total + 1e6


def _size(count: float) -> str:
    for unit in ("bytes", "kB", "MB", "GB"):
        if count < 1000.0:
            return f"{count:.3g} {unit}"
        count /= 1000.0
    return f"{count:.3g} TB"
