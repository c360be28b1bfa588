"""The outline of a region: polygons of any vector file, brought into the grid's coordinates.

Longitudes close on themselves, plane geometry does not. Outlines across 180° come in three shapes:
written past 180 (175 … 185), cut there (two parts), or jumping from 179 to −179 within a ring. All
three are brought to parts within ±180 first; those are laid out anew from wherever the grid begins.
"""

from __future__ import annotations

import math
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

from geoskew.errors import InputError, Problem
from geoskew.region.grid import GEOGRAPHIC_CRS
from geoskew.region.vectorfile import read_vector

# A straight edge becomes a curve in another CRS: edges are cut to this length before the change.
EDGE_DEG = 0.05
EDGE_M = 5_000.0


def read_outline(path: Path, *, crs: str) -> Any:
    """Read polygons, melt them into one geometry and bring it into a CRS.

    Parameters
    ----------
    path : Path
        A vector file with polygons, in any CRS.
    crs : str
        ``EPSG:4326`` (the parts then lie within ±180) or a projected CRS.

    Returns
    -------
    shapely geometry
        A polygon or several.

    Raises
    ------
    InputError
        If the file has no polygon, no CRS, or edges that can be read in two ways.
    """
    import shapely
    from geopandas import GeoDataFrame
    from pyproj import CRS

    frame = read_vector(path, kind="Polygon")
    if not isinstance(frame, GeoDataFrame):
        raise InputError(Problem("has no geometry; the outline is a polygon", file=path))
    geometry = frame.geometry
    _check_polygons(geometry, path)
    if geometry.crs is None:
        raise InputError(Problem("has no CRS; store the outline with one", file=path))
    own = CRS.from_user_input(geometry.crs)
    polygons = [part for part in shapely.get_parts(geometry.dropna().to_numpy()) if not part.is_empty]
    if CRS.from_user_input(crs).is_projected:
        if own.is_geographic:
            polygons = [_continuous(part, path, dense=False) for part in polygons]
        melted = shapely.union_all(
            [shapely.make_valid(_reproject(part, own, crs, path)) for part in polygons]
        )
    else:
        moved = [_reproject(part, own, crs, path) for part in polygons]
        whole = [_continuous(part, path, dense=not own.is_geographic) for part in moved]
        melted = laid_out(shapely.union_all([shapely.make_valid(part) for part in whole]), -180.0, 180.0)
    if melted.area <= 0.0:
        raise InputError(Problem("the outline has no area", file=path))
    return melted


def laid_out(geometry: Any, west: float, east: float) -> Any:
    """Lay out polygons between two longitudes, which may run past ±180, turning them by 360° as needed.

    Parameters
    ----------
    geometry : shapely geometry
        Polygons in longitude and latitude, degrees.
    west, east : float
        Degrees, west < east.

    Returns
    -------
    shapely.MultiPolygon
        All that shows between the two, cut at both; may be empty.
    """
    import shapely
    from shapely.affinity import translate

    low, _, high, _ = geometry.bounds
    pieces = []
    for turn in range(math.ceil((west - high) / 360.0), math.floor((east - low) / 360.0) + 1):
        frame = shapely.box(west - 360.0 * turn, -90.0, east - 360.0 * turn, 90.0)
        piece = shapely.intersection(geometry, frame)
        if not piece.is_empty:
            pieces.append(translate(piece, xoff=360.0 * turn))
    melted = shapely.union_all(pieces)
    return shapely.MultiPolygon([part for part in shapely.get_parts(melted) if part.area > 0.0])


def span(geometry: Any) -> tuple[float, float]:
    """West and east of polygons within ±180: the shortest stretch of longitudes that holds them all.

    East runs past 180 where the stretch crosses it. Polygons all around the Earth give −180, 180.
    """
    import shapely

    bounds = shapely.bounds(shapely.get_parts(geometry))
    order = np.argsort(bounds[:, 0])
    starts, ends = bounds[order, 0], np.maximum.accumulate(bounds[order, 2])
    # The gap across 180° comes first, so that it wins a tie and longitudes stay within ±180.
    gaps = np.concatenate(([starts[0] + 360.0 - ends[-1]], starts[1:] - ends[:-1]))
    widest = int(np.argmax(gaps))
    if gaps[widest] <= 0.0:
        return -180.0, 180.0
    if widest == 0:
        return float(starts[0]), float(ends[-1])
    return float(starts[widest]), float(ends[widest - 1] + 360.0)


def _check_polygons(geometry: Any, path: Path) -> None:
    kinds = sorted({str(kind) for kind in geometry.dropna().geom_type})
    if not kinds:
        raise InputError(Problem("holds no geometry; the outline is a polygon", file=path))
    wrong = [kind for kind in kinds if kind not in ("Polygon", "MultiPolygon")]
    if wrong:
        message = f"holds {', '.join(wrong)}; the outline of a region is made of polygons only"
        raise InputError(Problem(message, file=path))


def _reproject(geometry: Any, own: Any, crs: str, path: Path) -> Any:
    import shapely
    from pyproj import Transformer

    if own == crs:
        return geometry
    length = EDGE_DEG if own.is_geographic else EDGE_M / own.axis_info[0].unit_conversion_factor
    transformer = Transformer.from_crs(own, crs, always_xy=True)
    keep_turns = own.is_geographic and crs == GEOGRAPHIC_CRS

    def moved(points: NDArray[np.float64]) -> NDArray[np.float64]:
        x, y = transformer.transform(points[:, 0], points[:, 1])
        if keep_turns:  # longitudes written past 180 stay there
            x = x + 360.0 * np.round((points[:, 0] - x) / 360.0)
        return np.column_stack((x, y))

    result = shapely.transform(shapely.segmentize(geometry, length), moved)
    if not np.isfinite(shapely.get_coordinates(result)).all():
        raise InputError(Problem(f"the outline reaches where {crs} has no coordinates", file=path))
    return result


def _continuous(polygon: Any, path: Path, *, dense: bool) -> Any:
    """Undo jumps of 360° between the points of a polygon's rings.

    `dense` says that the edges are short, so that every jump is a crossing of 180°.
    """
    import shapely

    rings = [shapely.get_coordinates(ring) for ring in (polygon.exterior, *polygon.interiors)]
    if not any(_jumps(ring[:, 0]).any() for ring in rings):
        return polygon
    shell, *holes = (_unwrapped(ring, path, dense=dense) for ring in rings)
    middle = shell[:, 0].mean()
    for hole in holes:
        hole[:, 0] += 360.0 * np.round((middle - hole[:, 0].mean()) / 360.0)
    return shapely.polygons(shell, holes=[shapely.linearrings(hole) for hole in holes] or None)


def _jumps(longitude: NDArray[np.float64]) -> NDArray[np.bool_]:
    """Edges longer than half the Earth; a whole turn is the edge along a pole, which is meant."""
    length = np.abs(np.diff(longitude))
    return (length > 180.0) & (length < 360.0 - 1e-9)


def _unwrapped(ring: NDArray[np.float64], path: Path, *, dense: bool) -> NDArray[np.float64]:
    jumps = _jumps(ring[:, 0])
    if not jumps.any():
        return ring
    longitude = np.unwrap(ring[:, 0], period=360.0)
    turn = longitude[-1] - longitude[0]
    plain = np.unique(ring[:, 0]).size <= 2
    if not dense and (plain or np.ptp(longitude) > 180.0 or abs(turn) > 1.0):
        one, two = ring[int(np.argmax(jumps)) :, 0][:2]
        message = (
            f"an edge of the outline goes from longitude {one:g} to {two:g}: across 180° or the long way "
            "round? Write longitudes past 180 (182 for −178) or cut the polygon at 180"
        )
        raise InputError(Problem(message, file=path))
    unwrapped = np.column_stack((longitude, ring[:, 1]))
    if abs(turn) < 1.0:
        return unwrapped
    # The ring goes around a pole: close it along the pole that it is nearer to.
    pole = np.copysign(90.0, ring[:, 1].mean())
    ends = np.array([[longitude[-1], pole], [longitude[0], pole], [longitude[0], ring[0, 1]]])
    return np.concatenate((unwrapped, ends))
