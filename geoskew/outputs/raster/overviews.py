"""Overviews, made block by block from the values at hand instead of read back from a whole layer.

Blocks are aligned to tiles, so that every cell of an overview is made of one block. Averages are rounded
like the cells they are made of: an average of rounded values has all its low bits in use again, and three
small overviews would take as much room as the layer itself.
"""

from __future__ import annotations

import math
from collections.abc import Iterator
from typing import Any, Final

import numpy as np
from numpy.typing import NDArray

from geoskew.outputs.raster.storage import Storage

TILE: Final = 512
# The smallest tile that the file format has.
_LEAST_TILE: Final = 16


def halvings(rows: int, columns: int) -> list[int]:
    """Overview factors until the smallest fits into one tile.

    >>> halvings(512, 100), halvings(513, 100), halvings(700, 2049)
    ([], [2], [2, 4, 8])
    """
    factors = []
    factor = 1
    while max(math.ceil(rows / factor), math.ceil(columns / factor)) > TILE:
        factor *= 2
        factors.append(factor)
    return factors


def tile_of(factor: int) -> int:
    """Side of the tiles of an overview's work file: what one tile of the layer becomes."""
    return max(_LEAST_TILE, TILE // factor)


def levels(encoded: NDArray[Any], storage: Storage, count: int) -> Iterator[NDArray[Any]]:
    """The first `count` overviews of a block of encoded values, each half as large as the one before.

    Cells without a value take no part in an average. A row or column without a partner stands for itself.
    """
    current = encoded
    for _ in range(count):
        if storage.overviews == "nearest":
            current = np.ascontiguousarray(current[::2, ::2])
            yield current
        else:
            current = _averaged(current)
            yield _rounded(current, storage.step) if storage.step else current


def _averaged(values: NDArray[np.float32]) -> NDArray[np.float32]:
    rows, columns = values.shape
    if rows % 2 or columns % 2:
        values = np.pad(values, ((0, rows % 2), (0, columns % 2)), constant_values=np.nan)
    four = (values[::2, ::2], values[::2, 1::2], values[1::2, ::2], values[1::2, 1::2])
    total = np.asarray(four[0] + four[1] + (four[2] + four[3])) * np.float32(0.25)
    missing = np.isnan(total)
    if missing.any():
        known = np.stack([one[missing] for one in four])
        count = (~np.isnan(known)).sum(axis=0)
        sums = np.where(np.isnan(known), np.float32(0.0), known).sum(axis=0, dtype=np.float64)
        with np.errstate(invalid="ignore", divide="ignore"):
            total[missing] = np.where(count > 0, sums / count, np.nan)
    return total


def _rounded(values: NDArray[np.float32], step: float) -> NDArray[np.float32]:
    """Rounded to a power of two; one zero and one NaN."""
    rounded = np.rint(values * np.float32(1.0 / step)) * np.float32(step) + np.float32(0.0)
    return np.where(np.isnan(rounded), np.float32(np.nan), rounded)
