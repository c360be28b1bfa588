"""Rows into tables: through a staging table, within the caller's transaction."""

from __future__ import annotations

import io
from collections.abc import Sequence
from dataclasses import asdict
from pathlib import Path
from typing import Any, Final, NamedTuple

import numpy as np
from numpy.typing import NDArray

from geoskew.errors import OutputError
from geoskew.outputs.database.tables import SRID, Stamp, stored_names

_STAGING: Final = "geoskew_staging"


class Counts(NamedTuple):
    """Rows that now stand in a table for the run, and rows of an earlier write that were taken away."""

    written: int
    removed: int


class Lines(NamedTuple):
    """Contours of layers: the layers' names, a row a level as an Arrow table, and the shapes (N,)."""

    layers: tuple[str, ...]
    table: Any
    shapes: NDArray[Any]


def replace_rows(
    connection: Any,
    table: Any,
    content: Any,
    shapes: NDArray[Any],
    stamp: Stamp,
    *,
    within: tuple[str, Sequence[str]] | None = None,
) -> Counts:
    """Make the rows of a run those of a table's content; rows of other runs stay as they are.

    Rows that are there already, by the primary key, are updated: columns that others added to the table
    keep their values. Rows of the run that the content does not have any more go.

    Parameters
    ----------
    connection : sqlalchemy.Connection
        Within a transaction; an error leaves all rows as they were when that is taken back.
    table : sqlalchemy.Table
        From `site_table` or `contour_table`.
    content : pyarrow.Table
        Its rows.
    shapes : ndarray of shapely geometries
        One a row, longitude before latitude.
    stamp : Stamp
        Origin of the rows.
    within : (str, sequence of str), optional
        A column of the primary key and values: only rows that have one of them are taken away.
    """
    from sqlalchemy import Column, MetaData, Table, and_, delete, exists, literal, select
    from sqlalchemy.dialects.postgresql import insert

    names = [*stored_names(content.column_names).values(), "geom"]
    _copy(connection, table, names, content, shapes)
    staging = Table(_STAGING, MetaData(), *(Column(name, table.c[name].type) for name in names))
    stamps = asdict(stamp)
    # Geometries pass as they are: a function of the type would turn them into text and back.
    chosen = [staging.c[name] for name in names if name != "geom"]
    statement = insert(table).from_select(
        [*names[:-1], "geom", *stamps],
        select(*chosen, _plain(staging, "geom"), *(literal(value) for value in stamps.values())),
    )
    keys = [column.name for column in table.primary_key]
    others = [name for name in (*names, *stamps) if name not in keys]
    statement = statement.on_conflict_do_update(
        index_elements=keys, set_={name: statement.excluded[name] for name in others}
    )
    same = and_(*(staging.c[name] == table.c[name] for name in keys if name != "run"))
    gone = delete(table).where(table.c.run == stamp.run, ~exists().where(same))
    if within is not None:
        gone = gone.where(table.c[within[0]].in_(within[1]))
    removed = connection.execute(gone).rowcount
    written = connection.execute(statement, execution_options={"preserve_rowcount": True}).rowcount
    connection.exec_driver_sql(f"DROP TABLE {_STAGING}")
    if written != content.num_rows:
        raise OutputError(f"table {table.fullname}: {written} of {content.num_rows} rows were written")
    return Counts(written, removed)


def _plain(staging: Any, name: str) -> Any:
    from sqlalchemy import literal_column

    return literal_column(f"{staging.name}.{name}")


def _copy(connection: Any, table: Any, names: list[str], content: Any, shapes: NDArray[Any]) -> None:
    """Fill a staging table that goes with the transaction, by the server's bulk format."""
    import pyarrow as pa
    import pyarrow.csv
    import shapely
    from psycopg import sql

    target = sql.Identifier(*filter(None, (table.schema, table.name)))
    columns = sql.SQL(", ").join(map(sql.Identifier, names))
    staging = sql.Identifier(_STAGING)
    binary = shapely.to_wkb(shapely.set_srid(shapes, SRID), hex=True, include_srid=True)
    content = content.append_column("geom", pa.array(np.asarray(binary, dtype=object), pa.string()))
    text = io.BytesIO()
    pyarrow.csv.write_csv(content, text, pyarrow.csv.WriteOptions(include_header=False))
    with connection.connection.driver_connection.cursor() as cursor:
        cursor.execute(
            sql.SQL("CREATE TEMPORARY TABLE {} ON COMMIT DROP AS SELECT {} FROM {} WITH NO DATA").format(
                staging, columns, target
            )
        )
        # Quoted cells are text, the empty one included; a cell with nothing in it is no value.
        asked = sql.SQL("COPY {} ({}) FROM STDIN (FORMAT csv)").format(staging, columns)
        with cursor.copy(asked) as stream:
            stream.write(text.getbuffer())


def contour_lines(path: Path) -> Lines:
    """Lines of a file of contours, in WGS 84.

    Raises
    ------
    OutputError
        The file cannot be read back.
    """
    import geopandas
    import pandas as pd
    import pyarrow as pa
    import pyogrio
    from pyogrio.errors import DataSourceError

    try:
        names = tuple(str(name) for name, _ in pyogrio.list_layers(path))
        parts = [pyogrio.read_dataframe(path, layer=name) for name in names]
    except DataSourceError as error:
        raise OutputError(f"{path} cannot be read back: {error}") from error
    kinds = {"layer": pa.string(), "level": pa.float64(), "unit": pa.string()}
    parts = [part if part.crs == f"EPSG:{SRID}" else part.to_crs(SRID) for part in parts if len(part)]
    if not parts:
        empty = pa.table({name: pa.array([], kind) for name, kind in kinds.items()})
        return Lines(names, empty, np.array([], dtype=object))
    whole = geopandas.GeoDataFrame(pd.concat(parts, ignore_index=True))
    table = pa.table({name: pa.array(whole[name], kind) for name, kind in kinds.items()})
    return Lines(names, table, np.asarray(whole.geometry.to_numpy(), dtype=object))
