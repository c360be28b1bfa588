"""Averaged overviews that are rounded like the cells they are made of.

An average of rounded values has all its low bits in use again, and three small overviews would take
as much room as the layer itself. Overviews that pick one cell need nothing of this.
"""

from __future__ import annotations

import math
from pathlib import Path

import numpy as np

from geoskew.outputs.raster.storage import Storage

TILE = 512


def add_rounded(path: Path, storage: Storage) -> None:
    """Give a closed work file averaged overviews, rounded to the storage's step.

    Cells without a value take no part in an average. The copy to the final file keeps overviews that
    are there.
    """
    import rasterio
    from rasterio.enums import Resampling

    with rasterio.open(path) as dataset:
        factors = halvings(dataset.height, dataset.width)
    if not factors:
        return
    with rasterio.Env(GDAL_TIFF_OVR_BLOCKSIZE=TILE), rasterio.open(path, "r+") as dataset:
        dataset.build_overviews(factors, Resampling.average)
    for level in range(len(factors)):
        with rasterio.open(path, "r+", overview_level=level) as dataset:
            _round(dataset, storage)


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


def _round(dataset: object, storage: Storage) -> None:
    """Round an open dataset in place, tile by tile; nodata stays."""
    step, nodata = np.float32(storage.step), np.float32(storage.nodata)
    for _, window in dataset.block_windows(1):  # type: ignore[attr-defined]
        values = dataset.read(1, window=window)  # type: ignore[attr-defined]
        valid = ~np.isnan(values) & (values != nodata)
        values[valid] = np.rint(values[valid] / step) * step + np.float32(0.0)
        dataset.write(values, 1, window=window)  # type: ignore[attr-defined]
