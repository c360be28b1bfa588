"""The summary of a run as JSON: counts and areas by action, worst sites, versions."""

from __future__ import annotations

import json
import math
import platform
from collections.abc import Iterable, Mapping, Sequence
from datetime import date, datetime
from importlib import metadata
from pathlib import Path
from typing import TYPE_CHECKING, Any, Final

import numpy as np
from numpy.typing import NDArray

from geoskew import __version__
from geoskew.errors import InputError
from geoskew.outputs import files

if TYPE_CHECKING:
    import pandas as pd

LIBRARIES: Final = (
    "numpy",
    "scipy",
    "pandas",
    "shapely",
    "pyproj",
    "rasterio",
    "pyogrio",
    "contourpy",
    "itur",
)
NO_VALUE: Final = "no value"

_STRIP: Final = 512
_NODE_STEP: Final = 64

# WGS 84 (NGA.STND.0036): semi-major axis in km, flattening.
_SEMI_MAJOR_KM: Final = 6378.137
_FLATTENING: Final = 1.0 / 298.257223563


def write_summary(path: Path, content: Mapping[str, Any]) -> None:
    """Write a summary as indented JSON; keys stay in the order given, NaN becomes null.

    Raises
    ------
    TypeError
        A value is no text, number, date, path, list or mapping.
    OutputError
        The file could not be written.
    """
    text = json.dumps(plain(content), indent=2, ensure_ascii=False, allow_nan=False)
    with files.writing(path) as part:
        part.write_text(text + "\n", encoding="utf-8")


def plain(value: Any) -> Any:
    """The same content in JSON's own types: numpy's numbers and arrays, times, paths, NaN to null.

    Raises
    ------
    TypeError
        A value has no counterpart.

    Examples
    --------
    >>> plain({"a": np.float64(1.5), "b": [np.nan, np.int8(3)], "c": (True, None)})
    {'a': 1.5, 'b': [None, 3], 'c': [True, None]}
    """
    if value is None or isinstance(value, bool | str):
        return value
    if isinstance(value, Mapping):
        return {str(key): plain(one) for key, one in value.items()}
    if isinstance(value, np.ndarray | np.generic):
        return plain(value.tolist())
    if isinstance(value, int):
        return value
    if isinstance(value, float):
        return value if math.isfinite(value) else None
    if isinstance(value, datetime):
        return value.isoformat().replace("+00:00", "Z")
    if isinstance(value, date):
        return value.isoformat()
    if isinstance(value, Path):
        return str(value)
    if isinstance(value, Iterable):
        return [plain(one) for one in value]
    raise TypeError(f"a summary cannot hold {value!r} of type {type(value).__name__}")


def counts_by_class(names: Iterable[object], classes: Sequence[tuple[int, str]]) -> dict[str, int]:
    """How many sites there are of each class, zeros included; what is no class counts as no value.

    >>> counts_by_class(["leave", "preset", "leave", None], ((0, "leave"), (1, "preset"), (2, "re-aim")))
    {'leave': 2, 'preset': 1, 're-aim': 0, 'no value': 1}
    """
    counts = {name: 0 for _, name in classes} | {NO_VALUE: 0}
    for name in names:
        counts[name if isinstance(name, str) and name in counts else NO_VALUE] += 1
    return counts


def area_by_class(path: Path, classes: Sequence[tuple[int, str]]) -> dict[str, dict[str, float]]:
    """True areas of the classes of a raster, on the ellipsoid.

    Cells of a geographic grid have the exact area of their latitude; those of a projected grid
    that of their corners on Earth, interpolated: within 1e-4 for cells of 1 km.

    Parameters
    ----------
    path : Path
        A GeoTIFF of class codes.
    classes : sequence of (int, str)
        Codes with names.

    Returns
    -------
    dict
        By class name: ``km2``, and ``percent`` of all cells that have a class (NaN where none has).

    Raises
    ------
    InputError
        The file cannot be read as a raster.
    """
    import rasterio
    from rasterio.errors import RasterioIOError

    sums = np.zeros(256)
    try:
        with rasterio.open(path) as dataset:
            for top in range(0, dataset.height, _STRIP):
                height = min(_STRIP, dataset.height - top)
                codes = dataset.read(1, window=((top, top + height), (0, dataset.width)))
                weights = np.broadcast_to(_cell_areas(dataset, top, height), codes.shape)
                sums += np.bincount(codes.ravel(), weights=weights.ravel(), minlength=256)
    except RasterioIOError as error:
        raise InputError(f"{path} cannot be read as a raster: {error}") from error
    areas = {name: float(sums[code]) for code, name in classes}
    total = sum(areas.values())
    return {
        name: {"km2": area, "percent": 100.0 * area / total if total else math.nan}
        for name, area in areas.items()
    }


def worst_sites(
    table: pd.DataFrame, column: str, *, count: int = 10, also: Sequence[str] = ("id", "lat", "lon", "action")
) -> list[dict[str, Any]]:
    """The sites with the smallest values of a column, ties in the order of the table.

    Sites without a value are left out. Columns of ``also`` that the table has go along.
    """
    order = table[column].astype(float).dropna().sort_values(kind="stable").index[:count]
    names = [name for name in also if name in table.columns and name != column]
    chosen = table.loc[order, [*names, column]]
    return [dict(zip(chosen.columns, row, strict=True)) for row in chosen.itertuples(index=False)]


def versions() -> dict[str, str]:
    """Versions of the package, of Python and of the libraries that decide on values."""
    found = {"geoskew": __version__, "python": platform.python_version()}
    for name in LIBRARIES:
        found[name] = metadata.version(name)
    return found


def _cell_areas(dataset: Any, top: int, height: int) -> NDArray[np.float64]:
    """Areas in km2 of the cells of a strip: (height, 1) on a geographic grid, else (height, W)."""
    transform = dataset.transform
    edges = transform.f + transform.e * (top + np.arange(height + 1))
    if dataset.crs.is_geographic:
        zones = -np.diff(_area_north_of_equator(np.clip(edges, -90.0, 90.0)))
        return np.asarray(zones[:, np.newaxis] * np.radians(transform.a))
    return _projected_areas(dataset, top, height)


def _area_north_of_equator(latitude: NDArray[np.float64]) -> NDArray[np.float64]:
    """Area in km2 per radian of longitude between the equator and a latitude in degrees.

    Snyder, Map Projections - A Working Manual (USGS Professional Paper 1395, 1987), equation 3-12
    with the factor a²/2.
    """
    squared = _FLATTENING * (2.0 - _FLATTENING)
    e, sine = math.sqrt(squared), np.sin(np.radians(latitude))
    q = (1.0 - squared) * (sine / (1.0 - squared * sine**2) + np.arctanh(e * sine) / e)
    return np.asarray(_SEMI_MAJOR_KM**2 * q / 2.0)


def _projected_areas(dataset: Any, top: int, height: int) -> NDArray[np.float64]:
    """Areas in km2 of the cells of a strip, (height, W), interpolated between every 64th cell.

    A cell's corners are brought to longitude and the area north of the equator; in that plane areas
    are true, and the cell is a quadrilateral.
    """
    from pyproj import Transformer

    transform = dataset.transform
    rows, row_weights = _nodes(height)
    columns, column_weights = _nodes(dataset.width)
    geographic = Transformer.from_crs(dataset.crs.to_wkt(), "EPSG:4326", always_xy=True)
    corners = []
    for right, down in ((-0.5, -0.5), (0.5, -0.5), (0.5, 0.5), (-0.5, 0.5)):
        x = transform.c + transform.a * (columns + right)
        y = transform.f + transform.e * (top + rows + down)
        longitude, latitude = geographic.transform(*np.meshgrid(x, y))
        # nodes that have no place on Earth lie among cells without a class: their area does not matter
        known = np.isfinite(longitude) & np.isfinite(latitude)
        corners.append((np.where(known, longitude, 0.0), np.where(known, latitude, 0.0)))
    east = [np.radians(np.mod(x - corners[0][0] + 180.0, 360.0) - 180.0) for x, _ in corners]
    north = [_area_north_of_equator(y) for _, y in corners]
    diagonals = (east[2] - east[0]) * (north[3] - north[1]) - (east[3] - east[1]) * (north[2] - north[0])
    return np.asarray(row_weights @ (np.abs(diagonals) / 2.0) @ column_weights.T)


def _nodes(cells: int) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Some cell centres, first and last among them, and the weights of each at all cells (cells, nodes)."""
    centres = np.arange(cells) + 0.5
    nodes = np.unique(np.append(centres[::_NODE_STEP], centres[-1]))
    weights = [np.interp(centres, nodes, one) for one in np.eye(nodes.size)]
    return nodes, np.stack(weights, axis=1)
