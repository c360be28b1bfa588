"""From contour lines and the faces between them to a surface: plane, lattice, bounds, summits, reach."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any, Final

import numpy as np
from numpy.typing import ArrayLike, NDArray

from geoskew.angles import wrap_longitude
from geoskew.coverage.faces import Face
from geoskew.coverage.features import Feature
from geoskew.coverage.spline import Lattice, Surface, ThinPlate

Array = NDArray[np.float64]

# Cells along the longer side of the map: enough for a gap between contours to hold two of them. The
# second number of the most serves maps so steep that the first fit misses a level by more than the misfit.
FEWEST_CELLS: Final = 48
MOST_CELLS: Final = (96, 128)
MISFIT_DB: Final = 0.1
# The first fit, off which the natural rise of summits is read, has a lattice of this many times the step.
COARSER: Final = 1.6
# Points along a contour, lattice steps apart.
SPACING: Final = 0.4
# The field ends at the latest this many typical gaps between the two lowest levels outside of them.
REACH_GAPS: Final = 1.5
# A bound counts as kept when the surface passes it by less than this share of a contour step.
SLACK: Final = 0.01
# Tension of a face whose bounds are passed: first, factor of the next rounds, last. At the last one the
# plate is a membrane, which has no hills or hollows of its own.
TENSION: Final = (0.3, 8.0, 19.0)
# Weight of a passed bound against 1 of a point on a contour, and the most rounds of holding.
PENALTY: Final = 3.0
ROUNDS: Final = 8


@dataclass(frozen=True)
class Plane:
    """Plate carrée around a middle longitude, longitudes shortened by the cosine of a middle latitude."""

    longitude: float
    latitude: float

    @property
    def _shrink(self) -> float:
        return float(np.cos(np.deg2rad(self.latitude)))

    def coordinates(self, longitude: ArrayLike, latitude: ArrayLike) -> tuple[Array, Array]:
        """Plane coordinates, degrees of latitude, of places in degrees; any turn of longitude."""
        turned = wrap_longitude(np.asarray(longitude, dtype=np.float64) - self.longitude)
        return turned * self._shrink, np.asarray(latitude, dtype=np.float64)

    def geometry(self, drawn: Any) -> Any:
        """Bring a shapely geometry of unwrapped degrees into the plane."""
        import shapely

        scale = np.array([self._shrink, 1.0])
        return shapely.transform(drawn, lambda points: (points - [self.longitude, 0.0]) * scale)


@dataclass(frozen=True)
class Samples:
    """A raster of points over the lattice, flattened, each with its face (−1: none) and its bounds."""

    x: Array
    y: Array
    face: NDArray[np.intp]
    low: Array
    high: Array


class Fitting:
    """One fit, step by step, in the plane."""

    def __init__(
        self, lines: Sequence[Feature], faces: Sequence[Face], levels: tuple[float, ...], peak: float | None
    ) -> None:
        import shapely

        west, south, east, north = shapely.total_bounds([line.geometry for line in lines])
        self.plane = Plane(0.5 * (west + east), 0.5 * (south + north))
        self.levels = levels
        self.peak = peak
        self.lines = [Feature(self.plane.geometry(one.geometry), one.level, one.name) for one in lines]
        self.faces = [Face(self.plane.geometry(one.area), one.kind, one.low, one.high) for one in faces]
        gaps = [_gaps(line, self.lines) for line in self.lines]
        lowest = [gap for line, gap in zip(self.lines, gaps, strict=True) if line.level == levels[0]]
        self.reach = REACH_GAPS * float(np.median(np.concatenate(lowest)))
        self.gap = float(np.percentile(np.concatenate(gaps), 10))
        self.lattice = self._lattice(MOST_CELLS[0])
        self.known = shapely.union_all([face.area for face in self.faces if face.kind != "outside"])

    def _lattice(self, most_cells: float, coarser: float = 1.0) -> Lattice:
        import shapely

        west, south, east, north = shapely.total_bounds([line.geometry for line in self.lines])
        longest = max(east - west, north - south) + 2.0 * self.reach
        step = coarser * min(max(0.5 * self.gap, longest / most_cells), longest / FEWEST_CELLS)
        edge = self.reach + step
        return Lattice.over((west - edge, south - edge, east + edge, north + edge), step)

    def surface(self) -> tuple[Surface, float]:
        """Fit the surface; also give the largest misfit along the contours, dB."""
        for most_cells in MOST_CELLS:
            self.lattice = self._lattice(most_cells)
            x, y, values = self._along()
            coarse = ThinPlate(self._lattice(most_cells, COARSER)).solve(x, y, values, np.ones(x.size))
            if np.abs(coarse.values(x, y) - values).max() <= MISFIT_DB:
                break
        samples = self._samples()
        added = self._summits(coarse, samples)
        data = [np.concatenate([old, new]) for old, new in zip((x, y, values), added, strict=True)]
        surface = self._held(ThinPlate(self.lattice), samples, data)
        return surface, float(np.abs(surface.values(x, y) - values).max())

    def _along(self) -> tuple[Array, Array, Array]:
        """Points along all contours and their levels."""
        points, values = [], []
        for line in self.lines:
            points.append(_spread(line.geometry, SPACING * self.lattice.step))
            values.append(np.full(len(points[-1]), line.level))
        along = np.concatenate(points)
        return along[:, 0], along[:, 1], np.concatenate(values)

    def _samples(self) -> Samples:
        """Two points to a lattice step, with the bounds of the face that each lies in."""
        import shapely

        row, column = self.lattice.nodes(per_step=2)
        x, y = (grid.ravel() for grid in np.broadcast_arrays(row, column))
        points = shapely.points(x, y)
        tree = shapely.STRtree(points)
        number, inside = tree.query([face.area for face in self.faces], predicate="contains")
        face = np.full(x.size, -1, dtype=np.intp)
        face[inside] = number
        lowest, highest = (np.array([getattr(one, key) for one in self.faces]) for key in ("low", "high"))
        low = np.where(face >= 0, lowest[face], -np.inf)
        high = np.where(face >= 0, highest[face], np.inf)
        high[self._beyond_lowest(x, y, face < 0)] = self.levels[0]
        return Samples(x, y, face, low, high)

    def _beyond_lowest(self, x: Array, y: Array, free: NDArray[np.bool_]) -> NDArray[np.intp]:
        """Points without a face that lie beyond the lowest contour, where that is the hull's own edge."""
        import shapely
        from scipy.spatial import cKDTree

        hull = shapely.union_all([line.geometry for line in self.lines]).convex_hull
        beyond = np.flatnonzero(free & ~shapely.contains_xy(hull, x, y))
        spacing = 0.25 * self.lattice.step
        lowest = [line.geometry for line in self.lines if line.level == self.levels[0]]
        contour = cKDTree(np.concatenate([_spread(line, spacing) for line in lowest]))
        points = np.column_stack([x[beyond], y[beyond]])
        to_contour, _ = contour.query(points)
        to_hull, _ = cKDTree(_spread(hull.boundary, spacing)).query(points)
        return np.asarray(beyond[to_contour <= to_hull + 0.5 * spacing], dtype=np.intp)

    def _summits(self, surface: Surface, samples: Samples) -> tuple[Array, Array, Array]:
        """Points inside the summits and hollows with the values of the bent rise; bounds are set as well."""
        values = surface.values(samples.x, samples.y)
        chosen, bent = [], []
        for number, face in enumerate(self.faces):
            if face.kind not in ("summit", "hollow"):
                continue
            sign, level = (1.0, face.low) if face.kind == "summit" else (-1.0, face.high)
            stated = self.peak is not None and face.kind == "summit" and level == self.levels[-1]
            inside = np.flatnonzero(samples.face == number)
            rise = np.maximum(sign * (values[inside] - level), 0.0)
            natural = float(rise.max(initial=0.0))
            limit = self.peak - level if stated and self.peak is not None else self._half_step(level, sign)
            (samples.high if sign > 0 else samples.low)[inside] = level + sign * limit
            if natural > 0.0 and (stated or natural > limit):
                chosen.append(inside)
                bent.append(level + sign * bend(rise, natural, limit))
        if not chosen:
            return np.empty(0), np.empty(0), np.empty(0)
        where = np.concatenate(chosen)
        return samples.x[where], samples.y[where], np.concatenate(bent)

    def _half_step(self, level: float, sign: float) -> float:
        """Half of the contour step above (sign 1) or below (−1) a level; of the nearest one at the ends."""
        rank = self.levels.index(level) + (0 if sign > 0 else -1)
        rank = min(max(rank, 0), len(self.levels) - 2)
        return 0.5 * (self.levels[rank + 1] - self.levels[rank])

    def _held(self, plate: ThinPlate, samples: Samples, data: list[Array]) -> Surface:
        """Fit, and hold the surface to the bounds of its faces with one-sided penalties, round by round."""
        x, y, wanted = data
        slack = SLACK * min(np.diff(self.levels))
        plate, surface = self._tightened(plate, samples, data, slack)
        for _ in range(ROUNDS):
            over, values = _excess(surface, samples)
            if over.max() <= slack:
                break
            passed = np.flatnonzero(over > 0.0)
            bound = np.clip(values[passed], samples.low[passed], samples.high[passed])
            surface = plate.solve(
                np.concatenate([x, samples.x[passed]]),
                np.concatenate([y, samples.y[passed]]),
                np.concatenate([wanted, bound]),
                np.concatenate([np.ones(x.size), np.full(passed.size, PENALTY)]),
            )
        return surface

    def _tightened(
        self, plate: ThinPlate, samples: Samples, data: list[Array], slack: float
    ) -> tuple[ThinPlate, Surface]:
        """Fit, with more and more tension in the faces between two contours whose bounds are passed."""
        x, y, wanted = data
        between = np.array([face.kind == "between" for face in self.faces])
        tension = np.zeros(len(self.faces))
        current = plate
        while True:
            surface = current.solve(x, y, wanted, np.ones(x.size))
            over, values = _excess(surface, samples)
            bad = np.unique(samples.face[(over > slack) & (samples.face >= 0)])
            tense = np.flatnonzero(tension > 0.0)
            bad = np.union1d(bad, tense[np.isin(tense, samples.face[_extremes(values, samples)])])
            bad = bad[between[bad] & (tension[bad] < TENSION[2])]
            if bad.size == 0:
                return current, surface
            tension[bad] = np.clip(tension[bad] * TENSION[1], TENSION[0], TENSION[2])
            stretched = np.flatnonzero((samples.face >= 0) & (tension[samples.face] > 0.0))
            here = tension[samples.face[stretched]]
            current = plate.stretched(samples.x[stretched], samples.y[stretched], here)

    def outside(self) -> Array:
        """Distance from the contoured area at the lattice nodes (rows, columns), negative inside of it."""
        import shapely
        from scipy.spatial import cKDTree

        edge = _spread(self.known.boundary, 0.25 * self.lattice.step)
        x, y = np.broadcast_arrays(*self.lattice.nodes())
        distance, _ = cKDTree(edge).query(np.column_stack([x.ravel(), y.ravel()]))
        shapely.prepare(self.known)
        inside = shapely.contains_xy(self.known, x.ravel(), y.ravel())
        return np.asarray(np.where(inside, -distance, distance).reshape(x.shape))


def _excess(surface: Surface, samples: Samples) -> tuple[Array, Array]:
    """How far a surface passes the bounds at the samples, dB, negative within them; and its values."""
    values = surface.values(samples.x, samples.y)
    return np.nan_to_num(np.maximum(values - samples.high, samples.low - values)), values


def _extremes(values: Array, samples: Samples) -> NDArray[np.bool_]:
    """Samples higher or lower than all eight around them, all nine within one face."""
    from scipy.ndimage import maximum_filter, minimum_filter

    shape = (-1, int(np.flatnonzero(np.diff(samples.y))[0]) + 1)
    field, face = values.reshape(shape), samples.face.reshape(shape)
    extreme = (field == maximum_filter(field, 3)) | (field == minimum_filter(field, 3))
    whole = maximum_filter(face, 3) == minimum_filter(face, 3)
    return np.asarray((extreme & whole).ravel(), dtype=np.bool_)


def bend(rise: Array, natural: float, limit: float) -> Array:
    """Bend a rise of 0 to `natural` so that it ends at `limit`; monotone, its slope at 0 unchanged."""
    from scipy.optimize import brentq

    if limit >= natural:
        return np.asarray(rise + (limit - natural) * (rise / natural) ** 2)

    def end(scale: float) -> float:
        return float(-scale * np.expm1(-natural / scale)) - limit

    scale = brentq(end, limit, 1e3 * natural * natural / (natural - limit))
    return np.asarray(-scale * np.expm1(-rise / scale))


def _spread(geometry: Any, spacing: float) -> Array:
    """Give points (N, 2) along lines, at most a spacing apart."""
    import shapely

    points = []
    for line in shapely.get_parts(geometry):
        count = max(int(np.ceil(line.length / spacing)), 2)
        along = shapely.line_interpolate_point(line, np.linspace(0.0, line.length, count + 1))
        points.append(shapely.get_coordinates(along))
    return np.concatenate(points)


def _gaps(line: Feature, lines: Sequence[Feature]) -> Array:
    """Distances from points along one contour to the nearest contour of another level."""
    import shapely

    others = shapely.union_all([other.geometry for other in lines if other.level != line.level])
    points = shapely.points(_spread(line.geometry, line.geometry.length / 60.0))
    return np.asarray(shapely.distance(points, others))
