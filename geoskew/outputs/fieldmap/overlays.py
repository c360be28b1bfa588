"""Grids brought into the map's projection by picking cells: no new values, no blur.

The map is drawn in spherical Mercator, in which equal steps of longitude are equal steps on the
screen but equal steps of latitude are not. Every output cell takes the value of the source cell that
holds its centre: for a grid in degrees that is a choice of rows and columns, for a metric grid the
inverse projection of every centre. Longitudes run past 180° where the grid does.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any, Final

import numpy as np
from numpy.typing import ArrayLike, NDArray

from geoskew.layers import Layer
from geoskew.outputs.fieldmap.blocks import pack
from geoskew.outputs.fieldmap.content import Overlay
from geoskew.outputs.fieldmap.quantise import quantise, step_of

LONG_SIDE: Final = 1200
# The square world of spherical Mercator ends here.
MOST_LATITUDE: Final = 85.0511287798066


@dataclass(frozen=True, slots=True, eq=False)
class MercatorGrid:
    """Values whose columns are equal steps of longitude and whose rows are equal steps of Mercator y.

    ``west``, ``east``, ``north``, ``south`` are the outer edges in degrees.
    """

    values: NDArray[Any]
    west: float
    east: float
    north: float
    south: float


def mercator_y(latitude: ArrayLike) -> NDArray[np.float64]:
    """Spherical Mercator ordinate in degrees of longitude at the equator; clipped at the map's edge."""
    clipped = np.clip(np.asarray(latitude, dtype=np.float64), -MOST_LATITUDE, MOST_LATITUDE)
    return np.degrees(np.arcsinh(np.tan(np.radians(clipped))))


def latitude_of(y: ArrayLike) -> NDArray[np.float64]:
    """Latitude of a spherical Mercator ordinate, both in degrees."""
    return np.degrees(np.arctan(np.sinh(np.radians(np.asarray(y, dtype=np.float64)))))


def to_mercator(overlay: Overlay, *, long_side: int = LONG_SIDE) -> MercatorGrid:
    """Bring a grid into spherical Mercator by picking the cell under every centre.

    Parameters
    ----------
    overlay : Overlay
        Values with their CRS and affine transform; rotated grids are not supported.
    long_side : int
        Most columns or rows of the result.

    Raises
    ------
    ValueError
        The transform is rotated or its steps are not those of a north-up grid.
    """
    from pyproj import CRS

    a, b, _, d, e, _ = overlay.transform
    if b != 0.0 or d != 0.0 or a <= 0.0 or e >= 0.0:
        raise ValueError(f"overlay {overlay.layer.name}: the grid must be north up and not rotated")
    crs = CRS.from_user_input(overlay.crs)
    return _from_degrees(overlay, long_side) if crs.is_geographic else _from_metric(overlay, crs, long_side)


def _shape(columns: int, width: float, height: float, long_side: int) -> tuple[int, int]:
    """Rows and columns of about square cells, no more columns than the source has."""
    across = min(columns, long_side)
    down = max(1, round(across * height / width))
    if down > long_side:
        across = max(1, round(across * long_side / down))
        down = long_side
    return down, across


def _centres(first: float, last: float, count: int) -> NDArray[np.float64]:
    return first + (np.arange(count) + 0.5) * (last - first) / count


def _from_degrees(overlay: Overlay, long_side: int) -> MercatorGrid:
    step_x, _, west, _, step_y, top = overlay.transform
    rows, columns = overlay.values.shape
    east, bottom = west + step_x * columns, top + step_y * rows
    north, south = min(top, MOST_LATITUDE), max(bottom, -MOST_LATITUDE)
    y_north, y_south = float(mercator_y(north)), float(mercator_y(south))
    # Rows as dense as the source's where Mercator packs them closest, up to the long side.
    down, across = _shape(columns, east - west, y_north - y_south, long_side)
    source_row = (latitude_of(_centres(y_north, y_south, down)) - top) / step_y
    source_column = (_centres(west, east, across) - west) / step_x
    row = np.clip(np.floor(source_row).astype(np.int64), 0, rows - 1)
    column = np.clip(np.floor(source_column).astype(np.int64), 0, columns - 1)
    return MercatorGrid(overlay.values[np.ix_(row, column)], west, east, north, south)


def _from_metric(overlay: Overlay, crs: Any, long_side: int) -> MercatorGrid:
    from pyproj import Transformer

    a, _, c, _, e, f = overlay.transform
    rows, columns = overlay.values.shape
    to_degrees = Transformer.from_crs(crs, "EPSG:4326", always_xy=True)
    # The extreme longitudes and latitudes of a projected rectangle lie on its edge unless it holds a
    # pole; a dense lattice over the whole of it covers both.
    x = c + a * np.linspace(0, columns, min(columns, 100) + 1)
    y = f + e * np.linspace(0, rows, min(rows, 100) + 1)
    longitude, latitude = to_degrees.transform(*np.meshgrid(x, y))
    middle = float(longitude[longitude.shape[0] // 2, longitude.shape[1] // 2])
    longitude = middle + np.mod(longitude - middle + 180.0, 360.0) - 180.0
    west, east = float(np.nanmin(longitude)), float(np.nanmax(longitude))
    north = min(float(np.nanmax(latitude)), MOST_LATITUDE)
    south = max(float(np.nanmin(latitude)), -MOST_LATITUDE)
    y_north, y_south = float(mercator_y(north)), float(mercator_y(south))
    down, across = _shape(columns, east - west, y_north - y_south, long_side)
    at_longitude, at_latitude = np.meshgrid(
        _centres(west, east, across), latitude_of(_centres(y_north, y_south, down))
    )
    back = Transformer.from_crs("EPSG:4326", crs, always_xy=True)
    east_m, north_m = back.transform(np.mod(at_longitude + 180.0, 360.0) - 180.0, at_latitude)
    with np.errstate(invalid="ignore"):
        column, row = np.floor((east_m - c) / a), np.floor((north_m - f) / e)
        inside = (column >= 0) & (column < columns) & (row >= 0) & (row < rows)
    empty = 255 if overlay.layer.is_class else np.nan
    picked = np.full(inside.shape, empty, dtype=overlay.values.dtype)
    picked[inside] = overlay.values[row[inside].astype(np.int64), column[inside].astype(np.int64)]
    return MercatorGrid(picked, west, east, north, south)


def delta_coded(codes: NDArray[np.uint16]) -> NDArray[np.uint16]:
    """Second difference along rows and columns, modulo 65 536: small where the grid is smooth."""
    difference = codes.copy()
    difference[:, 1:] -= codes[:, :-1]
    down = difference.copy()
    down[1:] -= difference[:-1]
    return down


# Round ends for a scale of colours, times powers of ten.
_ROUND: Final = (1.0, 1.5, 2.0, 2.5, 3.0, 4.0, 5.0, 6.0, 8.0, 10.0)


def _rounded_up(value: float) -> float:
    power = 10.0 ** np.floor(np.log10(value))
    return float(next(one * power for one in _ROUND if one * power >= value * (1.0 - 1e-9)))


def shown_limits(layer: Layer, values: NDArray[Any]) -> list[float]:
    """What the colours span: the layer's limits, narrowed to where its values lie.

    All but the outermost two percent of the values on either side are inside. Ramps about zero stay
    even about it, losses start where the layer does, and a full circle stays a full circle.
    """
    low, high = layer.limits
    good = values[np.isfinite(values)] if not layer.is_class else values[:0]
    if good.size == 0 or layer.ramp == "cycle":
        return [low, high]
    least, most = (float(one) for one in np.percentile(good, (2.0, 98.0)))
    if layer.ramp in ("signed", "margin"):
        reach = min(high, _rounded_up(max(abs(least), abs(most), 1.0)))
        return [-reach, reach]
    if layer.ramp == "loss":
        return [low, max(low, min(high, low + _rounded_up(max(most - low, 0.1))))]
    step = 10.0 ** np.floor(np.log10(max(most - least, 0.1)))
    first, last = float(np.floor(least / step) * step), float(np.ceil(most / step) * step)
    # A layer far outside its usual limits keeps its own.
    narrowed = [max(low, first), min(high, last)]
    return narrowed if narrowed[0] < narrowed[1] else [first, max(last, first + step)]


def packed_overlay(overlay: Overlay) -> tuple[dict[str, Any], str]:
    """Facts of an overlay for the page, and its packed grid."""
    grid = to_mercator(overlay)
    if overlay.layer.is_class:
        values = np.where(grid.values == 255, np.nan, grid.values.astype(np.float64))
        codes, offset, step = quantise(values, 1.0)
    else:
        codes, offset, step = quantise(grid.values, step_of(overlay.layer.unit))
    facts = {
        "layer": overlay.layer.name,
        "rows": grid.values.shape[0],
        "columns": grid.values.shape[1],
        "west": grid.west,
        "east": grid.east,
        "north": grid.north,
        "south": grid.south,
        "limits": shown_limits(overlay.layer, grid.values),
        "offset": offset,
        "step": step,
    }
    return facts, pack({"grid": delta_coded(codes)})
