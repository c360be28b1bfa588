"""Districts: which polygon of a file holds each cell of a grid."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Any, Final

import numpy as np
from numpy.typing import NDArray

from geoskew.errors import InputError, Problem
from geoskew.region.vectorfile import read_vector

if TYPE_CHECKING:
    from geoskew.region.grid import Grid

NO_DISTRICT: Final = -1
# Columns that may name a district, the first that a file has.
NAME_COLUMNS: Final = ("name", "district", "id")


def read_districts(path: Path, grid: Grid) -> tuple[NDArray[np.int32], tuple[str, ...]]:
    """Read districts and find the cells of each.

    Parameters
    ----------
    path : Path
        A vector file of polygons, in any CRS that it states.
    grid : Grid

    Returns
    -------
    ndarray of int32, shape (rows, columns)
        Number of the district whose polygon holds the cell's centre, `NO_DISTRICT` where none does; of
        polygons that overlap the later one.
    tuple of str
        Names of the districts, from the column ``name``, ``district`` or ``id``, else their numbers from 1.

    Raises
    ------
    InputError
        The file cannot be read, has no CRS, no polygon, or none within the grid.
    """
    from geopandas import GeoDataFrame

    frame = read_vector(path, kind="Polygon")
    if not isinstance(frame, GeoDataFrame):
        raise InputError(Problem("has no geometry; districts are polygons", file=path))
    wrong = sorted({str(kind) for kind in frame.geom_type.dropna()} - {"Polygon", "MultiPolygon"})
    if wrong or frame.geometry.isna().all():
        what = f"holds {', '.join(wrong)}" if wrong else "holds no geometry"
        raise InputError(Problem(f"{what}; districts are polygons", file=path))
    if frame.crs is None:
        raise InputError(Problem("has no CRS; store the districts with one", file=path))
    labels = _burnt(frame.geometry.to_crs(grid.crs), grid)
    if not (labels != NO_DISTRICT).any():
        raise InputError(Problem("has no district within the region", file=path))
    return labels, _names(frame)


def _burnt(geometry: Any, grid: Grid) -> NDArray[np.int32]:
    from rasterio.features import rasterize
    from rasterio.transform import Affine
    from shapely.affinity import translate

    turns = (0.0, -360.0, 360.0) if grid.is_geographic else (0.0,)
    shapes = [
        (translate(one, xoff=turn), number)
        for turn in turns
        for number, one in enumerate(geometry)
        if one is not None and not one.is_empty
    ]
    burnt = rasterize(
        shapes, out_shape=grid.shape, transform=Affine(*grid.transform), fill=NO_DISTRICT, dtype="int32"
    )
    return np.asarray(burnt, dtype=np.int32)


def _names(frame: Any) -> tuple[str, ...]:
    columns = {str(name).lower(): name for name in frame.columns}
    for wanted in NAME_COLUMNS:
        if wanted in columns:
            return tuple(str(one) for one in frame[columns[wanted]])
    return tuple(str(number + 1) for number in range(len(frame)))
