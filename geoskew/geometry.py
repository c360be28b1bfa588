"""Where a satellite stands, seen from a place: azimuth, elevation, range, and angles between lines of sight.

Everything is expressed in the local east, north, up frame of WGS 84. There each component of the
vector to a satellite is a sum of products of a function of latitude and a function of longitude,
so that a geographic grid (longitude (1, W), latitude (H, 1)) needs no trigonometry per cell.
"""

from __future__ import annotations

from typing import Final, NamedTuple

import numpy as np
from numpy.typing import ArrayLike, NDArray

from geoskew.angles import wrap_azimuth
from geoskew.constants import (
    EARTH_ECCENTRICITY_SQUARED,
    EARTH_EQUATORIAL_RADIUS_M,
    GEOSTATIONARY_RADIUS_M,
)

Array = NDArray[np.float64]

# A direction whose level part is less than this (1e-6 m of the place) is the zenith: rounding makes the rest.
ZENITH_TOLERANCE: Final = 1e-13


class Local(NamedTuple):
    """A vector at each place, by its components along local east, north and up (broadcastable)."""

    east: Array
    north: Array
    up: Array


class LineOfSight(NamedTuple):
    """The direction from each place towards a satellite (a unit vector) and the distance in metres."""

    direction: Local
    range_m: Array


def satellite_position(longitude: float, latitude: float = 0.0) -> Array:
    """Position of a satellite on the geostationary sphere, Earth-centred Earth-fixed.

    Parameters
    ----------
    longitude, latitude : float
        Sub-satellite point, degrees; the latitude is geocentric, 0 without inclination.

    Returns
    -------
    ndarray
        (3,), metres.
    """
    lon, lat = np.deg2rad(longitude), np.deg2rad(latitude)
    direction = np.array([np.cos(lat) * np.cos(lon), np.cos(lat) * np.sin(lon), np.sin(lat)])
    return GEOSTATIONARY_RADIUS_M * direction


def ellipsoid_position(longitude: float, latitude: float, height: float = 0.0) -> Array:
    """Earth-centred Earth-fixed position of one point, metres, (3,); degrees and metres in. WGS 84."""
    lon, lat = np.deg2rad(longitude), np.deg2rad(latitude)
    normal = EARTH_EQUATORIAL_RADIUS_M / np.sqrt(1.0 - EARTH_ECCENTRICITY_SQUARED * np.sin(lat) ** 2)
    return np.array(
        [
            (normal + height) * np.cos(lat) * np.cos(lon),
            (normal + height) * np.cos(lat) * np.sin(lon),
            (normal * (1.0 - EARTH_ECCENTRICITY_SQUARED) + height) * np.sin(lat),
        ]
    )


def in_local_frame(vector: Array, longitude: ArrayLike, latitude: ArrayLike) -> Local:
    """Components of one Earth-fixed vector (3,) along local east, north and up at places in degrees."""
    lon, lat = np.deg2rad(longitude), np.deg2rad(latitude)
    outward = vector[0] * np.cos(lon) + vector[1] * np.sin(lon)
    return Local(
        east=vector[1] * np.cos(lon) - vector[0] * np.sin(lon),
        north=vector[2] * np.cos(lat) - np.sin(lat) * outward,
        up=vector[2] * np.sin(lat) + np.cos(lat) * outward,
    )


def line_of_sight(
    longitude: ArrayLike, latitude: ArrayLike, height: ArrayLike, satellite: Array
) -> LineOfSight:
    """Direction and distance from places to a satellite.

    Parameters
    ----------
    longitude, latitude : array_like
        Degrees, WGS 84, broadcastable.
    height : array_like
        Metres above the ellipsoid. A height above mean sea level may stand in: the geoid's 100 m at
        most change every angle by less than 0.001°.
    satellite : ndarray
        (3,), metres, from `satellite_position`.

    Returns
    -------
    LineOfSight
        Also below the horizon, where `up` is negative.

    Notes
    -----
    The vector of the place, along its own north and up, is
    (−N e² sin φ cos φ, a √(1 − e² sin² φ) + h) with N the prime vertical radius (WGS 84).
    """
    sine = np.sin(np.deg2rad(latitude))
    cosine = np.cos(np.deg2rad(latitude))
    root = np.sqrt(1.0 - EARTH_ECCENTRICITY_SQUARED * sine * sine)
    place_north = -EARTH_ECCENTRICITY_SQUARED * EARTH_EQUATORIAL_RADIUS_M / root * sine * cosine
    to_satellite = in_local_frame(satellite, longitude, latitude)
    east = to_satellite.east
    north = to_satellite.north - place_north
    up = to_satellite.up - (EARTH_EQUATORIAL_RADIUS_M * root + np.asarray(height, dtype=np.float64))
    distance = np.sqrt(east * east + north * north + up * up)
    return LineOfSight(Local(east / distance, north / distance, up / distance), distance)


def azimuth(direction: Local) -> Array:
    """Azimuth of a direction, degrees clockwise from true north in [0, 360); 0 at the zenith.

    Defined below the horizon as well.
    """
    bearing = np.arctan2(direction.east, direction.north)
    return wrap_azimuth(np.rad2deg(np.where(at_zenith(direction), 0.0, bearing)))


def at_zenith(direction: Local) -> NDArray[np.bool_]:
    """Whether a direction is straight up or down, where neither azimuth nor a vertical in the view exists."""
    return np.asarray(direction.east**2 + direction.north**2 < ZENITH_TOLERANCE**2)


def elevation(direction: Local) -> Array:
    """Geometric (free-space) elevation above the horizontal of the ellipsoid, degrees; negative below it."""
    level = np.hypot(direction.east, direction.north)
    return np.rad2deg(np.arctan2(direction.up, level))


def separation(first: Local, second: Local) -> Array:
    """Angle between two directions, degrees, from both sine and cosine so that small angles are exact."""
    cross_east = first.north * second.up - first.up * second.north
    cross_north = first.up * second.east - first.east * second.up
    cross_up = first.east * second.north - first.north * second.east
    sine = np.sqrt(cross_east**2 + cross_north**2 + cross_up**2)
    return np.rad2deg(np.arctan2(sine, dot(first, second)))


def dot(first: Local, second: Local) -> Array:
    """Scalar product of two local vectors."""
    return first.east * second.east + first.north * second.north + first.up * second.up


def off_axis_and_position_angle(axis: Local, right: Local, top: Local, travel: Local) -> tuple[Array, Array]:
    """Where directions of travel lie in a satellite's antenna frame.

    Parameters
    ----------
    axis, right, top : Local
        The frame's axes in the local frame of each place (`in_local_frame`).
    travel : Local
        Unit vector from the satellite to each place.

    Returns
    -------
    tuple of ndarray
        Angle off the beam axis, and position angle counter-clockwise from the equatorial direction
        seen from the satellite, in (−180, 180]; degrees.
    """
    return separation(axis, travel), np.rad2deg(np.arctan2(dot(travel, top), dot(travel, right)))
