"""Site lists with geometries: GeoPackage, GeoJSON and (Geo)Parquet."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

from geoskew.errors import InputError, Problem
from geoskew.region.vectorfile import read_vector
from geoskew.sites.cells import numbers
from geoskew.sites.table import Positions, RawTable
from geoskew.sites.workbook import cell_text, joined

WGS84 = "EPSG:4326"
GEOJSON_ENDINGS = (".geojson", ".json")


def read_points(path: Path, *, crs: str | None, layer: str | None) -> RawTable:
    """Read one layer of a vector file.

    Parameters
    ----------
    path : Path
        GeoPackage, GeoJSON or (Geo)Parquet.
    crs : str, optional
        CRS of the coordinates, where the file does not say it (GeoJSON always says WGS 84, so that
        there it is believed against the file).
    layer : str, optional
        Name of the layer, where there are several.

    Returns
    -------
    RawTable
        With positions where the layer has geometries; heights of points are not used.

    Raises
    ------
    InputError
        If the file cannot be read, or the CRS is missing or contradicts the file.
    """
    import geopandas
    import pandas

    found = read_vector(path, kind="Point", layer=layer)
    positions = None
    frame = pandas.DataFrame(found)
    if isinstance(found, geopandas.GeoDataFrame):
        positions = point_positions(found.geometry.to_numpy(), _crs(found.geometry.crs, crs, path))
        frame = pandas.DataFrame(found.drop(columns=found.geometry.name))
    frame.columns = [str(name) for name in frame.columns]
    frame = frame.reset_index(drop=True)
    return RawTable(
        path=path,
        frame=frame,
        lines=np.arange(1, len(frame) + 1, dtype=np.int64),
        row_text=lambda row: joined([_text(value) for value in frame.iloc[row]]),
        word="feature",
        positions=positions,
    )


def without_copies(table: RawTable) -> RawTable:
    """Drop columns ``lat`` and ``lon`` that say what the geometries say; else warn and keep them.

    They agree where no row differs by more than 1e-6°, a decimetre on the ground.
    """
    positions, names = table.positions, [name for name in ("lat", "lon") if name in table.frame.columns]
    if positions is None or not names:
        return table
    differs = np.zeros(len(table.frame), dtype=np.bool_)
    for name in names:
        column = numbers(table, name, sign=".")
        place = positions.latitude if name == "lat" else positions.longitude
        differs |= column.wrong | (np.abs(column.values - place) > 1e-6)
    count = int(np.count_nonzero(differs))
    if not count:
        return replace(table, frame=table.frame.drop(columns=names))
    warning = f"{' and '.join(names)} differ from the geometry in {count} rows; the geometry is used"
    return replace(table, warnings=[*table.warnings, warning])


def to_wgs84(
    x: NDArray[np.float64], y: NDArray[np.float64], crs: Any
) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Longitude and latitude, degrees, of x (easting or longitude) and y in a CRS; NaN where none.

    Far outside of its area a projection may still answer, with a place that is not the one asked for:
    what does not come back to within a metre (1e-5°) has none.
    """
    from pyproj import CRS, Transformer

    if CRS.from_user_input(crs) == CRS.from_user_input(WGS84):
        return x, y
    transformer = Transformer.from_crs(crs, WGS84, always_xy=True)
    longitude, latitude = transformer.transform(x, y)
    back_x, back_y = transformer.transform(longitude, latitude, direction="INVERSE")
    off_x, off_y, near = np.abs(back_x - x), np.abs(back_y - y), 1.0
    if CRS.from_user_input(crs).is_geographic:
        off_x, near = np.minimum(off_x, np.abs(off_x - 360.0)), 1e-5
    known = np.isfinite(longitude) & np.isfinite(latitude) & (off_x < near) & (off_y < near)
    return np.where(known, longitude, np.nan), np.where(known, latitude, np.nan)


def _crs(own: Any, given: str | None, path: Path) -> Any:
    from pyproj import CRS

    if own is None and given is None:
        raise InputError(Problem("has no CRS; say it with [sites] crs", file=path))
    if own is None or given is None:
        return given or own
    if path.suffix.lower() in GEOJSON_ENDINGS or CRS.from_user_input(own).equals(
        given, ignore_axis_order=True
    ):
        return given
    message = (
        f"is in {CRS.from_user_input(own).to_string()}, but [sites] crs says {given}; leave that key out"
    )
    raise InputError(Problem(message, file=path))


def point_positions(geometry: NDArray[Any], crs: Any) -> Positions:
    """Longitude and latitude of shapes (N,) in a CRS, and what is wrong with those that are no point."""
    import shapely

    shapes = np.asarray(geometry, dtype=object)
    kinds = shapely.get_type_id(shapes)
    single = (kinds == shapely.GeometryType.MULTIPOINT) & (shapely.get_num_geometries(shapes) == 1)
    points = np.where(single, shapely.get_geometry(shapes, 0), shapes)
    usable = (shapely.get_type_id(points) == shapely.GeometryType.POINT) & ~shapely.is_empty(points)
    x, y = np.full(len(shapes), np.nan), np.full(len(shapes), np.nan)
    x[usable], y[usable] = shapely.get_x(points[usable]), shapely.get_y(points[usable])
    finite = np.isfinite(x) & np.isfinite(y)
    longitude, latitude = to_wgs84(x, y, crs)
    faults = {}
    for row in np.flatnonzero(~(np.isfinite(longitude) & np.isfinite(latitude))).tolist():
        if shapes[row] is None or shapely.is_empty(shapes[row]):
            faults[row] = "has no geometry; a site is a point"
        elif not usable[row]:
            faults[row] = f"geometry is a {shapes[row].geom_type}; a site is a point"
        elif not finite[row]:
            faults[row] = "the point's coordinates are not numbers"
        else:
            faults[row] = f"x {x[row]:g}, y {y[row]:g} has no longitude and latitude; check the CRS"
    return Positions(longitude, latitude, faults)


def _text(value: Any) -> str:
    import pandas

    return "" if value is None or (np.ndim(value) == 0 and pandas.isna(value)) else cell_text(value)
