"""Reading a site list: from the scenario's ``[sites]`` to sites that can be used and rows that cannot."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import replace
from typing import TYPE_CHECKING

import numpy as np

from geoskew.errors import InputError, Problem
from geoskew.places import Places
from geoskew.region import Grid, grid_of
from geoskew.sites import headers
from geoskew.sites.check import Checked, check_rows
from geoskew.sites.delimited import read_delimited
from geoskew.sites.exchanged import exchanged_throughout
from geoskew.sites.headers import Headers
from geoskew.sites.listing import Rejected, SiteList
from geoskew.sites.meanings import PLACE_COLUMNS, REQUIRED, RESERVED
from geoskew.sites.table import RawTable
from geoskew.sites.vector import read_points, without_copies
from geoskew.sites.workbook import read_workbook

if TYPE_CHECKING:
    from geoskew.scenario import Scenario, SitesTable

TEXT_ENDINGS = (".csv", ".tsv", ".txt")
VECTOR_ENDINGS = (".gpkg", ".geojson", ".json", ".parquet", ".geoparquet")
ENDINGS = (*TEXT_ENDINGS, *VECTOR_ENDINGS, ".xlsx")
# Rejected rows that are told in the message when no row is left.
TOLD = 3


def read_sites(scenario: Scenario, *, compare: bool = True) -> SiteList:
    """Read the scenario's site list, from its file or its database.

    Parameters
    ----------
    scenario : Scenario
    compare : bool
        Look for latitudes and longitudes that stand in each other's place, by the region.

    Returns
    -------
    SiteList
        Usable sites and rejected rows; together they are all rows of the file.

    Raises
    ------
    MissingPartError
        If the scenario has neither ``[sites]`` nor a ``[database]`` with a query.
    InputError
        If encoding, separator or decimal sign cannot be told, a column is missing, no row can be
        used, or the region that positions are compared with is wrong.
    GeoskewError
        The database cannot be reached.
    """
    scenario.require("sites", for_what="an assessed site list")
    table, columns = _table(scenario)
    required: tuple[str, ...] = REQUIRED
    if table.positions is not None:
        if {"lat", "lon"} & set(columns):
            table = replace(table, positions=None)
        else:
            required, table = ("id",), without_copies(table)
    found = headers.match(
        list(table.frame.columns),
        columns,
        required=required,
        file=table.path,
        scenario_path=scenario.path,
        unused=("lat", "lon") if table.positions is not None else (),
    )
    grid = grid_of(scenario) if compare and scenario.region is not None else None
    crs = None if scenario.sites is None else scenario.sites.crs
    checked = check_rows(table, found, crs=crs, grid=grid)
    sites = _listing(table, found, checked)
    if not sites.ids:
        raise _nothing_left(table, sites.rejected)
    if grid is not None:
        sites.warnings.extend(_swapped(grid, sites))
    return sites


def _table(scenario: Scenario) -> tuple[RawTable, Mapping[str, str]]:
    """Rows of the file or of the database's query, and which of their columns are which of ours."""
    if scenario.sites is not None:
        return _open(scenario.sites), scenario.sites.columns
    from geoskew.sites.query import read_query

    assert scenario.database is not None  # for the type checker: require() has seen a source of sites
    name = scenario.database.id
    return read_query(scenario), {} if name == "id" else {"id": name}


def _open(settings: SitesTable) -> RawTable:
    path, ending = settings.file, settings.file.suffix.lower()
    if not path.is_file():
        raise InputError(Problem("no such file; mend [sites] file", file=path))
    required = [settings.columns.get(name, name) for name in REQUIRED]
    # What the mapping gives another column for is free to stand in the file as often as it likes.
    known = [*settings.columns.values(), *(name for name in RESERVED if name not in settings.columns)]
    if ending in TEXT_ENDINGS:
        return read_delimited(path, required=required, known=known)
    if ending in VECTOR_ENDINGS:
        return read_points(path, crs=settings.crs, layer=settings.layer)
    if ending == ".xlsx":
        return read_workbook(path, known=known, sheet=settings.layer)
    told = f"a site list ends in one of {', '.join(ENDINGS)}; save it as one of these"
    raise InputError(Problem(f"the ending {ending!r} is not read: {told}", file=path))


def _listing(table: RawTable, found: Headers, checked: Checked) -> SiteList:
    good = ~checked.faults.bad
    rows = np.flatnonzero(good)
    frame = table.frame.iloc[rows].reset_index(drop=True)
    frame.columns = list(found.names)
    numbers = {name: values[good] for name, values in checked.numbers.items()}
    rejected = table.rejected + [
        Rejected(int(table.lines[row]), checked.ids.iloc[row], "; ".join(reasons), table.row_text(row))
        for row, reasons in checked.faults.reasons.items()
    ]
    places = Places(
        checked.longitude[good],
        checked.latitude[good],
        numbers.get("height_m", np.full(rows.size, np.nan)),
        columns={name: numbers[name] for name in PLACE_COLUMNS if name in numbers},
    )
    own = [name for name in found.names if name not in REQUIRED]
    return SiteList(
        frame=frame,
        ids=tuple(checked.ids.iloc[rows].tolist()),
        places=places,
        rejected=sorted(rejected, key=lambda row: row.line),
        reserved=tuple(name for name in own if name in found.source),
        extra=tuple(name for name in own if name not in found.source),
        warnings=[*table.warnings, *found.warnings],
        lines=table.lines[rows],
        numbers=numbers,
        source=table.path,
    )


def _nothing_left(table: RawTable, rejected: list[Rejected]) -> InputError:
    if not rejected:
        return InputError(Problem("has a header but no row; give one row a site", file=table.path))
    problems = [Problem(f"no row can be used: all {len(rejected)} are rejected", file=table.path)]
    problems += [Problem(row.reason, file=table.path, line=row.line) for row in rejected[:TOLD]]
    return InputError(problems)


def _swapped(grid: Grid, sites: SiteList) -> list[str]:
    """Warn where latitude and longitude seem to be exchanged throughout."""
    count = exchanged_throughout(sites.places.longitude, sites.places.latitude, grid)
    if not count:
        return []
    return [
        f"{count} of {len(sites)} sites lie outside of the region, but inside it with lat and lon exchanged; "
        "check which column is which"
    ]
