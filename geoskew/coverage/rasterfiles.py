"""Rasters of EIRP: opened and judged once, then read window by window."""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache
from pathlib import Path
from typing import Any, Final

import numpy as np
from numpy.typing import ArrayLike, NDArray

from geoskew.coverage.files import transformer
from geoskew.coverage.rasters import bilinear, cell_position
from geoskew.errors import InputError, Problem

Array = NDArray[np.float64]

# EIRP that a satellite can have towards a place, dBW; anything else is another quantity or unit.
PLAUSIBLE_DBW: Final = (-30.0, 75.0)
# A raster up to this many cells is kept in memory; of a larger one only the window asked for is read.
KEPT_CELLS: Final = 25_000_000
# Cells along each side of the thinned-out look at the values.
_LOOK_CELLS: Final = 512


@dataclass(frozen=True)
class RasterField:
    """EIRP from a raster file; evaluate it with `eirp`. Holds the file's name, not its cells; picklable."""

    path: Path
    crs: str
    inverse: tuple[float, ...]
    shape: tuple[int, int]
    stamp: tuple[int, int]

    def eirp(self, longitude: ArrayLike, latitude: ArrayLike) -> Array:
        """EIRP at places by bilinear interpolation.

        Parameters
        ----------
        longitude, latitude : array_like
            Degrees, WGS 84, broadcastable.

        Returns
        -------
        ndarray
            dBW, the broadcast shape; NaN outside of the raster and beside cells without a value.
        """
        x, y = np.broadcast_arrays(
            np.asarray(longitude, dtype=np.float64), np.asarray(latitude, dtype=np.float64)
        )
        turn = transformer("EPSG:4326", self.crs)
        if turn is not None:
            x, y = turn.transform(x, y)
            x, y = (np.where(np.isfinite(axis), axis, np.nan) for axis in (np.asarray(x), np.asarray(y)))
        column, row = self._position(x, y)
        return self._sample(column, row)

    def _position(self, x: Array, y: Array) -> tuple[Array, Array]:
        """Fractional cells; a raster in degrees is met at whichever turn of the longitude it lies."""
        column, row = cell_position(x, y, inverse=self.inverse)
        if abs(self.inverse[0]) > 0.0 and _is_geographic(self.crs):
            turn = 360.0 * abs(self.inverse[0])
            column = np.mod(column + 0.5, turn) - 0.5
        return column, row

    def _sample(self, column: Array, row: Array) -> Array:
        rows, columns = self.shape
        if rows * columns <= KEPT_CELLS:
            return bilinear(_cells(self.path, self.stamp, None), column, row)
        with np.errstate(invalid="ignore"):
            met = (column >= -0.5) & (column <= columns - 0.5) & (row >= -0.5) & (row <= rows - 0.5)
        if not np.any(met):
            return np.full(column.shape, np.nan)
        west = max(int(np.floor(column[met].min())), 0)
        north = max(int(np.floor(row[met].min())), 0)
        east = min(int(np.floor(column[met].max())) + 2, columns)
        south = min(int(np.floor(row[met].max())) + 2, rows)
        part = _cells(self.path, self.stamp, (north, south, west, east))
        values = bilinear(part, np.where(met, column - west, np.nan), np.where(met, row - north, np.nan))
        return np.where(met, values, np.nan)


def raster_field(path: Path) -> RasterField:
    """Open a raster of EIRP.

    Parameters
    ----------
    path : Path
        A raster file of one band in dBW, in any coordinate reference system.

    Raises
    ------
    InputError
        For a file that cannot be read, has several bands, no reference system, no value at all, or
        values that cannot be dBW.
    """
    import rasterio
    from rasterio.errors import RasterioError, RasterioIOError

    try:
        with rasterio.open(path) as source:
            if source.count != 1:
                text = f"has {source.count} bands; give a raster with one band of EIRP in dBW"
                raise InputError(Problem(text, file=path))
            if source.crs is None:
                raise InputError(
                    Problem("has no coordinate reference system; store the raster with one", file=path)
                )
            shape = tuple(min(size, _LOOK_CELLS) for size in source.shape)
            look = _values(source, source.read(1, out_shape=shape, masked=True))
            inverse = tuple(float(number) for number in (~source.transform)[:6])
            field = RasterField(path, source.crs.to_wkt(), inverse, source.shape, _stamp(path))
    except (RasterioIOError, RasterioError) as error:
        raise InputError(Problem(f"cannot be read as a raster: {error}", file=path)) from error
    _refuse_implausible(path, look)
    return field


def _refuse_implausible(path: Path, values: Array) -> None:
    present = values[np.isfinite(values)]
    if present.size == 0:
        raise InputError(Problem("has no value in any cell; give a raster of EIRP in dBW", file=path))
    low, high = PLAUSIBLE_DBW
    if present.min() < low or present.max() > high:
        raise InputError(
            Problem(
                f"holds values from {present.min():g} to {present.max():g}, which cannot be EIRP in dBW"
                f" ({low:g} to {high:g}); give dBW and state the nodata value",
                file=path,
            )
        )


def _stamp(path: Path) -> tuple[int, int]:
    state = path.stat()
    return state.st_mtime_ns, state.st_size


@lru_cache(maxsize=8)
def _is_geographic(crs: str) -> bool:
    import pyproj

    return bool(pyproj.CRS(crs).is_geographic)


@lru_cache(maxsize=4)
def _cells(path: Path, stamp: tuple[int, int], window: tuple[int, int, int, int] | None) -> Array:
    """Cells of a raster, or of the window (north, south, west, east) in cells; NaN without a value."""
    import rasterio
    from rasterio.errors import RasterioError
    from rasterio.windows import Window

    try:
        with rasterio.open(path) as source:
            part = None
            if window is not None:
                north, south, west, east = window
                part = Window(west, north, east - west, south - north)
            return _values(source, source.read(1, window=part, masked=True))
    except RasterioError as error:
        raise InputError(Problem(f"cannot be read as a raster: {error}", file=path)) from error


def _values(source: Any, band: Any) -> Array:
    """Turn a masked band into dBW: scale and offset applied, NaN without a value."""
    numbers = np.asarray(band.astype(np.float64).filled(np.nan), dtype=np.float64)
    return np.asarray(numbers * source.scales[0] + source.offsets[0])
