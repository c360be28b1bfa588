"""Published contours as drawn: one list of plain lines with their levels, in one unbroken longitude.

Polygons and lines are both accepted. A polygon of a level is the area that receives at least that
level; nested areas and bands (areas with the next level cut out) mean the same and come out as the same
lines. What cannot be a contour is refused, and the message names the feature.
"""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from typing import Any, Final

import numpy as np
from numpy.typing import NDArray

from geoskew.errors import InputError, Problem

LINES: Final = ("LineString", "LinearRing", "MultiLineString")
POLYGONS: Final = ("Polygon", "MultiPolygon")
# Coordinates are compared on this grid, degrees: about 1 cm, finer than any drawn contour.
PRECISION_DEG: Final = 1e-7

# Ends no further apart than this, degrees, are one point: about 10 m.
CLOSE_ENOUGH_DEG: Final = 1e-4


@dataclass(frozen=True)
class Feature:
    """One drawn feature: a shapely geometry in degrees, its level in dBW and what to call it."""

    geometry: Any
    level: float
    name: str

    def __str__(self) -> str:
        return f"{self.name} ({self.level:g} dBW)"


def features_of(
    geometries: Sequence[Any], levels: Sequence[float], names: Sequence[str] | None = None
) -> list[Feature]:
    """Pair geometries and levels, refuse what cannot be a contour, and unwrap the longitudes.

    Raises
    ------
    InputError
        With every feature that has no geometry, another kind of geometry, no level, no length or
        area, coordinates that are not degrees, or a ring that crosses itself.
    """
    if names is None:
        names = [f"feature {number}" for number in range(1, len(geometries) + 1)]
    given = [
        Feature(geometry, float(level), name)
        for geometry, level, name in zip(geometries, levels, names, strict=True)
    ]
    problems = [Problem(text) for feature in given for text in _faults(feature)]
    if problems:
        raise InputError(problems)
    if len({feature.level for feature in given}) < 2:
        raise InputError(
            f"contours: {len({feature.level for feature in given})} level; at least two levels are needed"
            " to tell how the power falls; give more contours or eirp_dbw"
        )
    return unwrap(given)


def _faults(feature: Feature) -> Iterable[str]:
    import shapely

    geometry = feature.geometry
    if not np.isfinite(feature.level):
        yield f"{feature.name}: level {feature.level} is not a number; give each contour its level in dBW"
    if geometry is None or geometry.is_empty:
        yield f"{feature}: has no geometry; delete the feature or draw it"
        return
    if geometry.geom_type not in LINES + POLYGONS:
        yield f"{feature}: is a {geometry.geom_type}; contours are lines or polygons"
        return
    coordinates = shapely.get_coordinates(geometry)
    if not np.all(np.isfinite(coordinates)):
        yield f"{feature}: has a coordinate that is not a number"
        return
    worst = coordinates[np.argmax(np.abs(coordinates).max(axis=1))]
    if np.any(np.abs(coordinates[:, 1]) > 90.0) or np.any(np.abs(coordinates[:, 0]) > 360.0):
        yield (
            f"{feature}: the coordinate ({worst[0]:g}, {worst[1]:g}) is not a longitude and a latitude in"
            " degrees; the coordinate reference system is wrong or missing: state the one it was drawn in"
        )
    elif geometry.geom_type in POLYGONS and geometry.area == 0.0:
        yield f"{feature}: encloses no area; close its ring around the area"
    elif geometry.geom_type in POLYGONS and not geometry.is_valid:
        yield f"{feature}: is not a clean polygon ({shapely.is_valid_reason(geometry)}); mend its ring"
    elif geometry.length == 0.0:
        yield f"{feature}: has no length; delete the feature"


def unwrap(features: Sequence[Feature]) -> list[Feature]:
    """Shift longitudes by whole turns so that no line jumps and all lie around one centre."""
    import shapely

    every = np.concatenate([shapely.get_coordinates(feature.geometry)[:, 0] for feature in features])
    turns = np.exp(1j * np.deg2rad(every)).sum()
    centre = float(np.rad2deg(np.angle(turns)))

    def shift(coordinates: NDArray[np.float64]) -> NDArray[np.float64]:
        longitude = np.unwrap(coordinates[:, 0], period=360.0)
        longitude = longitude - 360.0 * np.round((longitude.mean() - centre) / 360.0)
        return np.column_stack([longitude, coordinates[:, 1]])

    def whole(geometry: Any) -> Any:
        # Part by part: each ring or line is unwrapped on its own.
        if hasattr(geometry, "geoms"):
            return type(geometry)([whole(part) for part in geometry.geoms])
        if geometry.geom_type == "Polygon":
            rings = [shift(shapely.get_coordinates(ring)) for ring in geometry.interiors]
            return shapely.Polygon(shift(shapely.get_coordinates(geometry.exterior)), rings)
        return shapely.LineString(shift(shapely.get_coordinates(geometry)))

    return [Feature(whole(feature.geometry), feature.level, feature.name) for feature in features]


def lines_of(features: Sequence[Feature]) -> list[Feature]:
    """Turn drawn features into contour lines, one feature a connected line of one level.

    Raises
    ------
    InputError
        For polygons that cross each other, or a lower level drawn inside of a higher one.
    """
    import shapely

    if all(feature.geometry.geom_type in POLYGONS for feature in features):
        features = _boundaries(features)
    lines: list[Feature] = []
    for level in sorted({feature.level for feature in features}):
        same = [feature for feature in features if feature.level == level]
        drawn = shapely.union_all([_outline(feature) for feature in same], grid_size=PRECISION_DEG)
        merged = shapely.get_parts(shapely.line_merge(drawn))
        lines.extend(Feature(_closed(line), level, _drawn_by(line, same)) for line in merged)
    return lines


def _closed(line: Any) -> Any:
    """Close a line whose ends are as good as one point."""
    import shapely

    points = shapely.get_coordinates(line)
    if len(points) > 3 and 0.0 < np.hypot(*(points[-1] - points[0])) <= CLOSE_ENOUGH_DEG:
        return shapely.LineString(np.concatenate([points[:-1], points[:1]]))
    return line


def _drawn_by(line: Any, features: Sequence[Feature]) -> str:
    """Name of the feature that a merged line mostly comes from."""
    middle = line.interpolate(0.5, normalized=True)
    return min(features, key=lambda feature: float(_outline(feature).distance(middle))).name


def _outline(feature: Feature) -> Any:
    """Lines of a feature: itself, or the rings of a polygon."""
    geometry = feature.geometry
    return geometry.boundary if geometry.geom_type in POLYGONS else geometry


def _boundaries(features: Sequence[Feature]) -> list[Feature]:
    """Contour lines of polygons: the edge of the area at or above each level, without the map's edge."""
    import shapely

    snapped = [
        Feature(shapely.set_precision(feature.geometry, PRECISION_DEG), feature.level, feature.name)
        for feature in features
    ]
    _refuse_disorder(snapped)
    levels = sorted({feature.level for feature in snapped})
    areas = [
        shapely.union_all([feature.geometry for feature in snapped if feature.level >= level])
        for level in levels
    ]
    edges = [area.boundary for area in areas]
    west, south, east, north = shapely.total_bounds(areas)
    frame = shapely.box(west, south, east, north).boundary.buffer(10 * PRECISION_DEG)
    lines: list[Feature] = []
    for index, level in enumerate(levels):
        others = [edge for number, edge in enumerate(edges) if number != index]
        shared = shapely.union_all(others).buffer(10 * PRECISION_DEG)
        line = edges[index]
        # Where areas of two levels share an edge, the map ends there: it is no contour.
        if line.intersection(shared).length > 1e-4 * line.length:
            line = line.difference(shared).difference(frame)
        if not line.is_empty:
            same = [feature for feature in features if feature.level == level]
            lines.extend(Feature(part, level, _drawn_by(part, same)) for part in shapely.get_parts(line))
    return lines


def _refuse_disorder(features: Sequence[Feature]) -> None:
    """Refuse polygons that cross, and a lower level that lies within a higher one."""
    import shapely

    areas = [feature.geometry for feature in features]
    pairs = shapely.STRtree(areas).query(areas, predicate="intersects")
    problems = []
    for first, second in zip(*pairs, strict=True):
        low, high = features[first], features[second]
        if low.level >= high.level:
            continue
        common = low.geometry.intersection(high.geometry).area
        if common > (1.0 - 1e-6) * low.geometry.area:
            problems.append(
                f"{low} lies within {high}: levels out of order; the lower level encloses the higher one,"
                " so check the levels"
            )
        elif 1e-6 * high.geometry.area < common < (1.0 - 1e-6) * high.geometry.area:
            where = low.geometry.boundary.intersection(high.geometry.boundary).representative_point()
            problems.append(
                f"{low} and {high} cross near longitude {where.x:.3f}, latitude {where.y:.3f};"
                " contours of different levels never meet: mend one of them"
            )
    if problems:
        raise InputError([Problem(text) for text in problems])
