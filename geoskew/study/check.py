"""Validate every input of a scenario and foretell what a run writes."""

from __future__ import annotations

from pathlib import Path

from geoskew.errors import InputError, Problem
from geoskew.fieldwork.visits import read_distances
from geoskew.study import database
from geoskew.study.core import Study
from geoskew.study.foretold import bytes_of_run, in_words
from geoskew.study.run import final_names


def check(path: Path) -> tuple[list[Problem], list[str]]:
    """All problems found, rejected rows included, and lines on what a run would write.

    Raises
    ------
    InputError
        The scenario file itself has problems; all of them are in it.
    """
    study = Study(path)
    problems = study.problems() + _distances(study)
    if not problems:
        problems, tables = _tables(study)
    if problems:
        return problems + _rejected(study), []
    lines = [study.scenario.title, study.judged, *_region(study), *_sites(study)]
    if study.scenario.region is not None or study.scenario.has_sites:
        names = final_names(study, Path("DIR"))
        lines.append(f"a run writes {len(names)} files, about {in_words(bytes_of_run(study))} in all:")
        lines += [f"  {name.as_posix()}" for name in names]
    return _rejected(study), lines + tables


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


def _tables(study: Study) -> tuple[list[Problem], list[str]]:
    """What keeps the database's tables from taking results, or a line on what goes there."""
    if not database.wants_tables(study):
        return [], []
    scenario = study.scenario
    try:
        target = database.target_of(study, sites=scenario.has_sites, region=scenario.region is not None)
        database.require_ready(target)
    except InputError as error:
        return list(error.problems), []
    names = " and ".join(table.fullname for table in target.tables)
    return [], [f"and, in the database, rows of run {target.stamp.run!r} in {names}"]


def _region(study: Study) -> list[str]:
    if study.scenario.region is None:
        return ["no [region]: no rasters, no contours"]
    grid = study.grid
    unit = "°" if grid.is_geographic else " m"
    return [f"region: {grid.columns} × {grid.rows} cells of {grid.step:g}{unit}, {grid.cells:,} in all"]


def _rejected(study: Study) -> list[Problem]:
    """Rows of the site list that cannot be used: each is a problem here."""
    if not study.scenario.has_sites:
        return []
    try:
        found = study.sites
    except InputError:
        return []  # the list as a whole is wrong, and told already
    return [Problem(one.reason, file=found.source, line=one.line) for one in found.rejected]


def _sites(study: Study) -> list[str]:
    scenario = study.scenario
    if not scenario.has_sites:
        return ["no [sites]: no site table, no cards, no visits"]
    found = study.sites
    return [f"sites: {len(found)} usable rows of {found.source.name}", *found.warnings]
