"""What the tables of results look like, and the SQL that makes them."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from typing import Any, Final

from geoskew.database import TableName
from geoskew.database.names import LONGEST_NAME
from geoskew.errors import InputError

CONTOURS_ENDING: Final = "_contours"
SRID: Final = 4326
# Names that PostgreSQL keeps for itself in every table (chapter 5.5, system columns).
_SYSTEM_COLUMNS: Final = frozenset({"tableoid", "xmin", "cmin", "xmax", "cmax", "ctid"})
_STAMPS: Final = {
    "run": "study that the row belongs to: [database] run, else the name of the scenario file",
    "scenario_sha256": "SHA-256 of the scenario and of its input files",
    "software": "program and version that computed the row",
}


@dataclass(frozen=True)
class Stamp:
    """What every row says of its origin."""

    run: str
    scenario_sha256: str
    software: str


def stored_names(names: Iterable[str]) -> dict[str, str]:
    """Names of a table's columns in the database: those that would clash there begin with ``given_``.

    Raises
    ------
    InputError
        A name is longer than the server keeps.
    """
    taken = _SYSTEM_COLUMNS | _STAMPS.keys() | {"geom"}
    names = list(names)
    stored = {name: f"given_{name}" if name in taken else name for name in names}
    for name in stored.values():
        if len(name.encode()) > LONGEST_NAME:
            raise InputError(
                f"column {name!r} is too long for a database, which keeps {LONGEST_NAME} bytes; "
                "give it a shorter name in the site list"
            )
    return stored


def site_table(name: TableName, content: Any, about: Mapping[str, str]) -> Any:
    """The table of assessed sites: one row a run and site, with a point in WGS 84.

    Parameters
    ----------
    name : TableName
    content : pyarrow.Table
        Its columns' names and types are taken, under `stored_names`.
    about : mapping of str to str
        Meaning with the unit, by column.

    Returns
    -------
    sqlalchemy.Table
    """
    from sqlalchemy import Column

    stored = stored_names(content.column_names)
    columns = [
        Column(
            stored[field.name],
            _type(field.type),
            primary_key=field.name == "id",
            comment=about.get(field.name),
        )
        for field in content.schema
    ]
    return _table(name, columns, "POINT", "Assessed sites, one row a run and site. Coordinates: WGS 84.")


def contour_table(name: TableName) -> Any:
    """The table of contours: one row a run, layer and level, with lines in WGS 84.

    Returns
    -------
    sqlalchemy.Table
    """
    from sqlalchemy import Column, Double, Text

    columns = [
        Column("layer", Text, primary_key=True, comment="layer that was contoured"),
        Column("level", Double, primary_key=True, comment="value of the layer along the line, in its unit"),
        Column("unit", Text, comment="unit of the level"),
    ]
    return _table(
        name,
        columns,
        "MULTILINESTRING",
        "Lines of equal value, larger values on their left. Coordinates: WGS 84.",
    )


def _table(name: TableName, columns: list[Any], shape: str, comment: str) -> Any:
    from geoalchemy2 import Geometry
    from sqlalchemy import Column, MetaData, Table, Text

    run, *others = (
        Column(label, Text, primary_key=label == "run", nullable=label != "run", comment=meaning)
        for label, meaning in _STAMPS.items()
    )
    geometry = Column(
        "geom",
        Geometry(shape, srid=SRID, spatial_index=False),
        comment="place, WGS 84, x longitude before y latitude, degrees",
    )
    return Table(name.name, MetaData(), run, *columns, geometry, *others, schema=name.schema, comment=comment)


def schema_sql(table: Any) -> list[str]:
    """Statements that make a table, or add what an older one lacks; they may run any number of times."""
    from geoalchemy2 import Geometry  # noqa: F401  (its types know how they are written)
    from sqlalchemy.schema import (
        CreateColumn,
        CreateIndex,
        CreateTable,
        Index,
        SetColumnComment,
        SetTableComment,
    )

    speaks = _plain_dialect()

    def text(statement: Any) -> str:
        return str(statement.compile(dialect=speaks)).strip()

    added = ",\n\t".join(
        f"ADD COLUMN IF NOT EXISTS {text(CreateColumn(column))}"
        for column in table.columns
        if not column.primary_key
    )
    index = Index(f"{table.name[: LONGEST_NAME - 5]}_geom", table.c.geom, postgresql_using="gist")
    return [
        text(CreateTable(table, if_not_exists=True)),
        f"ALTER TABLE {quoted(table)}\n\t{added}",
        text(CreateIndex(index, if_not_exists=True)),
        text(SetTableComment(table)),
        *(text(SetColumnComment(column)) for column in table.columns),
    ]


def quoted(table: Any) -> str:
    """A table's whole name as SQL has it, quoted where it must be."""
    return str(_plain_dialect().identifier_preparer.format_table(table))


def _plain_dialect() -> Any:
    """PostgreSQL's SQL as people write it: in that for drivers every % of a name would stand twice."""
    from sqlalchemy.dialects.postgresql import dialect

    return dialect(paramstyle="named")  # type: ignore[no-untyped-call]  # the library's own is not typed


def _type(kind: Any) -> Any:
    """The database's type for a column of an Arrow table."""
    import pyarrow as pa
    from sqlalchemy import BigInteger, DateTime, Double, Text

    if pa.types.is_floating(kind):
        return Double()
    if pa.types.is_integer(kind):
        return BigInteger()
    if pa.types.is_timestamp(kind):
        return DateTime(timezone=kind.tz is not None)
    return Text()
