"""The work files of one layer: tiled, filled block by block in any order, with all its metadata."""

from __future__ import annotations

import math
import zlib
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path
from threading import Lock
from typing import TYPE_CHECKING, Any, Final

import numpy as np
from numpy.typing import NDArray

from geoskew import __version__
from geoskew.errors import OutputError
from geoskew.layers import Layer
from geoskew.outputs.raster.overviews import TILE, halvings, levels, tile_of
from geoskew.outputs.raster.storage import CLASS_NODATA, Storage, burn
from geoskew.ramps import CLASS_COLOURS, FLAG_COLOURS

if TYPE_CHECKING:
    from geoskew.region import Grid, Window

# Values at a time that stay in the processor's cache.
_PIECE: Final = 16_384


@dataclass(frozen=True, slots=True)
class Block:
    """What is remembered of a stored block: where it lies, its checksum and the sums of its values."""

    row: int
    column: int
    height: int
    width: int
    checksum: int
    count: int
    minimum: float
    maximum: float
    mean: float
    deviation: float

    @classmethod
    def of(cls, window: Window, encoded: NDArray[Any], stored: NDArray[Any]) -> Block:
        """Measure a block; ``deviation`` is the sum of squared distances from its own mean."""
        known = encoded != CLASS_NODATA if encoded.dtype == np.uint8 else encoded == encoded
        valid = encoded if known.all() else encoded[known]
        place = (window.row, window.column, window.height, window.width, checksum(stored))
        if valid.size == 0:
            return cls(*place, 0, math.nan, math.nan, math.nan, 0.0)
        mean = float(valid.mean(dtype=np.float64))
        deviation = _squares(valid.ravel(), mean)
        return cls(*place, int(valid.size), float(valid.min()), float(valid.max()), mean, deviation)


def _squares(values: NDArray[Any], mean: float) -> float:
    """Sum of squared distances from a mean, piece by piece: large temporary arrays cost more than the sum."""
    total = 0.0
    for start in range(0, values.size, _PIECE):
        apart = values[start : start + _PIECE].astype(np.float64)
        apart -= mean
        apart *= apart
        total += float(apart.sum())
    return total


def checksum(stored: NDArray[Any]) -> int:
    """CRC-32 of the bytes of an array."""
    return zlib.crc32(np.ascontiguousarray(stored).view(np.uint8).data)


class Scratch:
    """A layer's work file, open for writing until ``close`` or ``abandon``.

    GDAL's own threads stay off: with them a full disk goes unnoticed here.
    """

    def __init__(
        self, path: Path, *, grid: Grid, layer: Layer, storage: Storage, tags: Mapping[str, str]
    ) -> None:
        self.path = path
        self.grid = grid
        self.layer = layer
        self.storage = storage
        self.blocks: list[Block] = []
        self._lock = Lock()
        self.factors = halvings(grid.rows, grid.columns)
        self._dataset = self._open(path, 1)
        self._levels = [self._open(self._level_path(factor), factor) for factor in self.factors]
        self._describe(tags)

    def _level_path(self, factor: int) -> Path:
        return self.path.with_name(f"{self.path.stem}-{factor}.tif")

    def _open(self, path: Path, factor: int) -> Any:
        """A work file of the layer, or of its overview by a factor."""
        import rasterio

        grid, storage = self.grid, self.storage
        transform = rasterio.Affine(*tuple(grid.transform)[:6]) @ rasterio.Affine.scale(factor)
        options: dict[str, Any] = {"photometric": "palette"} if self.layer.is_class and factor == 1 else {}
        return rasterio.open(
            path,
            "w",
            driver="GTiff",
            width=math.ceil(grid.columns / factor),
            height=math.ceil(grid.rows / factor),
            count=1,
            dtype=storage.dtype,
            crs=grid.crs,
            transform=transform,
            nodata=storage.nodata,
            tiled=True,
            blockxsize=tile_of(factor),
            blockysize=tile_of(factor),
            compress="ZSTD",
            zstd_level=1,
            predictor=storage.predictor,
            bigtiff="IF_SAFER",
            **options,
        )

    @property
    def has_values(self) -> bool:
        """Whether any stored cell has a value."""
        return any(block.count for block in self.blocks)

    def write(self, window: Window, encoded: NDArray[Any]) -> None:
        """Store one block of encoded values.

        Raises
        ------
        OutputError
            The array is not of the window's shape.
        """
        if encoded.shape != (window.height, window.width):
            raise OutputError(
                f"layer {self.layer.name}: a block of {window.height} x {window.width} cells came with "
                f"values of shape {encoded.shape}"
            )
        stored = burn(encoded, self.storage, self.layer)
        block = Block.of(window, encoded, stored)
        pieces = [
            burn(one, self.storage, self.layer, checked=False)
            for one in levels(encoded, self.storage, len(self.factors))
        ]
        with self._lock:
            _put(self._dataset, window.row, window.column, stored)
            for factor, dataset, piece in zip(self.factors, self._levels, pieces, strict=True):
                _put(dataset, window.row // factor, window.column // factor, piece)
            self.blocks.append(block)

    def close(self) -> None:
        """Check that every cell was stored once, add the statistics, close the file.

        Raises
        ------
        OutputError
            The windows do not cover the grid exactly, or are not aligned to tiles.
        """
        self.blocks.sort(key=lambda block: (block.row, block.column))
        _require_cover(self.blocks, self.grid.rows, self.grid.columns)
        self._dataset.update_tags(1, **statistics(self.blocks, self.grid.rows * self.grid.columns))
        for dataset in (self._dataset, *self._levels):
            dataset.close()

    def abandon(self) -> None:
        """Close the files that are still open."""
        for dataset in (self._dataset, *self._levels):
            if not dataset.closed:
                dataset.close()

    def joined(self) -> Path:
        """Of the closed work files a description that reads as one layer with its overviews."""
        from rasterio.shutil import copy

        path = self.path.with_suffix(".vrt")
        copy(self.path, path, driver="VRT")
        overviews = "".join(
            f'<Overview><SourceFilename relativeToVRT="1">{self._level_path(factor).name}</SourceFilename>'
            "<SourceBand>1</SourceBand></Overview>"
            for factor in self.factors
        )
        text = path.read_text(encoding="utf-8")
        path.write_text(text.replace("</VRTRasterBand>", f"{overviews}</VRTRasterBand>"), encoding="utf-8")
        return path

    def remove(self) -> None:
        """Remove the work files."""
        for path in (self.path, self.path.with_suffix(".vrt"), *map(self._level_path, self.factors)):
            path.unlink()

    def _describe(self, tags: Mapping[str, str]) -> None:
        """Set everything that must be in the work file before it is copied."""
        layer, dataset = self.layer, self._dataset
        dataset.set_band_description(1, layer.title)
        dataset.set_band_unit(1, layer.unit)
        dataset.update_tags(**{"TIFFTAG_SOFTWARE": f"geoskew {__version__}", **tags})
        dataset.update_tags(1, **band_tags(layer, self.storage))
        if layer.is_class:
            dataset.write_colormap(1, palette(layer))


def _put(dataset: Any, row: int, column: int, values: NDArray[Any]) -> None:
    from rasterio.windows import Window as RasterWindow

    height, width = values.shape
    dataset.write(values, 1, window=RasterWindow(column, row, width, height))


def band_tags(layer: Layer, storage: Storage) -> dict[str, str]:
    """Tags of a layer's band: name, meaning, unit, kind, rounding, and the names of classes."""
    tags = {"layer": layer.name, "meaning": layer.description, "unit": layer.unit, "kind": layer.kind}
    if layer.period:
        tags["period"] = f"{layer.period:g}"
    if not layer.is_class:
        tags["rounded_to"] = (
            f"{storage.step!r} {layer.unit}".strip() if storage.step else "not rounded (float32)"
        )
    for code, name in layer.classes or (((0, "no"), (1, "yes")) if layer.kind == "flag" else ()):
        tags[f"class_{code}"] = name
    return tags


def palette(layer: Layer) -> dict[int, tuple[int, int, int, int]]:
    """Colour table of a layer of classes; codes without a class are transparent."""
    colours = FLAG_COLOURS if layer.kind == "flag" else CLASS_COLOURS
    table = dict.fromkeys(range(256), (0, 0, 0, 0))
    for code in [code for code, _ in layer.classes] or list(colours):
        colour = colours.get(code)
        if colour is not None:
            table[code] = (int(colour[1:3], 16), int(colour[3:5], 16), int(colour[5:7], 16), 255)
    return table


def statistics(blocks: Sequence[Block], cells: int) -> dict[str, str]:
    """Exact statistics of a band under the names that GDAL reads; none for a band without values.

    Mean and deviation are combined from those of the blocks with sums that do not depend on the
    order, so that neither do the bytes.
    """
    full = [block for block in blocks if block.count]
    if not full:
        return {"STATISTICS_VALID_PERCENT": "0"}
    count = sum(block.count for block in full)
    mean = math.fsum(block.count * block.mean for block in full) / count
    deviation = math.fsum(block.deviation + block.count * (block.mean - mean) ** 2 for block in full)
    return {
        "STATISTICS_MINIMUM": f"{min(block.minimum for block in full):.14g}",
        "STATISTICS_MAXIMUM": f"{max(block.maximum for block in full):.14g}",
        "STATISTICS_MEAN": f"{mean:.14g}",
        "STATISTICS_STDDEV": f"{math.sqrt(deviation / count):.14g}",
        "STATISTICS_VALID_PERCENT": f"{100.0 * count / cells:.4g}",
    }


def _require_cover(blocks: Sequence[Block], rows: int, columns: int) -> None:
    """Every tile of the grid belongs to exactly one block, and blocks end where tiles or the grid do."""
    tiles = 0
    seen: set[tuple[int, int]] = set()
    for block in blocks:
        bottom, right = block.row + block.height, block.column + block.width
        aligned = block.row % TILE == 0 and block.column % TILE == 0
        if not aligned or (bottom % TILE and bottom != rows) or (right % TILE and right != columns):
            raise OutputError(
                f"a block at row {block.row}, column {block.column} is not aligned to {TILE} cells"
            )
        for row in range(block.row, bottom, TILE):
            seen.update((row, column) for column in range(block.column, right, TILE))
            tiles += len(range(block.column, right, TILE))
    wanted = math.ceil(rows / TILE) * math.ceil(columns / TILE)
    if tiles != wanted or len(seen) != wanted:
        raise OutputError(
            f"{len(seen)} of {wanted} tiles were computed, {tiles - len(seen)} of them more than once"
        )
