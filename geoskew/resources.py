"""Files that come with the package: demonstration scenarios and the base map of the world.

In a checkout they lie in ``data/``, in an installed package in ``geoskew/data_files/``; nobody but
this module needs to know. The base map is Natural Earth at 1:50 million as TopoJSON, decoded here
after the TopoJSON specification 1.0 (arcs are chains of differences on an integer grid).
"""

from __future__ import annotations

import json
from collections import Counter
from collections.abc import Iterator
from functools import cache
from pathlib import Path
from typing import TYPE_CHECKING, Any, Literal

import numpy as np
from numpy.typing import NDArray

from geoskew.errors import GeoskewError, InputError

if TYPE_CHECKING:
    from shapely.geometry.base import BaseGeometry

Bounds = tuple[float, float, float, float]
OutlineKind = Literal["land", "coast", "borders"]


def data_folder() -> Path:
    """Folder of the files that come with the package, in a checkout or an installed package alike."""
    package = Path(__file__).resolve().parent
    for folder in (package / "data_files", package.parent / "data"):
        if (folder / "natural-earth").is_dir():
            return folder
    raise GeoskewError(f"the data that come with geoskew are missing beside {package}; install it again")


def demo_scenario(name: str = "southern-cone") -> Path:
    """Scenario file of a bundled demonstration: ``southern-cone`` or ``slot-change``.

    Raises
    ------
    InputError
        When no demonstration has that name.
    """
    found = sorted(path.parent.name for path in data_folder().glob("*/scenario.toml"))
    if name not in found:
        raise InputError(f"demonstration {name!r} is not one of: {', '.join(found)}")
    return data_folder() / name / "scenario.toml"


def outline(kind: OutlineKind, bounds: Bounds) -> BaseGeometry:
    """Base map within bounds.

    Parameters
    ----------
    kind : {"land", "coast", "borders"}
        Land as polygons, its edge or the borders between countries as lines.
    bounds : tuple of float
        West, south, east, north in degrees. West > east crosses 180°, as does east > 180.

    Returns
    -------
    shapely geometry
        MultiPolygon for land, else MultiLineString; empty where there is none. Longitudes run from
        west on without a jump, past 180 where the bounds do. Edges that only the cutting at the
        bounds or at the south pole made are part of the land polygons but not of the lines. About
        400 m by 200 m fine: for orientation, not for judging whether a site is on land.

    Raises
    ------
    InputError
        When the bounds do not enclose an area or span more than 360°.
    """
    import shapely

    west, south, east, north = _unwrapped(bounds)
    window = shapely.box(west, south, east, north)
    pieces = []
    for turn in (-720.0, -360.0, 0.0, 360.0, 720.0):
        shifted = shapely.transform(
            np.asarray(_world(kind), dtype=object), lambda xy, by=turn: xy + (by, 0.0)
        )
        near = shifted[shapely.intersects(shapely.envelope(shifted), window)]
        pieces.extend(shapely.get_parts(shapely.intersection(near, window)))
    dimension = 2 if kind == "land" else 1
    parts = [piece for piece in pieces if shapely.get_dimensions(piece) == dimension]
    # Pieces of two turns that touch become one again.
    joined = shapely.union_all(parts)
    if kind == "land":
        return shapely.MultiPolygon(list(shapely.get_parts(joined)))
    return shapely.MultiLineString(list(shapely.get_parts(shapely.line_merge(joined))))


def _unwrapped(bounds: Bounds) -> Bounds:
    west, south, east, north = bounds
    if west > east:
        east += 360.0
    if not (south < north and 0.0 < east - west <= 360.0 and -360.0 <= west <= 180.0):
        raise InputError(
            f"bounds {tuple(bounds)} enclose no area; give west, south, east, north in degrees,"
            " south below north, at most 360° wide, west between -360 and 180"
        )
    return west, south, east, north


@cache
def _world(kind: OutlineKind) -> tuple[BaseGeometry, ...]:
    """The whole world's polygons or lines, valid, without collapsed rings, none with a jump at 180°."""
    import shapely

    topology = _topology()
    arcs = _arcs(topology)
    if kind == "land":
        polygons = [_polygon(rings, arcs) for rings in _polygons(topology["objects"]["land"])]
        return tuple(shapely.make_valid(polygon) for polygon in polygons if polygon is not None)
    # A border between two countries is an arc that both of them name; a coast belongs to one alone.
    users: Counter[int] = Counter()
    for country in topology["objects"]["countries"]["geometries"]:
        users.update({index if index >= 0 else ~index for index in _arc_indices(country)})
    wanted = [arcs[index] for index, count in users.items() if (count > 1) == (kind == "borders")]
    lines = (line for arc in wanted if not _is_pole(arc) for line in _without_seam(_unwound(arc)))
    return tuple(shapely.linestrings(line) for line in lines)


@cache
def _topology() -> Any:
    path = data_folder() / "natural-earth" / "countries-50m.json"
    return json.loads(path.read_text(encoding="utf-8"))


def _arcs(topology: Any) -> list[NDArray[np.float64]]:
    scale = np.asarray(topology["transform"]["scale"])
    origin = np.asarray(topology["transform"]["translate"])
    # Rounded so that the two sides of 180° meet exactly when one of them is shifted by 360.
    return [np.round(np.cumsum(np.asarray(arc), axis=0) * scale + origin, 7) for arc in topology["arcs"]]


def _unwound(line: NDArray[np.float64]) -> NDArray[np.float64]:
    """The line (N, 2) with longitudes that run on past 180°; the source steps from 180 to −180."""
    longitude = np.round(np.unwrap(line[:, 0], period=360.0), 7)
    return np.column_stack([longitude, line[:, 1]])


def _is_pole(line: NDArray[np.float64]) -> bool:
    """Whether a line is nothing but the south pole, drawn out to a parallel."""
    return bool(np.all(line[:, 1] < -89.99))


def _without_seam(line: NDArray[np.float64]) -> Iterator[NDArray[np.float64]]:
    """Pieces of a line (N, 2) without its runs along 180°: islands cut in two there, no coast."""
    at_seam = np.abs(line[:, 0]) == 180.0
    seam = at_seam[:-1] & at_seam[1:]
    for run in np.split(np.arange(len(line) - 1), np.flatnonzero(np.diff(seam)) + 1):
        if not seam[run[0]]:
            yield line[run[0] : run[-1] + 2]


def _polygons(geometry: Any) -> Iterator[list[list[int]]]:
    """Rings of arc indices of every polygon within a TopoJSON geometry object."""
    if geometry["type"] == "GeometryCollection":
        for part in geometry["geometries"]:
            yield from _polygons(part)
    elif geometry["type"] == "MultiPolygon":
        yield from geometry["arcs"]
    elif geometry["type"] == "Polygon":
        yield geometry["arcs"]


def _arc_indices(geometry: Any) -> Iterator[int]:
    for rings in _polygons(geometry):
        for ring in rings:
            yield from ring


def _polygon(rings: list[list[int]], arcs: list[NDArray[np.float64]]) -> BaseGeometry | None:
    """One polygon; None when its outer ring has collapsed to fewer than four points."""
    import shapely

    outer, *holes = [_ring(ring, arcs) for ring in rings]
    if len(outer) < 4:
        return None
    if outer[0, 0] != outer[-1, 0]:
        # The coast of Antarctica runs once around the pole: its polygon is closed over the pole.
        outer = np.vstack([outer, [outer[-1, 0], -90.0], [outer[0, 0], -90.0]])
    return shapely.Polygon(outer, [hole for hole in holes if len(hole) >= 4 and not _is_pole(hole)])


def _ring(indices: list[int], arcs: list[NDArray[np.float64]]) -> NDArray[np.float64]:
    """Arcs joined end to end; ~i stands for arc i walked backwards (TopoJSON 1.0, §2.1.4)."""
    parts = [arcs[index] if index >= 0 else arcs[~index][::-1] for index in indices]
    joined = _unwound(np.concatenate([parts[0]] + [part[1:] for part in parts[1:]]))
    moved = np.any(np.diff(joined, axis=0) != 0.0, axis=1)
    return joined[np.concatenate(([True], moved))]
