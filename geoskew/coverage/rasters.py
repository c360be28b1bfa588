"""Bilinear sampling of a raster of EIRP."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import ArrayLike, NDArray

Array = NDArray[np.float64]


def cell_position(x: ArrayLike, y: ArrayLike, *, inverse: Sequence[float]) -> tuple[Array, Array]:
    """Fractional column and row of points, counted between the centres of cells.

    Parameters
    ----------
    x, y : array_like
        Coordinates in the raster's reference system, broadcastable.
    inverse : sequence of float
        The first six numbers of the inverse of the raster's affine transform.

    Returns
    -------
    tuple of ndarray
        Column and row; the centre of the first cell is (0, 0).
    """
    a, b, c, d, e, f = inverse[:6]
    easting, northing = np.asarray(x, dtype=np.float64), np.asarray(y, dtype=np.float64)
    return a * easting + b * northing + c - 0.5, d * easting + e * northing + f - 0.5


def bilinear(values: Array, column: ArrayLike, row: ArrayLike) -> Array:
    """Interpolate a raster between the four nearest centres of cells.

    Parameters
    ----------
    values : ndarray
        (rows, columns), NaN where there is no value.
    column, row : array_like
        Fractional positions between centres, broadcastable.

    Returns
    -------
    ndarray
        The broadcast shape. NaN outside of the raster's cells, and wherever one of the centres that
        count has no value: a value is never made up from fewer of them. In the outer half of an edge
        cell the value at the edge centres holds.

    Examples
    --------
    >>> bilinear(np.array([[50.0, 52.0], [np.nan, 54.0]]), [0.5, 0.5, 1.0], [0.0, 0.5, 0.5]).tolist()
    [51.0, nan, 53.0]
    """
    rows, columns = values.shape
    across, along = np.broadcast_arrays(
        np.asarray(column, dtype=np.float64), np.asarray(row, dtype=np.float64)
    )
    with np.errstate(invalid="ignore"):
        inside = (across >= -0.5) & (across <= columns - 0.5) & (along >= -0.5) & (along <= rows - 0.5)
    across = np.clip(np.where(inside, across, 0.0), 0.0, columns - 1.0)
    along = np.clip(np.where(inside, along, 0.0), 0.0, rows - 1.0)
    left, top = np.floor(across).astype(np.intp), np.floor(along).astype(np.intp)
    right, below = np.minimum(left + 1, columns - 1), np.minimum(top + 1, rows - 1)
    u, v = across - left, along - top
    total = np.zeros(across.shape)
    corners = (
        (top, left, (1.0 - u) * (1.0 - v)),
        (top, right, u * (1.0 - v)),
        (below, left, (1.0 - u) * v),
        (below, right, u * v),
    )
    for line, place, weight in corners:
        # A centre of no weight does not count, so its missing value must not spread.
        total = total + np.where(weight > 0.0, weight * values[line, place], 0.0)
    return np.where(inside, total, np.nan)
