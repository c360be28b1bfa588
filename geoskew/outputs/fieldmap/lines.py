"""Outlines, contours and routes as packed lines, brought into one world about the map's middle."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from typing import Any, Final

import numpy as np
from numpy.typing import NDArray

from geoskew.outputs.fieldmap.blocks import pack
from geoskew.outputs.fieldmap.content import Basemap, Box, ContourLine, Route
from geoskew.outputs.fieldmap.quantise import degrees_as_integers

# 1e-4 degree is 11 m; the bundled outlines are coarser by a factor of twenty.
LINE_DECIMALS: Final = 4
BASE_DECIMALS: Final = 3


def near(longitude: NDArray[np.float64], middle: float) -> NDArray[np.float64]:
    """The same longitudes within ±180° of `middle`."""
    return np.asarray(middle + np.mod(longitude - middle + 180.0, 360.0) - 180.0, dtype=np.float64)


def unrolled(line: NDArray[np.float64], middle: float) -> NDArray[np.float64]:
    """A line without jumps of 360°, moved as a whole to where its mean lies nearest to `middle`."""
    out = np.array(line, dtype=np.float64, copy=True).reshape(-1, 2)
    if len(out) == 0:
        return out
    out[:, 0] = np.unwrap(out[:, 0], period=360.0)
    out[:, 0] += 360.0 * np.round((middle - float(out[:, 0].mean())) / 360.0)
    return out


def packed_lines(
    lines: Sequence[NDArray[np.float64]],
    *,
    decimals: int,
    facts: dict[str, Any] | None = None,
    texts: dict[str, Sequence[str]] | None = None,
    more: dict[str, NDArray[Any]] | None = None,
) -> str:
    """Lines as first points and differences; every array is unsigned, differences modulo 2^32."""
    kept = [line for line in lines if len(line) > 1]
    lengths = np.asarray([len(line) for line in kept], dtype=np.uint32)
    flat = np.concatenate(kept) if kept else np.empty((0, 2))
    arrays: dict[str, NDArray[Any]] = {"lengths": lengths}
    for axis, name in enumerate(("x", "y")):
        whole = degrees_as_integers(flat[:, axis], decimals=decimals)
        step = whole.copy()
        step[1:] -= whole[:-1]
        # Small negative steps as small odd numbers: most planes become zeros.
        signed = step.astype(np.int32)
        arrays[name] = ((signed << 1) ^ (signed >> 31)).astype(np.uint32)
    arrays.update(more or {})
    return pack(arrays, texts=texts, facts={"decimals": decimals, **(facts or {})})


def packed_contours(contours: Iterable[ContourLine], *, middle: float, tolerance: float) -> str:
    """Isolines with their levels; points that a pixel would swallow are left out."""
    names: dict[str, int] = {}
    units: list[str] = []
    lines, layer, levels = [], [], []
    for contour in contours:
        line = unrolled(contour.coordinates, middle)
        if len(line) < 2:
            continue
        if contour.layer not in names:
            names[contour.layer] = len(names)
            units.append(contour.unit)
        lines.append(_thinned(line, tolerance))
        layer.append(names[contour.layer])
        levels.append(float(contour.level))
    return packed_lines(
        lines,
        decimals=LINE_DECIMALS,
        facts={"levels": levels},
        texts={"layers": list(names), "units": units},
        more={"layer": np.asarray(layer, dtype=np.uint16)},
    )


def _thinned(line: NDArray[np.float64], tolerance: float) -> NDArray[np.float64]:
    from shapely import LineString, get_coordinates

    return np.asarray(get_coordinates(LineString(line).simplify(tolerance)), dtype=np.float64)


def packed_routes(routes: Sequence[Route], *, middle: float) -> str:
    """Day tracks of crews."""
    kept = [route for route in routes if len(route.coordinates) > 1]
    return packed_lines(
        [unrolled(np.asarray(route.coordinates, dtype=np.float64), middle) for route in kept],
        decimals=LINE_DECIMALS,
        texts={"crews": [route.crew for route in kept], "days": [route.day for route in kept]},
    )


def packed_basemap(basemap: Basemap, box: Box) -> str:
    """Land and borders cut to a box (west, south, east, north; may run past 180°)."""
    land = [piece for ring in basemap.land for piece in _cut(ring, box, closed=True)]
    borders = [piece for line in basemap.borders for piece in _cut(line, box, closed=False)]
    edges = [round((edge + 720.0) * 10**BASE_DECIMALS) for edge in box]
    return packed_lines([*land, *borders], decimals=BASE_DECIMALS, facts={"land": len(land), "edges": edges})


def _cut(line: NDArray[np.float64], box: Box, *, closed: bool) -> list[NDArray[np.float64]]:
    """Pieces of a ring or line inside a box, for every turn of the world that reaches it."""
    from shapely import LineString, Polygon, clip_by_rect, get_coordinates, get_parts

    given = _without_jumps(np.asarray(line, dtype=np.float64).reshape(-1, 2))
    if len(given) < (4 if closed else 2):
        return []
    west, south, east, north = box
    pieces = []
    for turn in (-360.0, 0.0, 360.0):
        x = given[:, 0] + turn
        if x.max() < west or x.min() > east or given[:, 1].max() < south or given[:, 1].min() > north:
            continue
        moved = np.column_stack([x, given[:, 1]])
        shape = Polygon(moved) if closed else LineString(moved)
        # Outlines at this scale touch themselves here and there; clipping needs a valid shape.
        cut = clip_by_rect(shape.buffer(0) if closed and not shape.is_valid else shape, *box)
        for part in get_parts(cut):
            rings = [part.exterior, *part.interiors] if part.geom_type == "Polygon" else [part]
            pieces += [get_coordinates(ring) for ring in rings if ring.geom_type != "Point"]
    return [np.round(piece, BASE_DECIMALS) for piece in pieces if len(piece) > 1]


def _without_jumps(line: NDArray[np.float64]) -> NDArray[np.float64]:
    """Carry a line on over 180° where it was broken; the long edge along a pole is meant and stays."""
    if len(line) < 2 or np.abs(np.diff(line[:, 0])).max() <= 180.0:
        return line
    step = np.diff(line[:, 0])
    at_pole = np.abs(line[1:, 1]) > 89.5
    turns = np.where(at_pole, 0.0, np.round(step / 360.0))
    out = line.copy()
    out[1:, 0] -= 360.0 * np.cumsum(turns)
    return out
