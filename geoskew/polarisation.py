"""Linear polarisation from the satellite's frame to the feed: skew, mismatch, discrimination.

Signs (all of them stand in DEVELOPERS.md as well): a satellite's tilt is counter-clockwise seen
from the satellite; skew and a feed's setting are clockwise for a person at the place who looks
towards the satellite; the two are the same turning, so a tilt of +t adds +t to the skew.
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import Final, NamedTuple

import numpy as np
from numpy.typing import ArrayLike, NDArray

from geoskew.angles import fold
from geoskew.geometry import Array, Local, at_zenith, dot, ellipsoid_position, in_local_frame

# Above this the loss of a crossed feed says nothing more: no antenna is that pure.
MISMATCH_CAP_DB: Final = 40.0


class BeamFrame(NamedTuple):
    """Axes of a satellite's antenna, Earth-fixed unit vectors (3,).

    ``axis`` is the beam axis; ``right`` is parallel to the equatorial plane, to the right seen from
    the satellite with north up; ``top`` completes the frame and lies in the plane of the Earth's
    axis and the beam axis.
    """

    axis: Array
    right: Array
    top: Array


def beam_frame(satellite: Array, aim: tuple[float, float] | None = None) -> BeamFrame:
    """Frame of a satellite's antenna.

    Parameters
    ----------
    satellite : ndarray
        (3,), metres.
    aim : (longitude, latitude) or None
        Where the beam axis meets the ellipsoid, degrees; None: the sub-satellite point.
    """
    axis = -satellite if aim is None else ellipsoid_position(*aim) - satellite
    axis = axis / np.linalg.norm(axis)
    right = np.cross(axis, np.array([0.0, 0.0, 1.0]))
    right = right / np.linalg.norm(right)
    return BeamFrame(axis, right, np.cross(right, axis))


def carried(vector: Local, start: Local, end: Local) -> Local:
    """Carry a vector normal to `start` along the great circle to `end` (both unit vectors).

    Ludwig's third definition of polarisation is this for the beam axis and a direction of travel:
    e(k) = e − ((e·k)/(1 + b·k))·(b + k) (A. C. Ludwig, IEEE Trans. AP-21, 1973).
    """
    factor = dot(vector, end) / (1.0 + dot(start, end))
    return Local(
        vector.east - factor * (start.east + end.east),
        vector.north - factor * (start.north + end.north),
        vector.up - factor * (start.up + end.up),
    )


def vertical_axis(
    frame: BeamFrame, tilt: float, direction: Local, longitude: ArrayLike, latitude: ArrayLike
) -> Local:
    """E-vector of the satellite's V axis where it arrives, in the local frame of each place.

    Parameters
    ----------
    frame : BeamFrame
        From `beam_frame`.
    tilt : float
        Degrees, counter-clockwise seen from the satellite.
    direction : Local
        Unit vector from the place towards the satellite.
    longitude, latitude : array_like
        Degrees.
    """
    angle = np.deg2rad(tilt)
    on_axis = in_local_frame(np.cos(angle) * frame.top - np.sin(angle) * frame.right, longitude, latitude)
    travel = Local(-direction.east, -direction.north, -direction.up)
    return carried(on_axis, in_local_frame(frame.axis, longitude, latitude), travel)


def angle_from_vertical(vector: Local, direction: Local) -> Array:
    """Angle of a vector normal to the line of sight from the local vertical, degrees in (−90, 90].

    Clockwise positive for a person who looks along `direction`. At the zenith, where no vertical
    exists, the person is taken to face north: the top of the view is then the south. Defined below
    the horizon as well.
    """
    to_right = vector.east * direction.north - vector.north * direction.east
    zenith = at_zenith(direction)
    right = np.where(zenith, vector.east, to_right)
    top = np.where(zenith, -vector.north, vector.up)
    return fold(np.rad2deg(np.arctan2(right, top)))


def skew(frame: BeamFrame, tilt: float, direction: Local, longitude: ArrayLike, latitude: ArrayLike) -> Array:
    """Skew: from the local vertical to the satellite's V axis, degrees in (−90, 90].

    Parameters as for `vertical_axis`; the shape is the broadcast one. The same number holds for a V
    and an H carrier. Source: Ludwig's third definition about the beam axis, angle of a linear
    polarisation as in the Radio Regulations, Appendix 4.

    Examples
    --------
    45° S, 10° west of the satellite: +9.86° without tilt, +30.86° with a tilt of +21°.

    >>> from geoskew import geometry
    >>> satellite = geometry.satellite_position(0.0)
    >>> sight = geometry.line_of_sight(-10.0, -45.0, 0.0, satellite)
    >>> frame = beam_frame(satellite)
    >>> [round(float(skew(frame, tilt, sight.direction, -10.0, -45.0)), 2) for tilt in (0.0, 21.0)]
    [9.86, 30.86]
    """
    arriving = vertical_axis(frame, tilt, direction, longitude, latitude)
    return angle_from_vertical(arriving, direction)


def seen_in_dish(arriving: Local, towards: Local, dish_axis: Local) -> Array:
    """Setting that suits an E-vector arriving along `towards` in a dish that looks along `dish_axis`.

    The vector is carried along the arc between the two lines of sight to the dish's axis and then
    measured like skew. Degrees in (−90, 90].
    """
    return angle_from_vertical(carried(arriving, towards, dish_axis), dish_axis)


def mismatch(angle: ArrayLike) -> NDArray[np.float64]:
    """Loss of the wanted carrier by a feed that is off by `angle` degrees, dB: −10·log10(cos² d).

    Never negative, capped at 40 dB. Any shape.
    """
    wanted = np.cos(np.deg2rad(angle)) ** 2
    floor = 10.0 ** (-MISMATCH_CAP_DB / 10.0)
    return np.asarray(np.maximum(-10.0 * np.log10(np.maximum(wanted, floor)), 0.0))


def power_sum(*isolations: ArrayLike) -> NDArray[np.float64]:
    """Leak x of several isolations in dB that add as powers, a ratio."""
    return _sum_of_ratios(isolations, 10.0)


def amplitude_sum(*isolations: ArrayLike) -> NDArray[np.float64]:
    """Leak a of several isolations in dB that add as worst phasors, a ratio of amplitudes."""
    return _sum_of_ratios(isolations, 20.0)


def _sum_of_ratios(isolations: Sequence[ArrayLike], decade: float) -> NDArray[np.float64]:
    total: NDArray[np.float64] = np.zeros(())
    for one in isolations:
        total = total + 10.0 ** (-np.asarray(one, dtype=np.float64) / decade)
    return total


def wanted_and_crossed(angle: ArrayLike, leak: ArrayLike) -> tuple[Array, Array]:
    """Factors on the wanted and the crossed carrier's power for a feed off by `angle` degrees.

    cos² d + x·sin² d and sin² d + x·cos² d, with `leak` x the power sum of the isolations.
    """
    sine = np.sin(np.deg2rad(angle)) ** 2
    x = np.asarray(leak, dtype=np.float64)
    return 1.0 - sine * (1.0 - x), x + sine * (1.0 - x)


def wanted_and_crossed_phasors(angle: ArrayLike, leak: ArrayLike) -> tuple[Array, Array]:
    """The same factors when the leaks add as worst phasors, with `leak` a their sum of amplitudes.

    max(0, |cos d| − a·|sin d|)² and (|sin d| + a·|cos d|)².
    """
    radians = np.deg2rad(angle)
    sine, cosine = np.abs(np.sin(radians)), np.abs(np.cos(radians))
    a = np.asarray(leak, dtype=np.float64)
    return np.maximum(0.0, cosine - a * sine) ** 2, (sine + a * cosine) ** 2


def discrimination(angle: ArrayLike, leak: ArrayLike, *, phasors: bool = False) -> Array:
    """Wanted over crossed carrier in dB for equal powers sent; −40 dB at the least.

    `leak` is a power sum, or with `phasors` an amplitude sum.
    """
    factors = wanted_and_crossed_phasors if phasors else wanted_and_crossed
    wanted, crossed = factors(angle, leak)
    floor = 10.0 ** (-MISMATCH_CAP_DB / 10.0)
    return np.asarray(10.0 * np.log10(np.maximum(wanted, floor * crossed) / crossed))
