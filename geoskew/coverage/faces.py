"""The map between the contours: its pieces, the levels between which each piece lies, and their order."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any, Final

import numpy as np
from numpy.typing import NDArray

from geoskew.coverage.features import PRECISION_DEG, Feature
from geoskew.errors import InputError, Problem

# An open line is cut by the map's edge: its ends lie there, within this share of the map's diagonal.
EDGE_SHARE: Final = 0.05
# A line whose ends are nearly together was meant to be closed.
GAP_SHARE: Final = 0.1


@dataclass(frozen=True)
class Face:
    """A piece of the map without contours inside: its area and what is known of the level in it.

    Attributes
    ----------
    area : shapely polygon
        Degrees.
    kind : str
        "between" two contours, "summit" above one, "hollow" below one, "outside" of the lowest one.
    low, high : float
        The levels, dBW, between which the field stays; infinite where none is known.
    """

    area: Any
    kind: str
    low: float
    high: float


def refuse_crossings(lines: Sequence[Feature]) -> None:
    """Refuse contours that cross or touch, and lines that cross themselves.

    Raises
    ------
    InputError
        Naming both features and where they meet.
    """
    import shapely

    problems = [f"{line} crosses itself; mend the line" for line in lines if not line.geometry.is_simple]
    tree = shapely.STRtree([line.geometry for line in lines])
    pairs = tree.query([line.geometry for line in lines], predicate="intersects")
    for first, second in zip(*pairs, strict=True):
        if first >= second or lines[first].level == lines[second].level:
            continue
        where = lines[first].geometry.intersection(lines[second].geometry).representative_point()
        problems.append(
            f"{lines[first]} and {lines[second]} meet near longitude {where.x:.3f}, latitude"
            f" {where.y:.3f}; contours of different levels never meet: mend one of them"
        )
    if problems:
        raise InputError([Problem(text) for text in problems])


def refuse_gaps(lines: Sequence[Feature], hull: Any) -> None:
    """Refuse open lines that do not end at the map's edge.

    Raises
    ------
    InputError
        Naming the feature and the place of its end.
    """
    import shapely

    problems = []
    diagonal = float(np.hypot(*np.diff(np.reshape(hull.bounds, (2, 2)), axis=0)[0]))
    for line in lines:
        if line.geometry.is_closed:
            continue
        points = shapely.get_coordinates(line.geometry)
        gap = float(np.hypot(*(points[-1] - points[0])))
        spacing = float(np.hypot(*np.diff(points, axis=0).T).max())
        away = [hull.boundary.distance(shapely.Point(end)) for end in (points[0], points[-1])]
        almost = gap < GAP_SHARE * line.geometry.length
        if almost and (gap <= 1.5 * spacing or max(away) > EDGE_SHARE * diagonal):
            problems.append(
                f"{line} is not closed: its ends at longitude {points[0][0]:.3f}, latitude"
                f" {points[0][1]:.3f} lie {gap:.3g}° apart; close the line"
            )
        elif max(away) > EDGE_SHARE * diagonal:
            end = points[0] if away[0] > away[1] else points[-1]
            problems.append(
                f"{line} ends inside the map, at longitude {end[0]:.3f}, latitude {end[1]:.3f}; a contour"
                " is closed or runs to the map's edge: complete the line"
            )
    if problems:
        raise InputError([Problem(text) for text in problems])


def faces_of(lines: Sequence[Feature]) -> list[Face]:
    """Cut the convex hull of all contours into faces, each with the levels that hold in it.

    Raises
    ------
    InputError
        Where a face lies between levels that are not neighbours, or a higher level encloses a lower.
    """
    import shapely

    hull = shapely.union_all([line.geometry for line in lines]).convex_hull
    refuse_gaps(lines, hull)
    areas = _cut(lines, hull)
    borders = _borders(areas, lines)
    _refuse_disorder(lines, borders)
    levels = sorted({line.level for line in lines})
    return [
        _face(area, border, areas, borders, lines, levels, hull)
        for area, border in zip(areas, borders, strict=True)
    ]


def _cut(lines: Sequence[Feature], hull: Any) -> list[Any]:
    """Polygons between contours, the hull and the short ways from cut ends to the hull."""
    import shapely

    cut = [line.geometry for line in lines if not line.geometry.is_closed]
    ends = [shapely.get_point(line, number) for line in cut for number in (0, -1)]
    ways = [way for way in shapely.shortest_line(ends, hull.boundary) if way.length > PRECISION_DEG]
    everything = [line.geometry for line in lines] + [hull.boundary, *ways]
    net = shapely.union_all(everything, grid_size=PRECISION_DEG)
    pieces = shapely.get_parts(shapely.polygonize(shapely.get_parts(net)))
    smallest = 1e-9 * hull.area
    return [piece for piece in pieces if piece.area > smallest]


def _borders(areas: Sequence[Any], lines: Sequence[Feature]) -> list[frozenset[int]]:
    """Numbers of the contour lines that bound each face, found by the middles of their segments."""
    import shapely
    from scipy.spatial import cKDTree

    middles = [_middles(line.geometry) for line in lines]
    owner = np.repeat(np.arange(len(lines)), [len(points) for points in middles])
    tree = cKDTree(np.concatenate(middles))
    borders = []
    for area in areas:
        points = np.concatenate([_middles(ring) for ring in shapely.get_parts(area.boundary)])
        distance, nearest = tree.query(points, distance_upper_bound=5 * PRECISION_DEG)
        borders.append(frozenset(int(one) for one in owner[nearest[np.isfinite(distance)]]))
    return borders


def _middles(line: Any) -> NDArray[np.float64]:
    """Middles (N, 2) of the segments of one line."""
    import shapely

    points = shapely.get_coordinates(line)
    return np.asarray(0.5 * (points[1:] + points[:-1]))


def _refuse_disorder(lines: Sequence[Feature], borders: Sequence[frozenset[int]]) -> None:
    """Refuse levels that do not follow each other from the outside in."""
    problems = [*_leaps(lines, borders), *_turned_round(lines)]
    if problems:
        raise InputError([Problem(text) for text in dict.fromkeys(problems)])


def _leaps(lines: Sequence[Feature], borders: Sequence[frozenset[int]]) -> list[str]:
    """Faces between two levels that are not neighbours."""
    levels = sorted({line.level for line in lines})
    problems = []
    for border in borders:
        ranks = sorted(border, key=lambda number: lines[number].level)
        if len(ranks) < 2:
            continue
        low, high = lines[ranks[0]], lines[ranks[-1]]
        between = [level for level in levels if low.level < level < high.level]
        if between:
            missing = ", ".join(f"{level:g}" for level in between)
            problems.append(
                f"{high} follows {low} without a contour of {missing} dBW between them: levels out of"
                " order; check the levels or complete the contours"
            )
    return problems


def _turned_round(lines: Sequence[Feature]) -> list[str]:
    """Closed contours that lie within an outermost one of a higher level."""
    import shapely

    closed = [line for line in lines if line.geometry.is_closed]
    if not closed:
        return []
    discs = [shapely.Polygon(line.geometry) for line in closed]
    outermost = list(range(len(closed)))
    for inner, outer in zip(*shapely.STRtree(discs).query(discs, predicate="within"), strict=True):
        if discs[outer].area > discs[outermost[inner]].area:
            outermost[inner] = outer
    return [
        f"{line} lies within {closed[outer]}: levels out of order; the outermost contour has the lowest"
        " level, so check the levels"
        for line, outer in zip(closed, outermost, strict=True)
        if line.level < closed[outer].level
    ]


def _face(
    area: Any,
    border: frozenset[int],
    areas: Sequence[Any],
    borders: Sequence[frozenset[int]],
    lines: Sequence[Feature],
    levels: Sequence[float],
    hull: Any,
) -> Face:
    """Say what is known of the level in one face."""
    own = {lines[number].level for number in border}
    if not own:
        return Face(area, "between", -np.inf, np.inf)
    if len(own) == 2:
        return Face(area, "between", min(own), max(own))
    (level,) = own
    rank = levels.index(level)
    beyond = {
        lines[number].level
        for other, numbers in zip(areas, borders, strict=True)
        if other is not area and numbers & border
        for number in numbers
    }
    at_edge = area.exterior.intersection(hull.boundary.buffer(10 * PRECISION_DEG)).length > 0.0
    rises = min(beyond, default=level) < level
    falls = max(beyond, default=level) > level
    if falls and not rises:
        return Face(area, "outside" if at_edge else "hollow", -np.inf, level)
    if rises and not falls:
        return Face(area, "summit", level, np.inf)
    return Face(area, "between", levels[max(rank - 1, 0)], levels[min(rank + 1, len(levels) - 1)])
