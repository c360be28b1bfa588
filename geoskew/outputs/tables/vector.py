"""Tables as points: GeoPackage and GeoParquet."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path
from typing import Any, Final

from geoskew.outputs import geopackage
from geoskew.outputs.tables.columns import ColumnInfo
from geoskew.outputs.tables.text import Position

LAYER: Final = "sites"
_CRS: Final = "EPSG:4326"


def write_geopackage(part: Path, content: Any, position: Position, columns: Sequence[ColumnInfo]) -> None:
    """One layer ``sites`` of points; unit and meaning of each column are in the file's schema table.

    SQLite does not tell upper from lower case in names: a column that differs from an earlier one by
    case alone gets a number at its end here, and its own name as its title.
    """
    import pyarrow as pa
    import shapely

    names = apart(content.column_names)
    taken = {name.lower() for name in names}
    fid, geometry = free("fid", taken), free("geom", taken)
    points = shapely.to_wkb(shapely.points(*position))
    table = content.rename_columns(names).append_column(geometry, pa.array(list(points), pa.binary()))
    about = [
        geopackage.About(name, column.description, column.name)
        for name, column in zip(names, columns, strict=True)
    ]
    with geopackage.reproducible():
        geopackage.add_layer(
            part,
            table,
            layer=LAYER,
            geometry_type="Point",
            crs=_CRS,
            title="Assessed sites",
            description="Assessed sites. Coordinates: WGS 84, x longitude before y latitude, degrees.",
            fid=fid,
            geometry=geometry,
        )
    geopackage.describe(part, {LAYER: about})


def write_parquet(part: Path, content: Any, position: Position, columns: Sequence[ColumnInfo]) -> None:
    """GeoParquet with points; text stays text and whole numbers stay whole beside empty cells."""
    import geopandas
    import pandas as pd
    import pyarrow as pa
    import shapely

    table = content.to_pandas(types_mapper={pa.int64(): pd.Int64Dtype()}.get)
    geometry = free("geometry", set(content.column_names))
    points = geopandas.GeoSeries(shapely.points(*position), index=table.index, crs=_CRS)
    places = geopandas.GeoDataFrame(table.assign(**{geometry: points}), geometry=geometry)
    places.to_parquet(part, compression="zstd", index=False)


def apart(names: Sequence[str]) -> list[str]:
    """Names that differ by more than case.

    >>> apart(["id", "Name", "name", "NAME"])
    ['id', 'Name', 'name_2', 'NAME_3']
    """
    taken: set[str] = set()
    found = []
    for name in names:
        number, other = 1, name
        while other.lower() in taken or (number > 1 and other in names):
            number += 1
            other = f"{name}_{number}"
        taken.add(other.lower())
        found.append(other)
    return found


def free(name: str, taken: set[str]) -> str:
    """A name, with a number at its end where it is taken.

    >>> free("fid", {"id"}), free("fid", {"fid", "fid_2"})
    ('fid', 'fid_3')
    """
    number, other = 1, name
    while other in taken:
        number += 1
        other = f"{name}_{number}"
    return other
