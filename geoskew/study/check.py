"""Validate every input of a scenario and foretell what a run writes."""

from __future__ import annotations

from pathlib import Path
from typing import Final

from geoskew.errors import InputError, Problem
from geoskew.fieldwork.visits import read_distances
from geoskew.layers import REGISTRY
from geoskew.study.core import Study
from geoskew.study.run import final_names

# Bytes a cell that a stored layer takes after compression, as the bundled scenarios have them.
BYTES_A_CELL: Final = 0.7
BYTES_A_CLASS_CELL: Final = 0.03
# Bytes a site of all tables, cards and map together.
BYTES_A_SITE: Final = 12_000


def check(path: Path) -> tuple[list[Problem], list[str]]:
    """All problems found, rejected rows included, and lines on what a run would write.

    Raises
    ------
    InputError
        The scenario file itself has problems; all of them are in it.
    """
    study = Study(path)
    problems = study.problems() + _distances(study)
    if problems:
        return problems + _rejected(study), []
    lines = [study.scenario.title, study.judged, *_region(study), *_sites(study)]
    if study.scenario.region is not None or study.scenario.sites is not None:
        names = final_names(study, Path("DIR"))
        lines.append(f"a run writes {len(names)} files, about {_size(foretold_bytes(study))} in all:")
        lines += [f"  {name.as_posix()}" for name in names]
    return _rejected(study), lines


def _distances(study: Study) -> list[Problem]:
    """Read the file of distances, if any, for its own sake: which places it names is no fault."""
    visits = study.scenario.visits
    if visits is None or visits.distances is None:
        return []
    try:
        read_distances(visits.distances, {})
    except InputError as error:
        return list(error.problems)
    return []


def _region(study: Study) -> list[str]:
    if study.scenario.region is None:
        return ["no [region]: no rasters, no contours"]
    grid = study.grid
    unit = "°" if grid.is_geographic else " m"
    return [f"region: {grid.columns} × {grid.rows} cells of {grid.step:g}{unit}, {grid.cells:,} in all"]


def _rejected(study: Study) -> list[Problem]:
    """Rows of the site list that cannot be used: each is a problem here."""
    sites = study.scenario.sites
    try:
        rejected = [] if sites is None else study.sites.rejected
    except InputError:
        return []  # the list as a whole is wrong, and told already
    return [
        Problem(one.reason, file=None if sites is None else sites.file, line=one.line) for one in rejected
    ]


def _sites(study: Study) -> list[str]:
    scenario = study.scenario
    if scenario.sites is None:
        return ["no [sites]: no site table, no cards, no visits"]
    found = study.sites
    return [f"sites: {len(found)} usable rows of {scenario.sites.file.name}", *found.warnings]


def foretold_bytes(study: Study) -> float:
    """About how many bytes a run writes."""
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
