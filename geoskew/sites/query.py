"""Site lists of a database: the result of a query, in whatever CRS its points are."""

from __future__ import annotations

import json
from collections.abc import Sequence
from datetime import datetime
from decimal import Decimal
from pathlib import Path
from typing import TYPE_CHECKING, Any, Final

import numpy as np
from numpy.typing import NDArray

from geoskew.database import Address, address_of, transaction
from geoskew.errors import InputError, Problem
from geoskew.scenario.values import nearest
from geoskew.sites.meanings import REQUIRED
from geoskew.sites.table import Positions, RawTable
from geoskew.sites.vector import point_positions
from geoskew.sites.workbook import cell_text, joined

if TYPE_CHECKING:
    from pandas import DataFrame, Series

    from geoskew.scenario import Database, Scenario

SOURCE: Final = Path("[database] query")


def read_query(scenario: Scenario) -> RawTable:
    """Run the scenario's query in a transaction that can change nothing.

    Rows are counted from 1 in the order of the result. A column of geometries gives the positions, in
    its own CRS; without one, ``lat`` and ``lon`` in WGS 84 do.

    Raises
    ------
    InputError
        The address or the query is wrong, a column is missing or stands twice, there are several
        columns of geometries, or one without a CRS.
    GeoskewError
        The server does not answer or refuses the work.
    """
    address = address_of(scenario)
    settings = scenario.database
    assert settings is not None  # for the type checker: address_of() has seen it
    assert settings.query is not None  # the caller asks for sites of a query
    with transaction(address, read_only=True) as connection:
        # The query is the user's own text: neither % nor : in it means anything to a library.
        result = connection.execution_options(no_parameters=True).exec_driver_sql(settings.query)
        if not result.returns_rows:
            raise address.problem("the query returns no rows: give a SELECT", key="database.query")
        kinds = {one.name: one.type_code for one in result.cursor.description}
        names = [one.name for one in result.cursor.description]
        rows = result.fetchall()
        geometries = [name for name in names if kinds[name] in _geometry_types(connection)]
        _require_columns(names, geometries, settings, scenario.path)
        frame, shapes = _frame(names, rows, geometries)
        positions = None if shapes is None else _positions(shapes, connection, address)
    return RawTable(
        path=SOURCE,
        frame=frame,
        lines=np.arange(1, len(frame) + 1, dtype=np.int64),
        row_text=lambda row: joined([_text(value) for value in frame.iloc[row]]),
        word="row",
        comma_may_be_decimal=False,
        positions=positions,
    )


def _geometry_types(connection: Any) -> set[int]:
    """Numbers of PostGIS's types in this database; none without PostGIS."""
    found = connection.exec_driver_sql("SELECT oid FROM pg_type WHERE typname IN ('geometry', 'geography')")
    return {int(row[0]) for row in found}


def _require_columns(names: list[str], geometries: list[str], settings: Database, file: Path) -> None:
    """Refuse a result whose columns cannot be told apart, or that lacks one."""
    problems = [
        f"column {name!r} stands {names.count(name)} times in the result: name the others with AS"
        for name in dict.fromkeys(names)
        if names.count(name) > 1
    ]
    if len(geometries) > 1:
        problems.append(f"the result has several geometries, {', '.join(geometries)}: keep that of the sites")
    needed = [settings.id] if geometries else [settings.id, *REQUIRED[1:]]
    for name in needed:
        if name not in names:
            near = nearest(name, names, cutoff=0.5)
            has = f"; it has {', '.join(names)}: name the right one with AS {name}"
            hint = f"; is {near} meant? Then write {near} AS {name}" if near else has
            problems.append(f"the result has no column {name!r}{hint}")
    if problems:
        raise InputError(Problem(text, file=file, key="database.query") for text in problems)


def _frame(
    names: list[str], rows: Sequence[Any], geometries: list[str]
) -> tuple[DataFrame, NDArray[Any] | None]:
    """Columns of values, and the geometries as shapes with their CRS's number, if there are any."""
    import pandas
    import shapely

    cells: list[tuple[Any, ...]] = list(zip(*rows, strict=True)) if rows else [()] * len(names)
    frame = pandas.DataFrame(
        {name: _column(values) for name, values in zip(names, cells, strict=True) if name not in geometries}
    )
    if not geometries:
        return frame, None
    texts = np.array(cells[names.index(geometries[0])], dtype=object)
    return frame, shapely.from_wkb(texts)


def _positions(shapes: NDArray[Any], connection: Any, address: Address) -> Positions:
    """Longitude and latitude of points, each in the CRS that it says it is in."""
    import shapely

    numbers = np.where(shapely.is_missing(shapes), -1, shapely.get_srid(shapes))
    longitude, latitude = (np.full(len(shapes), np.nan) for _ in range(2))
    faults: dict[int, str] = {}
    for number in np.unique(numbers).tolist():
        rows = np.flatnonzero(numbers == number)
        crs = "EPSG:4326" if number == -1 else _crs(number, connection, address)
        part = point_positions(shapes[rows], crs)
        longitude[rows], latitude[rows] = part.longitude, part.latitude
        faults |= {int(rows[row]): reason for row, reason in part.faults.items()}
    return Positions(longitude, latitude, faults)


def _crs(number: int, connection: Any, address: Address) -> Any:
    """The CRS of an SRID: by its authority's code, else by the text that the database has of it."""
    from pyproj import CRS
    from pyproj.exceptions import CRSError
    from sqlalchemy import text

    if number == 0:
        raise address.problem(
            "the geometry has no CRS (SRID 0): write ST_SetSRID(geom, 4326) AS geom, with its own number",
            key="database.query",
        )
    found = connection.execute(
        text("SELECT auth_name, auth_srid, srtext FROM spatial_ref_sys WHERE srid = :number"),
        {"number": number},
    ).first()
    try:
        if found is not None and found.auth_name:
            return CRS.from_authority(found.auth_name, found.auth_srid)
        return CRS.from_wkt(found.srtext if found is not None else "")
    except CRSError:
        raise address.problem(
            f"the geometry's SRID {number} is not known: ST_Transform it to 4326", key="database.query"
        ) from None


def _column(values: tuple[Any, ...]) -> Series[Any]:
    """A column with the type that keeps its values: whole numbers stay whole beside empty cells."""
    import pandas

    kinds = {type(value) for value in values if value is not None}
    if kinds == {Decimal}:
        as_floats = [None if value is None else float(value) for value in values]
        if all(
            value is None or Decimal(repr(one)) == value for one, value in zip(as_floats, values, strict=True)
        ):
            return pandas.Series(as_floats, dtype="float64")
    if kinds == {bool}:
        return pandas.Series(values, dtype="boolean")
    if kinds == {int} and all(value is None or abs(value) < 2**63 for value in values):
        return pandas.Series(values, dtype="Int64")
    if kinds == {float}:
        return pandas.Series(values, dtype="float64")
    if kinds == {datetime} and len({value.tzinfo is None for value in values if value is not None}) == 1:
        return pandas.to_datetime(pandas.Series(values), utc=any(value.tzinfo for value in values if value))
    return pandas.Series([None if value is None else _text(value) for value in values], dtype="str")


def _text(value: Any) -> str:
    import pandas

    if isinstance(value, dict | list):
        return json.dumps(value, ensure_ascii=False, default=str)
    if isinstance(value, bytes | memoryview):
        return bytes(value).hex()
    return "" if value is None or (np.ndim(value) == 0 and pandas.isna(value)) else cell_text(value)
