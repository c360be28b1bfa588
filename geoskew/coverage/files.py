"""Contours from a vector file; with `rasterfiles` the only reader of files for the coverage."""

from __future__ import annotations

import warnings
from dataclasses import replace
from functools import lru_cache
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

from geoskew.coverage.contours import ContourField, fit
from geoskew.errors import InputError, Problem

Array = NDArray[np.float64]


def contour_field(path: Path, field: str, *, peak_dbw: float | None = None) -> ContourField:
    """Read a vector file of published contours and fit a smooth field to it.

    Parameters
    ----------
    path : Path
        Any vector format that GDAL reads, lines or polygons, in any coordinate reference system.
    field : str
        Column with each contour's level, dBW: numbers, or text that reads as a number.
    peak_dbw : float, optional
        EIRP at the highest point, dBW.

    Returns
    -------
    ContourField
        The same object as long as the file does not change.

    Raises
    ------
    InputError
        With the file and the feature: see `read_contours` and `contours.fit`.
    """
    state = path.stat() if path.exists() else None
    stamp = (state.st_mtime_ns, state.st_size) if state else None
    return _contour_field(path, field, peak_dbw, stamp)


@lru_cache(maxsize=16)
def _contour_field(
    path: Path, field: str, peak_dbw: float | None, stamp: tuple[int, int] | None
) -> ContourField:
    geometries, levels, names = read_contours(path, field)
    try:
        return fit(geometries, levels, peak=peak_dbw, names=names)
    except InputError as error:
        raise InputError([replace(problem, file=path) for problem in error.problems]) from error


def read_contours(path: Path, field: str) -> tuple[list[Any], list[float], list[str]]:
    """Read contour geometries in degrees of WGS 84, their levels in dBW and their names.

    Raises
    ------
    InputError
        For a file that cannot be read, has no such column, no features or no coordinate reference
        system, a level that is no number, or a polygon whose ring is not closed.
    """
    import pyogrio
    import shapely
    from pyogrio.errors import DataLayerError, DataSourceError

    try:
        layer = _layer_with(path, field)
        with warnings.catch_warnings():
            # GDAL warns of rings that are not closed; below they are refused by feature.
            warnings.simplefilter("ignore", RuntimeWarning)
            meta, numbers, shapes, columns = pyogrio.raw.read(
                path, layer=layer, columns=[field], return_fids=True, force_2d=True
            )
    except (DataSourceError, DataLayerError) as error:
        raise InputError(Problem(f"cannot be read as a vector file: {error}", file=path)) from error
    if meta["crs"] is None:
        raise InputError(
            Problem(
                "has no coordinate reference system, so its coordinates have no meaning; store it with one"
                " (a .prj file beside a Shapefile, or as GeoPackage or GeoJSON)",
                file=path,
            )
        )
    if len(shapes) == 0:
        raise InputError(Problem("has no features; draw the contours into it", file=path))
    geometries = shapely.from_wkb(shapes, on_invalid="ignore")
    names = [f"feature {number}" for number in numbers]
    levels, problems = [], []
    for name, value, shape, geometry in zip(names, columns[0], shapes, geometries, strict=True):
        level = _number(value)
        levels.append(level)
        if np.isnan(level):
            problems.append(f"{name}: {field} = {value!r} is not a number; give each contour a level in dBW")
        if geometry is None and shape is not None:
            problems.append(f"{name}: its ring is not closed, or has fewer than four points; close the ring")
    if problems:
        raise InputError([Problem(text, file=path) for text in problems])
    return _in_degrees(geometries, meta["crs"]), levels, names


def _layer_with(path: Path, field: str) -> str:
    """Name of the one layer of a vector file that has a column."""
    import pyogrio

    layers = [str(row[0]) for row in pyogrio.list_layers(path)]
    fields = {layer: [str(name) for name in _columns(path, layer)] for layer in layers}
    having = [layer for layer in layers if field in fields[layer]]
    if len(having) == 1:
        return having[0]
    if having:
        text = f"has several layers with a column {field!r} ({', '.join(having)}); keep the contours in one"
    else:
        there = ", ".join(sorted({name for names in fields.values() for name in names})) or "none"
        text = f"has no column {field!r}; its columns: {there}; name the one that holds the level"
    raise InputError(Problem(text, file=path))


def _columns(path: Path, layer: str) -> Any:
    """Names of the columns of one layer."""
    import pyogrio

    return pyogrio.read_info(path, layer=layer)["fields"]


def _number(value: Any) -> float:
    """A level as a float; NaN for anything that is not a number."""
    try:
        return float(value) if not isinstance(value, str) else float(value.strip().replace(",", "."))
    except (TypeError, ValueError):
        return float("nan")


def _in_degrees(geometries: Any, crs: str) -> list[Any]:
    """Geometries in degrees of longitude and latitude, WGS 84."""
    import shapely

    turn = transformer(crs, "EPSG:4326")
    if turn is None:
        return list(geometries)

    def degrees(points: Array) -> Array:
        return np.column_stack(turn.transform(points[:, 0], points[:, 1]))

    return list(shapely.transform(geometries, degrees))


@lru_cache(maxsize=16)
def transformer(source: str, target: str) -> Any:
    """Build a transformer between reference systems, x before y; None where there is nothing to do."""
    import pyproj

    if pyproj.CRS(source).equals(pyproj.CRS(target), ignore_axis_order=True):
        return None
    return pyproj.Transformer.from_crs(source, target, always_xy=True)
