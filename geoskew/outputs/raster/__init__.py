"""Layers as cloud-optimised GeoTIFFs: one file a layer, whole or not at all.

A block of values goes through three steps that know nothing of each other: ``storage.encode`` turns
values into what is stored, ``scratch.Scratch`` collects a layer's blocks in a tiled work file, and
``finish.finish`` makes the final file of it and reads it back.
"""

from __future__ import annotations

import os
from collections.abc import Callable, Iterable, Mapping, Sequence
from contextlib import ExitStack
from logging import getLogger
from pathlib import Path
from typing import TYPE_CHECKING, Any

from numpy.typing import NDArray

from geoskew.errors import GeoskewError, InputError
from geoskew.layers import Layer
from geoskew.outputs import files
from geoskew.outputs.raster import storage as _storage
from geoskew.outputs.raster.storage import Precision

if TYPE_CHECKING:
    from geoskew.outputs.raster.scratch import Scratch
    from geoskew.region import Grid, Window

__all__ = ["CACHE_BYTES", "write_rasters"]

CACHE_BYTES = 64 * 1024 * 1024
"""What GDAL may keep of rasters in memory; its own default is a share of the machine's memory."""

_log = getLogger(__name__)


def write_rasters(
    blocks: Iterable[tuple[Window, Mapping[str, NDArray[Any]] | Callable[[], Mapping[str, NDArray[Any]]]]],
    *,
    grid: Grid,
    layers: Sequence[Layer],
    folder: Path,
    tags: Mapping[str, str],
    nodata: float | None = None,
    precision: Precision = "standard",
    compress: str = "DEFLATE",
    workers: int | None = None,
    on_progress: Callable[[str, int, int], None] | None = None,
) -> list[Path]:
    """Write ``folder/NAME.tif`` for each layer; the files appear together at the end.

    Parameters
    ----------
    blocks : iterable of (Window, mapping) or (Window, callable)
        Windows aligned to 512 cells, each once, together the whole grid; arrays of the window's
        shape by layer name: NaN = no value, classes uint8 with 255. Any order gives the same bytes. A
        callable gives them when a worker has time for the block.
    grid : Grid
    layers : sequence of Layer
    folder : Path
        An existing folder. Files of these names are replaced: ask ``files.require_free`` before.
    tags : mapping of str to str
        Tags of each file: the scenario's title, the conventions' key facts.
    nodata : float, optional
        Stored, and declared, in place of NaN; classes keep 255.
    precision : "standard" or "full"
        Rounded to a power of two, or float32 as it is.
    compress : "DEFLATE" or "ZSTD"
    workers : int, optional
        Blocks in flight, and files finished, at a time; all processors when left out. The bytes do not
        depend on it.
    on_progress : callable, optional
        Called with the phase ("cells" or "files"), what is done and what there is in all.

    Raises
    ------
    InputError
        No layer has a value anywhere; ``nodata`` is a value that a layer takes.
    OutputError
        A file could not be written, or reads back differently.
    """
    import rasterio
    from rasterio._err import CPLE_BaseError
    from rasterio.errors import RasterioError

    from geoskew.outputs.raster import pipeline

    workers = workers or os.cpu_count() or 1
    report = on_progress or (lambda phase, done, total: None)
    paths = [Path(folder) / f"{layer.name}.tif" for layer in layers]
    current = paths[0] if paths else Path(folder)

    def failing(index: int) -> None:
        nonlocal current
        current = paths[index]

    try:
        with ExitStack() as stack, rasterio.Env(GDAL_CACHEMAX=CACHE_BYTES):
            parts = [stack.enter_context(files.writing(path)) for path in paths]
            stores = [_storage.storage_of(layer, precision=precision, nodata=nodata) for layer in layers]
            scratches = _open(stack, parts, layers, stores, grid, tags)
            pipeline.fill(
                blocks, scratches, workers=workers, report=lambda cells: report("cells", cells, grid.cells)
            )
            _require_values(scratches)
            pipeline.finish_all(
                scratches,
                parts,
                compress=compress,
                workers=workers,
                failing=failing,
                report=lambda count: report("files", count, len(paths)),
            )
    except GeoskewError:
        raise
    except (RasterioError, CPLE_BaseError, OSError) as error:
        raise files.failure(current, error) from error
    return paths


def _open(
    stack: ExitStack,
    parts: Sequence[Path],
    layers: Sequence[Layer],
    stores: Sequence[_storage.Storage],
    grid: Grid,
    tags: Mapping[str, str],
) -> list[Scratch]:
    """A work file a layer, closed in any case."""
    from geoskew.outputs.raster.scratch import Scratch

    scratches = []
    for part, layer, storage in zip(parts, layers, stores, strict=True):
        scratch = Scratch(part.parent / "scratch.tif", grid=grid, layer=layer, storage=storage, tags=tags)
        stack.callback(scratch.abandon)
        scratches.append(scratch)
    return scratches


def _require_values(scratches: Sequence[Scratch]) -> None:
    """Refuse a set of files without any value; say which single layers have none."""
    empty = [scratch.layer.name for scratch in scratches if not scratch.has_values]
    if empty and len(empty) == len(scratches):
        raise InputError(
            f"no cell of the region has a value in {', '.join(empty)}: the region is out of sight of the "
            "satellites, or its outline holds no cell centre; check [region]"
        )
    if empty:
        _log.warning("no cell of the region has a value in %s", ", ".join(empty))
