"""Tables as text: CSV and GeoJSON."""

from __future__ import annotations

import csv
import io
import json
from collections.abc import Sequence
from datetime import datetime
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

from geoskew.outputs.tables.columns import ColumnInfo

Position = tuple[NDArray[np.float64], NDArray[np.float64]]


def write_csv(part: Path, content: Any, position: Position, columns: Sequence[ColumnInfo]) -> None:
    """UTF-8, comma, decimal point; a cell is quoted only where it holds a comma, a quote or a line end.

    Numbers have the fewest digits that read back as the same value.
    """
    header = io.StringIO()
    csv.writer(header, lineterminator="\n").writerow(content.column_names)
    with part.open("w", encoding="utf-8", newline="") as file:
        file.write(header.getvalue())
        for batch in times_as_text(content).to_batches(max_chunksize=10_000):
            file.writelines(f"{line}\n" for line in _lines(batch).to_pylist())


def _lines(batch: Any) -> Any:
    """One text a row, put together column by column: far faster than cell by cell."""
    import pyarrow as pa
    import pyarrow.compute as pc

    cells = []
    for column in batch.columns:
        if pa.types.is_string(column.type):
            quoted = pc.binary_join_element_wise('"', pc.replace_substring(column, '"', '""'), '"', "")
            cell = pc.if_else(pc.match_substring_regex(column, '[",\r\n]'), quoted, column)
        else:
            cell = pc.cast(column, pa.string())
        cells.append(pc.fill_null(cell, ""))
    return pc.binary_join_element_wise(*cells, ",")


def write_geojson(part: Path, content: Any, position: Position, columns: Sequence[ColumnInfo]) -> None:
    """RFC 7946: WGS 84, longitude before latitude, longitudes within -180 and 180, one line a feature."""
    longitude = np.mod(position[0] + 180.0, 360.0) - 180.0
    # a place that was within the range keeps its digits
    longitude = np.where(np.abs(position[0]) <= 180.0, position[0], np.round(longitude, 9))
    content = times_as_text(content)
    with part.open("w", encoding="utf-8", newline="\n") as file:
        file.write('{"type": "FeatureCollection", "features": [')
        start = 0
        for batch in content.to_batches(max_chunksize=10_000):
            for index, row in enumerate(batch.to_pylist(), start):
                point = [float(longitude[index]), float(position[1][index])]
                geometry = {"type": "Point", "coordinates": point}
                feature = {"type": "Feature", "properties": row, "geometry": geometry}
                file.write(",\n" if index else "\n")
                file.write(json.dumps(feature, ensure_ascii=False, allow_nan=False))
            start += batch.num_rows
        file.write("\n]}\n")


def times_as_text(content: Any) -> Any:
    """The same table with times as ISO 8601 text, for formats that have no times with a zone."""
    import pyarrow as pa

    for index, field in enumerate(content.schema):
        if pa.types.is_timestamp(field.type):
            times = content.column(index).to_pylist()
            text = pa.array([None if time is None else _iso(time) for time in times], pa.string())
            content = content.set_column(index, field.name, text)
    return content


def _iso(time: datetime) -> str:
    return time.isoformat().replace("+00:00", "Z")
