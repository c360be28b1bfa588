"""Rows whose latitude and longitude stand in each other's place, told by the scenario's region."""

from __future__ import annotations

from typing import Final

import numpy as np
from numpy.typing import NDArray

from geoskew.region import Grid

# Sites this far outside of the region count as near it: lists reach a little beyond their region.
ROOM_DEG: Final = 1.0

Array = NDArray[np.float64]
Mask = NDArray[np.bool_]


def exchanged_rows(longitude: Array, latitude: Array, usable: Mask, grid: Grid) -> Mask:
    """Single rows that lie well outside of the region, but inside it with the two exchanged.

    Nothing is taken for exchanged where most of the other rows lie elsewhere too: the list is not one
    of the region's then. Nor where most rows look exchanged: that is what `exchanged_throughout` tells.

    Parameters
    ----------
    longitude, latitude : ndarray
        Degrees, (N,).
    usable : ndarray of bool
        Rows without another fault, (N,).
    grid : Grid
        The region.

    Returns
    -------
    ndarray of bool
        (N,).
    """
    near = usable & _near(longitude, latitude, grid)
    found = _inside_when_exchanged(longitude, latitude, usable & ~near, grid)
    count, rest = np.count_nonzero(found), np.count_nonzero(usable & ~found)
    single = count <= rest and 2 * np.count_nonzero(near) > rest
    return found if single else np.zeros_like(found)


def exchanged_throughout(longitude: Array, latitude: Array, grid: Grid) -> int:
    """How many places lie outside of the region, but inside it with the two exchanged; 0 unless most do."""
    outside = ~grid.covers(longitude, latitude)
    count = int(np.count_nonzero(_inside_when_exchanged(longitude, latitude, outside, grid)))
    return count if 2 * count > longitude.size else 0


def _inside_when_exchanged(longitude: Array, latitude: Array, mask: Mask, grid: Grid) -> Mask:
    possible = mask & (np.abs(longitude) <= 90.0)
    found = np.zeros_like(possible)
    found[possible] = grid.covers(latitude[possible], longitude[possible])
    return found


def _near(longitude: Array, latitude: Array, grid: Grid) -> Mask:
    near = np.zeros(longitude.shape, dtype=np.bool_)
    for east in (-ROOM_DEG, 0.0, ROOM_DEG):
        for north in (-ROOM_DEG, 0.0, ROOM_DEG):
            near |= grid.covers(longitude + east, np.clip(latitude + north, -90.0, 90.0))
    return near
