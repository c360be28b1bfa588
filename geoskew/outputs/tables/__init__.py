"""Tables: the assessed site list in five formats, the rejected rows, the meaning of every column."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path
from typing import TYPE_CHECKING, Any

from geoskew.errors import InputError, OutputError
from geoskew.outputs import files
from geoskew.outputs.tables.columns import ColumnInfo, layer_column, settled
from geoskew.outputs.tables.lists import is_rejected_list, write_dictionary, write_rejected
from geoskew.outputs.tables.spreadsheet import write_xlsx
from geoskew.outputs.tables.text import write_csv, write_geojson
from geoskew.outputs.tables.vector import write_geopackage, write_parquet

if TYPE_CHECKING:
    import pandas as pd

__all__ = [
    "ENDINGS",
    "ColumnInfo",
    "is_rejected_list",
    "layer_column",
    "require_format",
    "write_dictionary",
    "write_rejected",
    "write_table",
]

_WRITERS = {
    ".csv": write_csv,
    ".gpkg": write_geopackage,
    ".geojson": write_geojson,
    ".parquet": write_parquet,
    ".xlsx": write_xlsx,
}
ENDINGS = tuple(_WRITERS)


def require_format(path: str | Path) -> None:
    """Check, before the work, that a table can be written under a name.

    Raises
    ------
    InputError
        The ending is none of the formats offered.
    """
    if Path(path).suffix.lower() not in _WRITERS:
        raise InputError(f"{path}: the ending tells the format of a table; give one of {', '.join(ENDINGS)}")


def write_table(
    path: Path,
    table: pd.DataFrame,
    *,
    columns: Sequence[ColumnInfo],
    lon: str = "lon",
    lat: str = "lat",
) -> None:
    """Write a table of places in the format of the file's ending.

    Every format has the same columns, rows and order. Given values stay as they are, layers are
    rounded to six decimals, yes/no is 1/0, no value is an empty cell or NULL, text is never taken for
    a number or a formula. Positions are WGS 84, x (longitude) before y (latitude).

    Parameters
    ----------
    path : Path
        Final name. A file there is replaced: ask ``files.require_free`` before.
    table : DataFrame
        One row a place.
    columns : sequence of ColumnInfo
        The columns to write, in their order, with unit and meaning.
    lon, lat : str
        Columns with the position in degrees.

    Raises
    ------
    InputError
        The format is not offered, or cannot hold the table.
    OutputError
        The file could not be written.
    """
    import pyarrow as pa

    path = Path(path)
    require_format(path)
    write: Any = _WRITERS[path.suffix.lower()]
    content = settled(table, columns)
    position = table[lon].to_numpy(dtype=float), table[lat].to_numpy(dtype=float)
    with files.writing(path) as part:
        try:
            write(part, content, position, columns)
        except pa.ArrowException as error:
            raise OutputError(f"{path}: could not be written: {error}") from error
