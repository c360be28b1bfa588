"""From the scenario's ``[region]`` to a grid, snapped so that neighbouring runs share their cells."""

from __future__ import annotations

import math
from typing import TYPE_CHECKING, Any

import numpy as np

from geoskew.errors import InputError, Problem
from geoskew.region.grid import GEOGRAPHIC_CRS, Grid, from_geographic
from geoskew.region.outline import laid_out, read_outline, span

if TYPE_CHECKING:
    from geoskew.scenario import Scenario

# About four orders of magnitude above a continent at 1 km; beyond it a step is a slip of the pen.
MOST_CELLS = 100_000_000_000
# Bounds that miss a multiple of the step by less than this share of it lie on the multiple.
SNAP = 1e-6
# Points along each edge of bounds that are brought into a projected CRS.
EDGE_POINTS = 513

Bounds = tuple[float, float, float, float]


def grid_of(scenario: Scenario) -> Grid:
    """The grid of a scenario's region.

    Returns
    -------
    Grid
        Geographic: edges on multiples of the step from −180 and −90. Projected: edges on multiples
        of the step from 0. The grid reaches outward to whole cells, but never past a pole nor more
        than once around the Earth.

    Raises
    ------
    MissingPartError
        If the scenario has no ``[region]``.
    InputError
        If bounds, step, CRS and outline do not fit each other, the outline cannot be read, no cell
        lies within it, or the grid would be absurdly big.
    """
    scenario.require("region", for_what="a raster")
    region = scenario.region
    assert region is not None  # held by the line above
    try:
        grid = _projected(region) if region.step_m is not None else _geographic(region)
        _check_size(grid, "region.step_deg" if grid.is_geographic else "region.step_m")
    except InputError as error:
        # The scenario file is named where the problem is not within another file.
        problems = [
            found if found.file else Problem(found.message, scenario.path, found.line, found.key)
            for found in error.problems
        ]
        raise InputError(problems) from error
    if not grid.any_inside():
        message = "no cell's centre lies within the outline: give a smaller step or other bounds"
        raise InputError(Problem(message, file=region.outline))
    return grid


def _geographic(region: Any) -> Grid:
    if region.step_deg is None:
        raise _wrong("step_deg", "is missing; give step_deg, or crs with step_m")
    if region.crs is not None and str(region.crs).upper() not in (GEOGRAPHIC_CRS, "OGC:CRS84"):
        raise _wrong(
            "crs", f"{region.crs} goes with step_m; a grid with step_deg is {GEOGRAPHIC_CRS}, leave crs out"
        )
    outline = None if region.outline is None else read_outline(region.outline, crs=GEOGRAPHIC_CRS)
    if region.bounds_deg is not None:
        west, south, east, north = _checked(region.bounds_deg)
    elif outline is not None:
        (west, east), (_, south, _, north) = span(outline), outline.bounds
    else:
        raise _wrong("bounds_deg", "is missing; give bounds_deg or outline")
    step = _step(region.step_deg, "step_deg", width=east - west, height=north - south, unit="°")
    first = math.floor((west + 180.0) / step + SNAP)
    last = min(math.ceil((east + 180.0) / step - SNAP), first + math.floor(360.0 / step + SNAP))
    low = math.floor((south + 90.0) / step + SNAP)
    high = min(math.ceil((north + 90.0) / step - SNAP), math.floor(180.0 / step + SNAP))
    # Rounded so that multiples of a decimal step are the decimal numbers that they look like.
    corner = round(first * step - 180.0, 12), round(high * step - 90.0, 12)
    grid = Grid(GEOGRAPHIC_CRS, *corner, step, last - first, high - low)
    return _with_outline(grid, None if outline is None else laid_out(outline, grid.west, grid.east))


def _projected(region: Any) -> Grid:
    from pyproj import CRS
    from pyproj.exceptions import CRSError

    if region.crs is None:
        raise _wrong("crs", "is missing; step_m needs a projected CRS, such as an EPSG code")
    try:
        crs = CRS.from_user_input(region.crs)
    except CRSError as error:
        raise _wrong("crs", f"{region.crs!r} is not a CRS that is known here; give an EPSG code") from error
    if not crs.is_projected:
        raise _wrong("crs", f"{region.crs} is not projected; give step_deg without crs, or a projected CRS")
    name = str(crs.to_string())
    outline = None if region.outline is None else read_outline(region.outline, crs=name)
    if region.bounds_deg is not None:
        west, south, east, north = projected_bounds(_checked(region.bounds_deg), name)
    elif outline is not None:
        west, south, east, north = outline.bounds
    else:
        raise _wrong("bounds_deg", "is missing; give bounds_deg or outline")
    unit = crs.axis_info[0].unit_conversion_factor
    width, height = (east - west) * unit, (north - south) * unit
    step = _step(region.step_m, "step_m", width=width, height=height, unit=" m") / unit
    first, last = math.floor(west / step + SNAP), math.ceil(east / step - SNAP)
    low, high = math.floor(south / step + SNAP), math.ceil(north / step - SNAP)
    grid = Grid(name, first * step, high * step, step, last - first, high - low)
    return _with_outline(grid, outline)


def projected_bounds(bounds: Bounds, crs: str) -> Bounds:
    """Bounds in a projected CRS of a region between two meridians and two parallels.

    Parameters
    ----------
    bounds : tuple of float
        West, south, east, north in degrees; east may run past 180.
    crs : str
        A projected CRS.

    Returns
    -------
    tuple of float
        Smallest x, smallest y, largest x, largest y on the densified edges.

    Raises
    ------
    InputError
        If the region reaches where the CRS has no coordinates, or the CRS tears it apart.
    """
    west, south, east, north = bounds
    along, up = np.linspace(west, east, EDGE_POINTS), np.linspace(south, north, EDGE_POINTS)
    edges = ((along, south), (along, north), (west, up), (east, up))
    points = [np.broadcast_arrays(np.asarray(one, float), np.asarray(two, float)) for one, two in edges]
    moved = np.array([from_geographic(crs).transform(x, y) for x, y in points])  # (edge, axis, point)
    if not np.isfinite(moved).all():
        edge, _, where = np.argwhere(~np.isfinite(moved))[0]
        near = f"longitude {points[edge][0][where]:g}, latitude {points[edge][1][where]:g}"
        raise _wrong(
            "bounds_deg", f"{crs} has no coordinates at {near}; choose another CRS or smaller bounds"
        )
    low, high = moved.min(axis=(0, 2)), moved.max(axis=(0, 2))
    # Neighbouring points of an edge lie close together, unless the CRS is cut open between them.
    if (np.abs(np.diff(moved, axis=2)).max(axis=(0, 2)) > 0.25 * (high - low)).any():
        raise _wrong(
            "bounds_deg", f"{crs} tears or stretches the region apart; choose a CRS that is centred on it"
        )
    return float(low[0]), float(low[1]), float(high[0]), float(high[1])


def _checked(bounds: Bounds) -> Bounds:
    west, south, east, north = (float(value) for value in bounds)
    if not all(math.isfinite(value) for value in (west, south, east, north)):
        raise _wrong("bounds_deg", "holds a value that is not a number; give west, south, east, north")
    if not -90.0 <= south < north <= 90.0:
        raise _wrong("bounds_deg", f"south {south:g}, north {north:g}: give −90 ≤ south < north ≤ 90")
    if west > east:
        east += 360.0
    if not 0.0 < east - west <= 360.0 or not -180.0 <= west <= 360.0:
        raise _wrong(
            "bounds_deg", f"west {west:g} and east {east:g}: give two longitudes, at most one circle apart"
        )
    if west >= 180.0:  # the same place by its usual name, so that neighbouring runs share cells
        west, east = west - 360.0, east - 360.0
    return west, south, east, north


def _step(step: float, key: str, *, width: float, height: float, unit: str) -> float:
    if not (math.isfinite(step) and step > 0.0):
        raise _wrong(key, f"{step:g} is not above zero")
    if step > min(width, height) * (1.0 + SNAP):
        message = (
            f"{step:g} is larger than the region, which is {width:.6g}{unit} wide and {height:.6g}{unit} high"
        )
        raise _wrong(key, message)
    return float(step)


def _with_outline(grid: Grid, outline: Any) -> Grid:
    if outline is None:
        return grid
    return Grid(grid.crs, grid.west, grid.north, grid.step, grid.columns, grid.rows, outline)


def _check_size(grid: Grid, key: str) -> None:
    if min(grid.columns, grid.rows) < 1:
        raise _wrong(key, f"{grid.step:g} leaves no whole cell in the region; give a smaller step")
    if grid.cells > MOST_CELLS:
        raise _wrong(
            key,
            f"{grid.step:g} makes {grid.columns:,} × {grid.rows:,} cells; the most is {MOST_CELLS:,}: "
            "give a larger step or a smaller region",
        )


def _wrong(key: str, message: str) -> InputError:
    return InputError(Problem(message, key=key if key.startswith("region.") else f"region.{key}"))
