"""Where a satellite stands and how its polarisation arrives, along a row of places.

The formulas are those of ``geoskew.geometry`` and ``geoskew.polarisation``, in vectors that keep their
length: with p from the place to the satellite, r = |p|, x the E-vector on the beam axis and b that axis,
the arriving vector is x − f·(b − p/r) with f = −(x·p)/(r − b·p). Vectors are in double precision; an
angle that is only stored comes from a single-precision arc tangent (2e-5 degrees).
"""

from __future__ import annotations

from typing import Final

import numpy as np
from numpy.typing import NDArray

from geoskew.kernels.compiling import compiled
from geoskew.kernels.elementary import HALF_PI, IN_DEGREES, arctan_full, arctan_ratio, arctan_ratio_single

Array = NDArray[np.float64]
Single = NDArray[np.float32]

# As in ``geoskew.geometry``: a level part this small against the distance is the zenith.
_ZENITH_SQUARED: Final = 1e-26
_ZENITH_SINGLE: Final = np.float32(_ZENITH_SQUARED)
_HALF: Final = np.float32(0.5)
_ONE: Final = np.float32(1.0)
_IN_DEGREES: Final = np.float32(IN_DEGREES)
_ZERO: Final = np.float32(0.0)
_QUARTER_TURN: Final = np.float32(90.0)
_HALF_TURN: Final = np.float32(180.0)
_FULL_TURN: Final = np.float32(360.0)


@compiled
def vector_row(
    cosine: Array, sine: Array, own: Array, position: Array, east: Array, north: Array, up: Array, r: Array
) -> None:
    """Vector from each place to a satellite along local east, north and up, and its length, metres.

    `cosine` and `sine` of the longitude (W,); `own` (5, W) sine and cosine of the latitude, the place's
    own components north and up, and height; `position` (3,) Earth-fixed.
    """
    x, y, z = position[0], position[1], position[2]
    s, c, own_north, own_up, height = own[0], own[1], own[2], own[3], own[4]
    for j in range(r.size):
        outward = x * cosine[j] + y * sine[j]
        e = y * cosine[j] - x * sine[j]
        n = z * c[j] - s[j] * outward - own_north[j]
        u = z * s[j] + c[j] * outward - own_up[j] - height[j]
        east[j] = e
        north[j] = n
        up[j] = u
        r[j] = np.sqrt(e * e + n * n + u * u)


@compiled
def unit_row(east: Array, north: Array, up: Array, r: Array, unit: Single) -> None:
    """Unit vectors of single precision, (3, W): loops over nothing else are twice as wide."""
    u_east, u_north, u_up = unit[0], unit[1], unit[2]
    for j in range(r.size):
        scale = 1.0 / r[j]
        u_east[j] = np.float32(east[j] * scale)
        u_north[j] = np.float32(north[j] * scale)
        u_up[j] = np.float32(up[j] * scale)


@compiled
def azimuth_row(unit: Single, azimuth: Single) -> None:
    """Degrees clockwise from north in [0, 360), 0 at the zenith."""
    east, north = unit[0], unit[1]
    for j in range(azimuth.size):
        e, n = east[j], north[j]
        bearing = _IN_DEGREES * arctan_ratio_single(e, n)
        southern = (n < _ZERO) | ((n == _ZERO) & (e < _ZERO))
        bearing = bearing + _HALF_TURN if southern else bearing
        bearing = bearing + _FULL_TURN if bearing < _ZERO else bearing
        bearing = _ZERO if bearing >= _FULL_TURN else bearing
        azimuth[j] = _ZERO if e * e + n * n < _ZENITH_SINGLE else bearing


@compiled
def elevation_row(unit: Single, elevation: Single) -> None:
    """Degrees above the horizontal, negative below it."""
    east, north, up = unit[0], unit[1], unit[2]
    for j in range(elevation.size):
        level = np.sqrt(east[j] * east[j] + north[j] * north[j])
        elevation[j] = _IN_DEGREES * arctan_ratio_single(up[j], level)


@compiled
def arriving_row(
    cosine: Array, sine: Array, own: Array, frame: Array, to: Array, r: Array, arriving: Array
) -> None:
    """E-vector of the V axis where it arrives, times r, into (3, W).

    `frame` (2, 3): E-vector on the beam axis and that axis; `to` (3, W) the vector to the satellite.
    """
    x, y, z = frame[0, 0], frame[0, 1], frame[0, 2]
    a, b, c = frame[1, 0], frame[1, 1], frame[1, 2]
    s_lat, c_lat = own[0], own[1]
    east, north, up = to[0], to[1], to[2]
    v_east, v_north, v_up = arriving[0], arriving[1], arriving[2]
    for j in range(r.size):
        out_x, out_b = x * cosine[j] + y * sine[j], a * cosine[j] + b * sine[j]
        x_east, b_east = y * cosine[j] - x * sine[j], b * cosine[j] - a * sine[j]
        x_north, b_north = z * c_lat[j] - s_lat[j] * out_x, c * c_lat[j] - s_lat[j] * out_b
        x_up, b_up = z * s_lat[j] + c_lat[j] * out_x, c * s_lat[j] + c_lat[j] * out_b
        along = x_east * east[j] + x_north * north[j] + x_up * up[j]
        axial = b_east * east[j] + b_north * north[j] + b_up * up[j]
        f = -along / (r[j] - axial)
        v_east[j] = r[j] * x_east - f * (r[j] * b_east - east[j])
        v_north[j] = r[j] * x_north - f * (r[j] * b_north - north[j])
        v_up[j] = r[j] * x_up - f * (r[j] * b_up - up[j])


@compiled
def vertical_row(to: Array, r: Array, arriving: Array, angle: Array) -> None:
    """Angle of arriving vectors (any length) from the vertical of the view along `to`.

    Clockwise, radians in (−π/2, π/2]. At the zenith the person faces north: the top of the view is south.
    """
    east, north = to[0], to[1]
    v_east, v_north, v_up = arriving[0], arriving[1], arriving[2]
    for j in range(angle.size):
        e, n = east[j], north[j]
        zenith = e * e + n * n < _ZENITH_SQUARED * r[j] * r[j]
        right = v_east[j] if zenith else v_east[j] * n - v_north[j] * e
        top = -v_north[j] if zenith else r[j] * v_up[j]
        a = arctan_ratio(right, top)
        angle[j] = HALF_PI if a <= -HALF_PI else a


@compiled
def narrowed(values: Array, out: Single) -> None:
    """Values in single precision."""
    for j in range(values.size):
        out[j] = np.float32(values[j])


@compiled
def single_row(cosine: Single, sine: Single, own: Single, frame: Single, unit: Single, angle: Single) -> None:
    """`arriving_row` and `vertical_row` in one and in single precision, degrees in (−90, 90].

    `cosine`, `sine` and `own` (2, W) of longitude and latitude. High up, where the vertical all but
    vanishes in the view, its component follows from the two others: the vector is normal to `unit`.
    """
    x, y, z = frame[0, 0], frame[0, 1], frame[0, 2]
    a, b, c = frame[1, 0], frame[1, 1], frame[1, 2]
    s_lat, c_lat = own[0], own[1]
    east, north, up = unit[0], unit[1], unit[2]
    for j in range(angle.size):
        e, n, u = east[j], north[j], up[j]
        out_x, out_b = x * cosine[j] + y * sine[j], a * cosine[j] + b * sine[j]
        x_east, b_east = y * cosine[j] - x * sine[j], b * cosine[j] - a * sine[j]
        x_north, b_north = z * c_lat[j] - s_lat[j] * out_x, c * c_lat[j] - s_lat[j] * out_b
        x_up, b_up = z * s_lat[j] + c_lat[j] * out_x, c * s_lat[j] + c_lat[j] * out_b
        along = x_east * e + x_north * n + x_up * u
        axial = b_east * e + b_north * n + b_up * u
        f = -along / (_ONE - axial)
        v_east = x_east - f * (b_east - e)
        v_north = x_north - f * (b_north - n)
        v_up = x_up - f * (b_up - u)
        high = u * u > _HALF
        right = (v_east * n - v_north * e) * (u if high else _ONE)
        top = -(v_east * e + v_north * n) if high else v_up
        zenith = e * e + n * n < _ZENITH_SINGLE
        right = v_east if zenith else right
        top = -v_north if zenith else top
        degrees = _IN_DEGREES * arctan_ratio_single(right, top)
        angle[j] = _QUARTER_TURN if degrees <= -_QUARTER_TURN else degrees


@compiled
def carry_row(to: Array, r: Array, far: Array, q: Array, arriving: Array) -> None:
    """Carry vectors, in place, along the arc from the direction `far` (length q) to `to` (length r).

    v − ((v·t)/(1 + s·t))·(s + t) with s and t the unit vectors.
    """
    t_east, t_north, t_up = to[0], to[1], to[2]
    s_east, s_north, s_up = far[0], far[1], far[2]
    v_east, v_north, v_up = arriving[0], arriving[1], arriving[2]
    for j in range(r.size):
        along = v_east[j] * t_east[j] + v_north[j] * t_north[j] + v_up[j] * t_up[j]
        both = s_east[j] * t_east[j] + s_north[j] * t_north[j] + s_up[j] * t_up[j]
        share = along / (r[j] * q[j] + both)
        v_east[j] -= share * (s_east[j] + t_east[j] * q[j] / r[j])
        v_north[j] -= share * (s_north[j] + t_north[j] * q[j] / r[j])
        v_up[j] -= share * (s_up[j] + t_up[j] * q[j] / r[j])


@compiled
def apart_row(to: Array, far: Array, apart: Array) -> None:
    """Angle between two vectors from both sine and cosine, radians."""
    t_east, t_north, t_up = to[0], to[1], to[2]
    s_east, s_north, s_up = far[0], far[1], far[2]
    for j in range(apart.size):
        east = t_north[j] * s_up[j] - t_up[j] * s_north[j]
        north = t_up[j] * s_east[j] - t_east[j] * s_up[j]
        up = t_east[j] * s_north[j] - t_north[j] * s_east[j]
        dot = t_east[j] * s_east[j] + t_north[j] * s_north[j] + t_up[j] * s_up[j]
        apart[j] = arctan_full(np.sqrt(east * east + north * north + up * up), dot)
