"""Whether tables in the database are there, are ours, and may be written; and making them."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any, Final

from geoskew.outputs.database.tables import SRID, quoted, schema_sql

_RIGHTS: Final = ("SELECT", "INSERT", "UPDATE", "DELETE")


def create(connection: Any, tables: Sequence[Any]) -> None:
    """Make tables, or add the columns that older ones lack; rows stay."""
    for table in tables:
        for statement in schema_sql(table):
            connection.execution_options(no_parameters=True).exec_driver_sql(statement)


def faults(connection: Any, table: Any, *, remedy: str) -> list[str]:
    """What keeps a table from taking results, each in one line; nothing where it may.

    Parameters
    ----------
    connection : sqlalchemy.Connection
    table : sqlalchemy.Table
        As it should be.
    remedy : str
        The command that makes or mends tables.
    """
    import geoalchemy2  # noqa: F401  (lets the library below recognise geometries)
    from sqlalchemy import inspect

    found = inspect(connection)
    shown = table.fullname
    if not found.has_table(table.name, schema=table.schema):
        return [f"there is no table {shown}; make it with: {remedy}"]
    columns = {one["name"]: one["type"] for one in found.get_columns(table.name, schema=table.schema)}
    told = []
    keys = [column.name for column in table.primary_key]
    own_keys = found.get_pk_constraint(table.name, schema=table.schema)["constrained_columns"]
    if set(own_keys) != set(keys):
        has = f"({', '.join(own_keys)})" if own_keys else "none"
        told.append(
            f"table {shown} has another primary key than ({', '.join(keys)}): {has}; give another name"
        )
    missing = [column.name for column in table.columns if column.name not in columns]
    if missing:
        told.append(f"table {shown} lacks {', '.join(missing[:8])}{_more(missing, 8)}; add with: {remedy}")
    told += _geometry_faults(shown, table.c.geom.type, columns.get("geom"))
    return told or _right_faults(connection, table)


def _geometry_faults(shown: str, wanted: Any, found: Any) -> list[str]:
    if found is None:
        return []
    srid, shape = getattr(found, "srid", None), getattr(found, "geometry_type", None)
    if srid != SRID:
        return [f"column geom of table {shown} is in SRID {srid}, results are in {SRID}; give another table"]
    if shape not in (wanted.geometry_type, "GEOMETRY"):
        return [f"column geom of table {shown} takes {shape}, not {wanted.geometry_type}; give another table"]
    return []


def _right_faults(connection: Any, table: Any) -> list[str]:
    from sqlalchemy import text

    whole = quoted(table)
    asked = text("SELECT has_table_privilege(CAST(:whole AS regclass), :right)")
    lacking = [
        one for one in _RIGHTS if not connection.execute(asked, {"whole": whole, "right": one}).scalar()
    ]
    if not lacking:
        return []
    user = connection.exec_driver_sql("SELECT current_user").scalar()
    rights = ", ".join(lacking)
    return [
        f"user {user} lacks the right to {rights} in table {table.fullname}; "
        f"its owner gives it with: GRANT {rights} ON {whole} TO {user}"
    ]


def _more(names: Sequence[str], shown: int) -> str:
    return f" and {len(names) - shown} more" if len(names) > shown else ""
