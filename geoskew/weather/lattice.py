"""Interpolation on the regular lattices of longitude and latitude that the maps are published on.

Rec. ITU-R P.1144 describes both methods: bilinear, and bicubic with the convolution kernel of its
Annex 1 (a = −0.5). A grid whose longitudes are (1, W) and latitudes (H, 1) is interpolated along its
rows first and along its columns after that, which costs a fraction of a look-up per cell.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

FloatArray = NDArray[np.float64]
IndexArray = NDArray[np.intp]


@dataclass(frozen=True)
class Lattice:
    """Values at the nodes of a regular lattice, south to north and west to east.

    Attributes
    ----------
    values : ndarray, shape (rows, columns)
        One value per node; row 0 is the southernmost.
    south, west : float
        Latitude of row 0 and longitude of column 0, degrees.
    per_degree : float
        Nodes per degree, along both axes.
    wrap : float
        Longitudes are brought into [wrap, wrap + 360), degrees, before they are looked up.
    """

    values: NDArray[np.float64] | NDArray[np.int16]
    south: float
    west: float
    per_degree: float
    wrap: float

    def rows(self, latitude: FloatArray, *, margin: int = 0) -> tuple[IndexArray, FloatArray]:
        """Row below each latitude and the fraction of a step above it; fraction NaN off the globe.

        `margin` rows are left free beyond the two around a latitude, on each side.
        """
        on_globe = np.abs(latitude) <= 90.0
        steps = np.where(on_globe, (latitude - self.south) * self.per_degree, np.nan)
        return _split(steps, self.values.shape[0], margin)

    def columns(self, longitude: FloatArray, *, margin: int = 0) -> tuple[IndexArray, FloatArray]:
        """Column west of each longitude and the fraction of a step east of it."""
        turned = (longitude - self.wrap) % 360.0 + self.wrap
        return _split((turned - self.west) * self.per_degree, self.values.shape[1], margin)


def _split(steps: FloatArray, count: int, margin: int) -> tuple[IndexArray, FloatArray]:
    index = np.clip(np.floor(np.nan_to_num(steps)), margin, count - 2 - margin).astype(np.intp)
    return index, steps - index


def is_separable(longitude: FloatArray, latitude: FloatArray) -> bool:
    """Whether the places are a grid of rows and columns: longitude (1, W), latitude (H, 1)."""
    return (
        longitude.ndim == latitude.ndim == 2 and longitude.shape[0] == 1 and latitude.shape[1] == 1
    ) and longitude.shape[1] > 1


def bilinear(lattice: Lattice, longitude: FloatArray, latitude: FloatArray) -> FloatArray:
    """Interpolate linearly between the four nodes around each place.

    Parameters
    ----------
    longitude, latitude : ndarray
        Degrees, any shapes that broadcast; any turn of longitude.

    Returns
    -------
    ndarray
        Of the common shape; NaN where a coordinate is NaN or the latitude is off the globe.
    """
    row, up = lattice.rows(latitude)
    column, right = lattice.columns(longitude)
    row_weights, column_weights = (1.0 - up, up), (1.0 - right, right)
    return _weighted(lattice.values, (row, row_weights), (column, column_weights))


def bicubic(lattice: Lattice, longitude: FloatArray, latitude: FloatArray) -> FloatArray:
    """Interpolate with the cubic convolution kernel over the sixteen nodes around each place.

    The lattice reaches at least one node beyond the places on each side. Shapes and NaN as in
    `bilinear`. Source: Rec. ITU-R P.1144, bicubic interpolation.
    """
    row, up = lattice.rows(latitude, margin=1)
    column, right = lattice.columns(longitude, margin=1)
    return _weighted(lattice.values, (row - 1, _cubic(up)), (column - 1, _cubic(right)))


def _cubic(fraction: FloatArray) -> tuple[FloatArray, ...]:
    def near(distance: FloatArray) -> FloatArray:
        return (1.5 * distance - 2.5) * distance * distance + 1.0

    def far(distance: FloatArray) -> FloatArray:
        return ((-0.5 * distance + 2.5) * distance - 4.0) * distance + 2.0

    return far(1.0 + fraction), near(fraction), near(1.0 - fraction), far(2.0 - fraction)


def _weighted(
    values: NDArray[np.float64] | NDArray[np.int16],
    rows: tuple[IndexArray, tuple[FloatArray, ...]],
    columns: tuple[IndexArray, tuple[FloatArray, ...]],
) -> FloatArray:
    row, row_weights = rows
    column, column_weights = columns
    if is_separable(column_weights[0], row_weights[0]):
        return _weighted_grid(values, (row[:, 0], row_weights), (column[0], column_weights))
    flat, width = values.ravel(), values.shape[1]
    start = row * width + column
    total = np.zeros(start.shape)
    for down, row_weight in enumerate(row_weights):
        for along, column_weight in enumerate(column_weights):
            total += row_weight * column_weight * flat[start + (down * width + along)]
    return total


def _weighted_grid(
    values: NDArray[np.float64] | NDArray[np.int16],
    rows: tuple[IndexArray, tuple[FloatArray, ...]],
    columns: tuple[IndexArray, tuple[FloatArray, ...]],
) -> FloatArray:
    row, row_weights = rows
    column, column_weights = columns
    first = int(column.min())
    span = slice(first, int(column.max()) + len(column_weights))
    along_rows = np.zeros((row.size, span.stop - first))
    for down, weight in enumerate(row_weights):
        along_rows += weight * values[row + down, span]
    column = column - first
    total = np.take(along_rows, column, axis=1)
    total *= column_weights[0]
    for along in range(1, len(column_weights)):
        total += np.take(along_rows, column + along, axis=1) * column_weights[along]
    return total


def corners(lattice: Lattice, longitude: FloatArray, latitude: FloatArray) -> Corners:
    """The four nodes around each place and their bilinear weights, for values that are changed first."""
    row, up = lattice.rows(latitude)
    column, right = lattice.columns(longitude)
    return Corners(row, column, up, right)


@dataclass(frozen=True)
class Corners:
    """Where the four nodes around each place are, and how much each of them counts."""

    row: IndexArray
    column: IndexArray
    up: FloatArray
    right: FloatArray

    def weight(self, north: int, east: int) -> FloatArray:
        """Bilinear weight of one node (0 or 1 along each axis)."""
        along_column = self.up if north else 1.0 - self.up
        along_row = self.right if east else 1.0 - self.right
        return np.asarray(along_column * along_row)

    def take(self, values: FloatArray, north: int, east: int) -> FloatArray:
        """Value at one node (0 or 1 along each axis) for each place."""
        row, column = self.row + north, self.column + east
        if is_separable(self.right, self.up):
            return np.asarray(np.take(values[row[:, 0]], column[0], axis=1))
        return np.asarray(values.ravel()[row * values.shape[1] + column])
