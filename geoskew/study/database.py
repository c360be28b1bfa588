"""Results of a study in the tables that the scenario's ``[database]`` names."""

from __future__ import annotations

from dataclasses import dataclass, replace
from functools import cached_property
from pathlib import Path
from typing import TYPE_CHECKING, Any, Final

import numpy as np

from geoskew import __version__
from geoskew.database import Address, TableName, address_of, table_name, transaction
from geoskew.errors import InputError, MissingPartError, Problem
from geoskew.outputs import database
from geoskew.outputs.tables.columns import settled
from geoskew.study.table import Assessed, assess, chunks

if TYPE_CHECKING:
    from geoskew.study.core import Study

TABLES_COMMAND: Final = "geoskew database SCENARIO --create"


def wants_tables(study: Study) -> bool:
    """Whether the scenario names a table for results."""
    settings = study.scenario.database
    return settings is not None and settings.table is not None


@dataclass(frozen=True)
class Target:
    """Where the results of a study go: those of its sites, of its region, or both."""

    study: Study
    address: Address
    name: TableName
    stamp: database.Stamp
    sites: bool
    region: bool

    @cached_property
    def site_table(self) -> Any:
        """The table of sites as this study needs it; assesses one site to know the columns' types."""
        sites = self.study.sites
        first = replace(
            sites,
            frame=sites.frame.head(1),
            ids=sites.ids[:1],
            places=next(chunks(sites.places, 1)),
            lines=sites.lines[:1],
            numbers={name: values[:1] for name, values in sites.numbers.items()},
        )
        sample = assess(self.study.scenario, first, self.study.inputs)
        return database.site_table(self.name, _content(sample), _about(sample))

    @cached_property
    def contour_table(self) -> Any:
        """The table of contours."""
        return database.contour_table(self.name.with_ending(database.CONTOURS_ENDING))

    @property
    def tables(self) -> list[Any]:
        """The tables that this study writes."""
        return [*([self.site_table] if self.sites else ()), *([self.contour_table] if self.region else ())]


def target_of(study: Study, *, sites: bool, region: bool) -> Target:
    """Where results go.

    Raises
    ------
    MissingPartError
        The scenario names no table.
    InputError
        The table's name, or the address, is wrong.
    GeoskewError
        The extra ``[postgis]`` is not installed.
    """
    scenario = study.scenario
    scenario.require("database", for_what="results in a database")
    settings = scenario.database
    if settings is None or settings.table is None:
        raise MissingPartError(
            Problem(
                'is missing, and results in a database need it: add table = "assessed_sites"',
                file=scenario.path,
                key="database.table",
            )
        )
    stamp = database.Stamp(settings.run or scenario.path.stem, scenario.digest, f"geoskew {__version__}")
    name = table_name(settings.table, ending=database.CONTOURS_ENDING)
    return Target(study, address_of(scenario), name, stamp, sites, region)


def require_ready(target: Target) -> None:
    """Check, before the work, that the tables are there, fit, and may be written.

    Raises
    ------
    InputError
        Every reason why they cannot take the results.
    GeoskewError
        The database cannot be reached.
    """
    tables = target.tables
    with transaction(target.address, read_only=True) as connection:
        told = [
            fault for table in tables for fault in database.faults(connection, table, remedy=TABLES_COMMAND)
        ]
    if told:
        file = target.study.scenario.path
        raise InputError(Problem(fault, file=file, key="database.table") for fault in told)


def schema_text(target: Target) -> str:
    """The SQL that makes the tables of a study, or adds what older ones lack."""
    return "".join(f"{statement};\n\n" for table in target.tables for statement in database.schema_sql(table))


def create_tables(target: Target) -> None:
    """Make the tables of a study, or add what older ones lack, in one transaction.

    Raises
    ------
    OutputError
        The user may not make tables.
    GeoskewError
        The database cannot be reached, or PostGIS is missing in it.
    """
    tables = target.tables
    with transaction(target.address) as connection:
        database.create(connection, tables)


def write_tables(target: Target, *, contours: Path | None = None) -> list[str]:
    """Write the assessed sites, and the contours of a file of ours, in one transaction.

    Returns
    -------
    list of str
        One line a table on what was written.

    Raises
    ------
    InputError
        A table is missing, does not fit, or may not be written; as for the address.
    GeoskewError
        The database cannot be reached, or the work was refused; all tables are as they were.
    """
    require_ready(target)
    lines = None if contours is None else database.contour_lines(contours)
    rows = _rows(target.study.assessed) if target.sites else None
    told = []
    with transaction(target.address) as connection:
        if rows is not None:
            counts = database.replace_rows(connection, target.site_table, *rows, target.stamp)
            told.append(_told(target.site_table, counts, "sites", target.stamp.run))
        if lines is not None:
            counts = database.replace_rows(
                connection,
                target.contour_table,
                lines.table,
                lines.shapes,
                target.stamp,
                within=("layer", lines.layers),
            )
            told.append(_told(target.contour_table, counts, "contours", target.stamp.run))
    return told


def _told(table: Any, counts: database.Counts, what: str, run: str) -> str:
    gone = f", {counts.removed} of an earlier write removed" if counts.removed else ""
    return f"table {table.fullname}: {counts.written} {what} of run {run!r} written{gone}"


def _rows(assessed: Assessed) -> tuple[Any, Any]:
    import shapely

    longitude, latitude = (assessed.table[name].to_numpy(dtype=np.float64) for name in ("lon", "lat"))
    return _content(assessed), shapely.points(longitude, latitude)


def _content(assessed: Assessed) -> Any:
    return settled(assessed.table, assessed.columns)


def _about(assessed: Assessed) -> dict[str, str]:
    return {column.name: column.description for column in assessed.columns}
