"""Reading a layer's raster for tracing, thinned where it is very large."""

from __future__ import annotations

import math
from dataclasses import dataclass
from pathlib import Path
from typing import Final

import numpy as np
from numpy.typing import NDArray

from geoskew.errors import InputError

MOST_CELLS: Final = 4_000_000
_STRIP: Final = 512


@dataclass(frozen=True, slots=True)
class Field:
    """Values (H, W) with NaN = no value, centres x (W,) and y (H,), and of how many cells one was read."""

    values: NDArray[np.float32]
    x: NDArray[np.float64]
    y: NDArray[np.float64]
    crs: str
    thinning: int


def read_field(path: Path) -> Field:
    """Read a raster; of one above ``MOST_CELLS`` every n-th cell of every n-th row.

    Cells are picked and not averaged, nor taken from overviews: a picked value belongs to a known
    place, and an angle has no average across its wrap.

    Raises
    ------
    InputError
        The file cannot be read as a raster.
    """
    import rasterio
    from rasterio.errors import RasterioIOError

    try:
        with rasterio.open(path) as dataset:
            thinning = max(1, math.ceil(math.sqrt(dataset.width * dataset.height / MOST_CELLS)))
            rows = np.arange((thinning - 1) // 2, dataset.height, thinning)
            columns = np.arange((thinning - 1) // 2, dataset.width, thinning)
            values = np.empty((rows.size, columns.size), dtype=np.float32)
            for top in range(0, dataset.height, _STRIP):
                here = (rows >= top) & (rows < top + _STRIP)
                window = ((top, min(top + _STRIP, dataset.height)), (0, dataset.width))
                strip = dataset.read(1, window=window, masked=True)
                values[here] = strip[rows[here] - top][:, columns].astype(np.float32).filled(np.nan)
            transform = dataset.transform
            crs = dataset.crs.to_string()
    except RasterioIOError as error:
        raise InputError(f"{path} cannot be read as a raster: {error}") from error
    return Field(
        values,
        transform.c + transform.a * (columns + 0.5),
        transform.f + transform.e * (rows + 0.5),
        crs,
        thinning,
    )
