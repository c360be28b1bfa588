"""The geometry of a block of places: rows of a grid, or the rows of any array of coordinates."""

from __future__ import annotations

from typing import Final, NamedTuple

import numpy as np
from numpy.typing import NDArray

from geoskew.constants import EARTH_ECCENTRICITY_SQUARED, EARTH_EQUATORIAL_RADIUS_M
from geoskew.kernels.compiling import compiled
from geoskew.kernels.directions import (
    apart_row,
    arriving_row,
    azimuth_row,
    carry_row,
    elevation_row,
    narrowed,
    single_row,
    unit_row,
    vector_row,
    vertical_row,
)

Array = NDArray[np.float64]
Single = NDArray[np.float32]

# Places at a time: what is known of them stays in the processor's first cache.
_CHUNK: Final = 256

NOT_WANTED: Final = np.empty((0, 0))
NOT_WANTED_SINGLE: Final = np.empty((0, 0), dtype=np.float32)


class Ground(NamedTuple):
    """Tables of a block's longitudes and latitudes.

    ``meridian`` (H or 1, 2, W): cosine and sine of the longitude. ``parallel`` (H, 5, W or 1): sine and
    cosine of the latitude, the place's own components north and up, and its height, metres.
    """

    meridian: Array
    parallel: Array


def ground(longitude: Array, latitude: Array, height: Array) -> Ground:
    """Tables of places: longitude (1, W) and latitude (H, 1), or both (H, W), degrees; height in metres."""
    turn, phi = np.deg2rad(longitude), np.deg2rad(latitude)
    sine, cosine = np.sin(phi), np.cos(phi)
    root = np.sqrt(1.0 - EARTH_ECCENTRICITY_SQUARED * sine * sine)
    north = -EARTH_ECCENTRICITY_SQUARED * EARTH_EQUATORIAL_RADIUS_M / root * sine * cosine
    parallel = np.broadcast_arrays(sine, cosine, north, EARTH_EQUATORIAL_RADIUS_M * root, height)
    return Ground(np.stack([np.cos(turn), np.sin(turn)], axis=1), np.stack(parallel, axis=1))


@compiled
def _spread(parallel: Array, i: int, start: int, n: int, own: Array) -> None:
    """What n places of row i, from `start` on, know of their latitudes, into (5, at least n)."""
    for m in range(5):
        if parallel.shape[2] == 1:
            own[m, :n] = parallel[i, m, 0]
        else:
            own[m, :n] = parallel[i, m, start : start + n]


@compiled
def look(
    meridian: Array,
    parallel: Array,
    position: Array,
    frame: Array,
    azimuth: Single,
    elevation: Single,
    kilometres: Single,
    skew_degrees: Single,
    distance: Array,
    sine: Array,
    skew: Array,
) -> None:
    """One satellite from every place: what is wanted of it, into (H, W) arrays; (0, 0) is not wanted.

    Parameters
    ----------
    meridian, parallel : ndarray
        From `ground`.
    position : ndarray
        (3,), metres, Earth-fixed.
    frame : ndarray
        (2, 3): E-vector of the V axis on the beam axis, and that axis.
    azimuth, elevation, kilometres, skew_degrees : ndarray of float32
        Degrees and km, as they are stored.
    distance : ndarray
        Metres.
    sine : ndarray
        Sine of the elevation.
    skew : ndarray
        Radians in (−π/2, π/2].
    """
    width = meridian.shape[2]
    to, arriving, own = np.empty((3, _CHUNK)), np.empty((3, _CHUNK)), np.empty((5, _CHUNK))
    lengths, single = np.empty(_CHUNK), frame.astype(np.float32)
    unit = np.empty((3, _CHUNK), dtype=np.float32)
    turn, latitude = np.empty((2, _CHUNK), dtype=np.float32), np.empty((2, _CHUNK), dtype=np.float32)
    for i in range(parallel.shape[0]):
        k = i if meridian.shape[0] > 1 else 0
        for start in range(0, width, _CHUNK):
            stop = min(start + _CHUNK, width)
            cos, sin, r = meridian[k, 0, start:stop], meridian[k, 1, start:stop], lengths[: stop - start]
            _spread(parallel, i, start, r.size, own)
            vector_row(cos, sin, own, position, to[0], to[1], to[2], r)
            if azimuth.size or elevation.size or skew_degrees.size:
                unit_row(to[0], to[1], to[2], r, unit)
            if azimuth.size:
                azimuth_row(unit, azimuth[i, start:stop])
            if elevation.size:
                elevation_row(unit, elevation[i, start:stop])
            if kilometres.size:
                for j in range(r.size):
                    kilometres[i, start + j] = 1e-3 * r[j]
            if distance.size:
                distance[i, start:stop] = r
            if sine.size:
                for j in range(r.size):
                    sine[i, start + j] = to[2, j] / r[j]
            if skew.size:
                arriving_row(cos, sin, own, frame, to, r, arriving)
                vertical_row(to, r, arriving, skew[i, start:stop])
            if skew_degrees.size:
                for m in range(2):
                    narrowed(meridian[k, m, start:stop], turn[m])
                    narrowed(own[m, : r.size], latitude[m])
                single_row(turn[0], turn[1], latitude, single, unit, skew_degrees[i, start:stop])


@compiled
def look_across(
    meridian: Array,
    parallel: Array,
    dish: Array,
    position: Array,
    frame: Array,
    seen: Array,
    apart: Array,
) -> None:
    """A satellite in a dish that looks at another one: setting that suits, and angle between both.

    Radians, into (H, W) arrays; (0, 0) is not wanted. `dish` (3,) is the position of the satellite that the
    dish looks at, `position` and `frame` are those of the satellite received.
    """
    width = meridian.shape[2]
    to, far, arriving = np.empty((3, _CHUNK)), np.empty((3, _CHUNK)), np.empty((3, _CHUNK))
    own, lengths = np.empty((5, _CHUNK)), np.empty((2, _CHUNK))
    for i in range(parallel.shape[0]):
        k = i if meridian.shape[0] > 1 else 0
        for start in range(0, width, _CHUNK):
            stop = min(start + _CHUNK, width)
            cos, sin = meridian[k, 0, start:stop], meridian[k, 1, start:stop]
            r, q = lengths[0, : stop - start], lengths[1, : stop - start]
            _spread(parallel, i, start, r.size, own)
            vector_row(cos, sin, own, dish, to[0], to[1], to[2], r)
            vector_row(cos, sin, own, position, far[0], far[1], far[2], q)
            if apart.size:
                apart_row(to, far, apart[i, start:stop])
            if seen.size:
                arriving_row(cos, sin, own, frame, far, q, arriving)
                carry_row(to, r, far, q, arriving)
                vertical_row(to, r, arriving, seen[i, start:stop])
