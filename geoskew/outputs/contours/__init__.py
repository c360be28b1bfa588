"""Isolines of layers as a GeoPackage: one layer of lines for each contoured layer."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from pathlib import Path
from typing import Any

import numpy as np

from geoskew.errors import InputError
from geoskew.layers import Layer
from geoskew.outputs import files, geopackage
from geoskew.outputs.contours.levels import levels_of
from geoskew.outputs.contours.source import Field, read_field
from geoskew.outputs.contours.trace import Isoline, isolines

__all__ = ["COLUMNS", "Isoline", "folded", "has_contours", "isolines", "levels_of", "write_contours"]

# name, meaning of the columns of every layer of lines
COLUMNS = (
    ("level", "value of the layer along the line"),
    ("unit", "unit of the level"),
    ("layer", "layer that was contoured"),
)


NOT_CROSSED = ": no contour, as no level is crossed within the region"


def folded(notes: Sequence[str]) -> list[str]:
    """The notes with those on layers without any contour made into one."""
    bare = [note.removesuffix(NOT_CROSSED) for note in notes if note.endswith(NOT_CROSSED)]
    rest = [note for note in notes if not note.endswith(NOT_CROSSED)]
    return rest + ([f"{', '.join(bare)}{NOT_CROSSED}"] if bare else [])


def has_contours(layer: Layer) -> bool:
    """Whether a layer is contoured when nobody asks for it by name."""
    return layer.contour_step > 0.0 and not layer.is_class


def write_contours(
    path: Path, rasters: Mapping[str, Path], *, layers: Sequence[Layer], every: float | None = None
) -> list[str]:
    """Write the isolines of layers, one GeoPackage layer each, one feature a level.

    Lines run through cell centres' coordinates, with the larger values on their left (for angles that
    close on themselves: larger the short way round). Values are interpolated linearly; no line is
    drawn next to cells without a value. Across 180° longitudes run past 180, as in the rasters.

    Parameters
    ----------
    path : Path
        Final name, ending in ``.gpkg``. A file there is replaced: ask ``files.require_free`` before.
    rasters : mapping of str to Path
        The layers' GeoTIFFs by layer name. Only every n-th cell of a very large one is read.
    layers : sequence of Layer
        Continuous or circular ones.
    every : float, optional
        Distance between levels in the layers' units, in place of each layer's own.

    Returns
    -------
    list of str
        What the user should be told: thinned rasters, widened steps, layers without any line.

    Raises
    ------
    InputError
        A layer has no isolines, the step is not above 0 or gives too many levels, the ending is wrong.
    OutputError
        The file could not be written.
    """
    if path.suffix.lower() != ".gpkg":
        raise InputError(f"{path}: contours are written as GeoPackage; give a name that ends in .gpkg")
    _check(layers, every)
    notes: list[str] = []
    about = {}
    with files.writing(path) as part, geopackage.reproducible():
        for layer in layers:
            field = read_field(rasters[layer.name])
            found, step = _trace(layer, field, every, notes)
            about[layer.name] = [
                geopackage.About(
                    name, f"{meaning} ({layer.unit})" if name == "level" and layer.unit else meaning
                )
                for name, meaning in COLUMNS
            ]
            _add(part, layer, field, found, step)
        geopackage.describe(part, about)
    return notes


def _check(layers: Sequence[Layer], every: float | None) -> None:
    if every is not None and not (np.isfinite(every) and every > 0.0):
        raise InputError(f"a step of {every:g} between contours is not above 0; give a number such as 0.5")
    for layer in layers:
        if layer.is_class:
            raise InputError(f"layer {layer.name} holds classes, which have no contours; leave it out")
        if every is None and layer.contour_step <= 0.0:
            raise InputError(f"layer {layer.name} has no usual step between contours; give one with --every")


def _trace(layer: Layer, field: Field, every: float | None, notes: list[str]) -> tuple[list[Isoline], float]:
    """Isolines of a layer's field, and the step that they ended up with."""
    levels, step = levels_of(field.values, every or layer.contour_step, layer=layer, widen=every is None)
    if step != (every or layer.contour_step):
        notes.append(f"{layer.name}: contours every {step:g} {layer.unit}, as closer ones would be too many")
    if field.thinning > 1:
        notes.append(
            f"{layer.name}: contours were traced on every {field.thinning}th cell of every "
            f"{field.thinning}th row, as the raster is very large"
        )
    found = isolines(field.values, field.x, field.y, levels, kind=layer.kind, period=layer.period)
    if not found:
        notes.append(f"{layer.name}{NOT_CROSSED}")
    return found, step


def _add(part: Path, layer: Layer, field: Field, found: Sequence[Isoline], step: float) -> None:
    """Append a layer's lines to the file."""
    import pyarrow as pa
    import shapely

    shapes: Any = [shapely.MultiLineString(line.parts) for line in found]
    table = pa.table(
        {
            "level": pa.array([line.level for line in found], pa.float64()),
            "unit": pa.array([layer.unit] * len(found), pa.string()),
            "layer": pa.array([layer.name] * len(found), pa.string()),
            "geom": pa.array([shapely.to_wkb(shape) for shape in shapes], pa.binary()),
        }
    )
    thinned = f" on every {field.thinning}th cell" if field.thinning > 1 else ""
    geopackage.add_layer(
        part,
        table,
        layer=layer.name,
        geometry_type="MultiLineString",
        crs=field.crs,
        title=layer.title,
        description=(
            f"Lines of equal {layer.name}, every {step:g} {layer.unit}, traced{thinned} between cell "
            "centres. Larger values are on the left of a line. Coordinates: x (east or longitude) before "
            "y (north or latitude)."
        ),
    )
