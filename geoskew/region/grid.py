"""A grid of square cells, and the rectangles of it that are worked on one at a time.

Pixel is area: ``west`` and ``north`` are the outer corner of the first cell, values belong to cell
centres. Nothing here ever makes an array of the whole grid, which may be larger than memory.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from functools import lru_cache
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

from geoskew.places import Places

if TYPE_CHECKING:
    from shapely.geometry.base import BaseGeometry

GEOGRAPHIC_CRS = "EPSG:4326"


@dataclass(frozen=True, slots=True)
class Window:
    """A rectangle of cells: its first row and column, counted from 0 in the north-west, and its size."""

    row: int
    column: int
    height: int
    width: int


@dataclass(frozen=True)
class Grid:
    """Square cells over a region, north up.

    Attributes
    ----------
    crs : str
        ``EPSG:4326`` (longitude, latitude), or a projected CRS.
    west, north : float
        Outer corner of the first cell, in the units of the CRS. Longitudes of a region across
        180° run past 180.
    step : float
        Side of a cell, in the units of the CRS.
    columns, rows : int
        Size of the grid.
    outline : shapely geometry or None
        Polygons in the grid's own coordinates; cells whose centre lies outside have no value.
    """

    crs: str
    west: float
    north: float
    step: float
    columns: int
    rows: int
    outline: BaseGeometry | None = None

    @property
    def is_geographic(self) -> bool:
        """True for longitude and latitude, False for a projected CRS."""
        return self.crs == GEOGRAPHIC_CRS

    @property
    def east(self) -> float:
        """Outer edge of the last column, in the units of the CRS."""
        return self.west + self.columns * self.step

    @property
    def south(self) -> float:
        """Outer edge of the last row, in the units of the CRS."""
        return self.north - self.rows * self.step

    @property
    def bounds(self) -> tuple[float, float, float, float]:
        """West, south, east, north: the outer edges, in the units of the CRS."""
        return self.west, self.south, self.east, self.north

    @property
    def shape(self) -> tuple[int, int]:
        """Rows and columns."""
        return self.rows, self.columns

    @property
    def cells(self) -> int:
        """Number of cells, those outside of the outline included."""
        return self.rows * self.columns

    @property
    def transform(self) -> tuple[float, float, float, float, float, float]:
        """From (column, row) to the CRS: x = a·column + b·row + c, y = d·column + e·row + f."""
        return self.step, 0.0, self.west, 0.0, -self.step, self.north

    def windows(self, size: int = 512) -> Iterator[Window]:
        """Cover the grid from the north-west, row of windows by row of windows.

        Offsets are whole multiples of `size`; the last window of a row or column is what is left.

        Raises
        ------
        ValueError
            If `size` is not a whole number above zero.
        """
        if size < 1:
            raise ValueError(f"window size {size} is not above zero")
        for row in range(0, self.rows, size):
            for column in range(0, self.columns, size):
                yield Window(row, column, min(size, self.rows - row), min(size, self.columns - column))

    def block(self, window: Window) -> Places:
        """Places at the centres of a window's cells.

        Parameters
        ----------
        window : Window
            A rectangle that lies within the grid.

        Returns
        -------
        Places
            Longitude (1, W) and latitude (H, 1) of a geographic grid, both (H, W) of a projected
            one, degrees; the height is not known. Cells of a projected grid that have no longitude
            and latitude are NaN and not inside.

        Raises
        ------
        ValueError
            If the window reaches beyond the grid.
        """
        self._check(window)
        x = self.west + self.step * (window.column + np.arange(window.width, dtype=np.float64) + 0.5)
        y = self.north - self.step * (window.row + np.arange(window.height, dtype=np.float64) + 0.5)
        inside = None if self.outline is None else self._mask(window)
        height = np.full((1, 1), np.nan)
        if self.is_geographic:
            return Places(x[np.newaxis, :], y[:, np.newaxis], height, inside)
        longitude, latitude = to_geographic(self.crs).transform(*np.meshgrid(x, y))
        known = np.isfinite(longitude) & np.isfinite(latitude)
        if not known.all():
            longitude, latitude = np.where(known, longitude, np.nan), np.where(known, latitude, np.nan)
            inside = known if inside is None else inside & known
        return Places(longitude, latitude, height, inside)

    def covers(self, longitude: ArrayLike, latitude: ArrayLike) -> NDArray[np.bool_]:
        """Tell which places lie in the grid, and within its outline where there is one.

        Parameters
        ----------
        longitude, latitude : array_like
            Degrees, any shape; longitudes count modulo 360°.

        Returns
        -------
        ndarray of bool
            The same shape; False for NaN.
        """
        x, y = np.asarray(longitude, dtype=np.float64), np.asarray(latitude, dtype=np.float64)
        if self.is_geographic:
            x = self.west + np.mod(x - self.west, 360.0)
        else:
            x, y = from_geographic(self.crs).transform(x, y)
        inside: NDArray[np.bool_] = (
            (x >= self.west) & (x <= self.east) & (y >= self.south) & (y <= self.north)
        )
        if self.outline is not None:
            import shapely

            shapely.prepare(self.outline)
            inside = inside & shapely.intersects_xy(self.outline, x, y)
        return inside

    def any_inside(self) -> bool:
        """Tell whether any cell's centre lies within the outline; True without an outline."""
        if self.outline is None:
            return True
        if self.outline.is_empty:
            return False
        west, south, east, north = self.outline.bounds
        # Only the part of the grid that the outline's bounds touch can hold such a cell.
        first = max(0, int((west - self.west) // self.step)), max(0, int((self.north - north) // self.step))
        last = (
            min(self.columns, int((east - self.west) // self.step) + 1),
            min(self.rows, int((self.north - south) // self.step) + 1),
        )
        for row in range(first[1], last[1], 512):
            for column in range(first[0], last[0], 512):
                window = Window(row, column, min(512, last[1] - row), min(512, last[0] - column))
                if self._mask(window).any():
                    return True
        return False

    def _check(self, window: Window) -> None:
        beyond = window.row + window.height > self.rows or window.column + window.width > self.columns
        if beyond or min(window.row, window.column, window.height - 1, window.width - 1) < 0:
            raise ValueError(f"{window} does not lie within the grid of {self.rows} × {self.columns} cells")

    def _mask(self, window: Window) -> NDArray[np.bool_]:
        """(H, W): True where the cell's centre lies within the outline."""
        import shapely

        west = self.west + self.step * window.column
        north = self.north - self.step * window.row
        edges = west, north - self.step * window.height, west + self.step * window.width, north
        frame = shapely.box(*edges)
        shapely.prepare(self.outline)
        if not shapely.intersects(self.outline, frame):
            return np.zeros((window.height, window.width), dtype=np.bool_)
        if shapely.covers(self.outline, frame):
            return np.ones((window.height, window.width), dtype=np.bool_)
        # An outline of a whole continent is cut to the block first: burning it costs by its vertices.
        return burn(
            shapely.clip_by_rect(self.outline, *edges), window, west=west, north=north, step=self.step
        )


def burn(polygons: Any, window: Window, *, west: float, north: float, step: float) -> NDArray[np.bool_]:
    """(H, W): True for the cells whose centre lies in the polygons (lines and points burn nothing)."""
    import shapely
    from rasterio.features import rasterize
    from rasterio.transform import Affine

    parts = [part for part in shapely.get_parts(polygons, return_index=False) if part.area > 0.0]
    if not parts:
        return np.zeros((window.height, window.width), dtype=np.bool_)
    burnt = rasterize(
        [(part, 1) for part in parts],
        out_shape=(window.height, window.width),
        transform=Affine(step, 0.0, west, 0.0, -step, north),
        fill=0,
        all_touched=False,
        dtype="uint8",
    )
    return np.asarray(burnt, dtype=np.bool_)


@lru_cache(maxsize=8)
def to_geographic(crs: str) -> Any:
    """Transformer from a CRS to WGS 84, always x (longitude) before y (latitude)."""
    from pyproj import Transformer

    return Transformer.from_crs(crs, GEOGRAPHIC_CRS, always_xy=True)


@lru_cache(maxsize=8)
def from_geographic(crs: str) -> Any:
    """Transformer from WGS 84 to a CRS, always x (longitude) before y (latitude)."""
    from pyproj import Transformer

    return Transformer.from_crs(GEOGRAPHIC_CRS, crs, always_xy=True)
