"""Zones as polygons: GeoPackage in the grid's own coordinates, GeoJSON in WGS 84."""

from __future__ import annotations

import json
from collections.abc import Sequence
from dataclasses import dataclass, fields
from pathlib import Path
from typing import Any, Final

import numpy as np
from numpy.typing import NDArray

from geoskew.errors import InputError
from geoskew.outputs import files, geopackage
from geoskew.region import Grid

ENDINGS: Final = (".gpkg", ".geojson")
LAYER: Final = "zones"
_WGS84: Final = "EPSG:4326"
_DIGITS: Final = 7


@dataclass(frozen=True)
class Zone:
    """A zone's row. Costs are dB lost against each place's own setting; None where no place has a margin."""

    zone: int
    setting_deg: float
    cells: int
    percent: float
    worst_deviation_deg: float
    cost_worst_db: float | None
    cost_mean_db: float | None
    margin_least_db: float | None


MEANINGS: Final[dict[str, str]] = {
    "zone": "number of the zone",
    "setting_deg": "the zone's setting, clockwise from the local vertical, looking to the satellite (deg)",
    "cells": "cells of the region's grid in the zone",
    "percent": "share of the cells that have a zone, weighted by their area (percent)",
    "worst_deviation_deg": "largest angle between the zone's setting and a place's own (deg)",
    "cost_worst_db": "most that the zone's setting takes off the margin at a place's own setting (dB)",
    "cost_mean_db": "mean of that over the zone's area (dB)",
    "margin_least_db": "least deciding margin in the zone at the zone's setting (dB)",
}


def require_known_ending(path: Path) -> None:
    """Check, before the work, that zones can be written under a name.

    Raises
    ------
    InputError
        The ending is neither .gpkg nor .geojson.
    """
    if path.suffix.lower() not in ENDINGS:
        raise InputError(
            f"{path}: zones are written as .gpkg or .geojson; give a name with one of these endings"
        )


def write_zones(path: Path, zones: Sequence[Zone], labels: NDArray[np.int32], grid: Grid, about: str) -> None:
    """Write a feature a zone.

    Parameters
    ----------
    path : Path
        Ends in .gpkg or .geojson. A file there is replaced: ask ``files.require_free`` before.
    zones : sequence of Zone
        In the order of their labels, from 0.
    labels : ndarray of int32, shape (rows, columns)
        The zone of each cell, negative for none.
    grid : Grid
    about : str
        What the zones are, in one sentence, for the file's own description.

    Raises
    ------
    InputError
        The ending is unknown.
    OutputError
        The file could not be written.
    """
    require_known_ending(path)
    shapes = outlines(labels, len(zones), grid)
    with files.writing(path) as part:
        if path.suffix.lower() == ".gpkg":
            _geopackage(part, zones, shapes, grid, about)
        else:
            _geojson(part, zones, shapes, grid)


def outlines(labels: NDArray[np.int32], count: int, grid: Grid) -> list[Any]:
    """The cells of each zone as one MultiPolygon along their edges, in the grid's coordinates."""
    import shapely
    from rasterio.features import shapes
    from rasterio.transform import Affine

    parts: list[list[Any]] = [[] for _ in range(count)]
    found = shapes(labels, mask=labels >= 0, connectivity=4, transform=Affine(*grid.transform))
    for outline, label in found:
        shell, *holes = outline["coordinates"]
        parts[int(label)].append(shapely.Polygon(shell, holes))
    return [shapely.MultiPolygon(one) for one in parts]


def _geopackage(part: Path, zones: Sequence[Zone], shapes: Sequence[Any], grid: Grid, about: str) -> None:
    import pyarrow as pa
    import shapely

    names = [one.name for one in fields(Zone)]
    kinds = [pa.int64() if name in ("zone", "cells") else pa.float64() for name in names]
    columns = [
        pa.array([_rounded(getattr(one, name)) for one in zones], kind)
        for name, kind in zip(names, kinds, strict=True)
    ]
    columns.append(pa.array(shapely.to_wkb(np.asarray(shapes, dtype=object)).tolist(), pa.binary()))
    with geopackage.reproducible():
        geopackage.add_layer(
            part,
            pa.table(columns, names=[*names, "geom"]),
            layer=LAYER,
            geometry_type="MultiPolygon",
            crs=grid.crs,
            title="Zones of one setting",
            description=about,
        )
    geopackage.describe(part, {LAYER: [geopackage.About(name, MEANINGS[name]) for name in names]})


def _geojson(part: Path, zones: Sequence[Zone], shapes: Sequence[Any], grid: Grid) -> None:
    """RFC 7946: WGS 84, longitudes within ±180 and cut there (§3.1.9), outer rings counter-clockwise."""
    with part.open("w", encoding="utf-8", newline="\n") as file:
        file.write('{"type": "FeatureCollection", "features": [')
        for number, (zone, shape) in enumerate(zip(zones, shapes, strict=True)):
            properties = {one.name: _rounded(getattr(zone, one.name)) for one in fields(Zone)}
            feature = {"type": "Feature", "properties": properties, "geometry": _in_degrees(shape, grid)}
            file.write(",\n" if number else "\n")
            file.write(json.dumps(feature, ensure_ascii=False, allow_nan=False))
        file.write("\n]}\n")


def _in_degrees(shape: Any, grid: Grid) -> dict[str, Any]:
    import shapely
    from shapely.affinity import translate

    if not grid.is_geographic:
        from pyproj import Transformer

        transform = Transformer.from_crs(grid.crs, _WGS84, always_xy=True).transform
        # A cell's straight edge is a curve in degrees: corners of all cells along it are kept.
        shape = shapely.transform(
            shapely.segmentize(shape, grid.step),
            lambda points: np.column_stack(transform(points[:, 0], points[:, 1])),
        )
    pieces = []
    for turn in (-360.0, 0.0, 360.0):
        cut = shapely.intersection(translate(shape, xoff=turn), shapely.box(-180.0, -90.0, 180.0, 90.0))
        pieces += [part for part in shapely.get_parts(cut) if part.geom_type == "Polygon" and part.area > 0.0]
    oriented = shapely.orient_polygons(np.asarray(pieces, dtype=object), exterior_cw=False)
    rings = [
        [
            [[round(float(x), _DIGITS), round(float(y), _DIGITS)] for x, y in shapely.get_coordinates(ring)]
            for ring in (one.exterior, *one.interiors)
        ]
        for one in oriented
    ]
    return {"type": "MultiPolygon", "coordinates": rings}


def _rounded(value: float | int | None) -> float | int | None:
    return round(value, 6) + 0.0 if isinstance(value, float) else value
