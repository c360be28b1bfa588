"""One satellite seen from the places: line of sight, frame, skew, EIRP."""

from __future__ import annotations

from functools import cached_property
from typing import Any

import numpy as np
from numpy.typing import NDArray

from geoskew import geometry, polarisation
from geoskew.geometry import Array, LineOfSight, Local
from geoskew.places import Places
from geoskew.polarisation import BeamFrame
from geoskew.situation.inputs import Coverage


class View:
    """A satellite (of the scenario, or a neighbour) as each place sees it; everything lazy and kept."""

    def __init__(self, satellite: Any, places: Places, coverage: Coverage | None = None) -> None:
        self.satellite = satellite
        self.places = places
        self._coverage = coverage

    @cached_property
    def position(self) -> Array:
        """Earth-fixed position, (3,), metres."""
        return geometry.satellite_position(self.satellite.longitude_deg, self.satellite.latitude_deg)

    @cached_property
    def sight(self) -> LineOfSight:
        """Line of sight from each place."""
        return geometry.line_of_sight(
            self.places.longitude, self.places.latitude, self.places.geometric_height, self.position
        )

    @cached_property
    def azimuth(self) -> Array:
        """Degrees."""
        return geometry.azimuth(self.sight.direction)

    @cached_property
    def elevation(self) -> Array:
        """Free-space elevation, degrees."""
        return geometry.elevation(self.sight.direction)

    @cached_property
    def frame(self) -> BeamFrame:
        """Axes of the satellite's antenna."""
        aim = getattr(self.satellite, "aim", None)
        return self.frame_at(aim)

    def frame_at(self, aim: Any) -> BeamFrame:
        """Axes of an antenna of this satellite with another aim (None: the sub-satellite point)."""
        return polarisation.beam_frame(self.position, None if aim is None else (aim.lon_deg, aim.lat_deg))

    @cached_property
    def arriving(self) -> Local:
        """E-vector of the V axis where it arrives."""
        return polarisation.vertical_axis(
            self.frame,
            self.satellite.tilt_deg,
            self.sight.direction,
            self.places.longitude,
            self.places.latitude,
        )

    @cached_property
    def skew(self) -> Array:
        """Degrees in (−90, 90]."""
        return polarisation.angle_from_vertical(self.arriving, self.sight.direction)

    def seen_from(self, dish: View) -> Array:
        """Setting that suits this satellite in a dish that looks at another one, degrees."""
        return polarisation.seen_in_dish(self.arriving, self.sight.direction, dish.sight.direction)

    @cached_property
    def eirp(self) -> Array:
        """EIRP towards each place at the operating point, dBW; NaN outside of the coverage."""
        satellite = self.satellite
        if self._coverage is not None:
            level = self._coverage.eirp(self.places.longitude, self.places.latitude)
        elif satellite.beams:
            level = self._strongest_beam()
        else:
            level = np.asarray(satellite.eirp_dbw, dtype=np.float64)
        return np.asarray(level + satellite.eirp_offset_db)

    def _strongest_beam(self) -> Array:
        from geoskew.coverage import beam_eirp

        where = (self.places.longitude, self.places.latitude)
        direction = self.sight.direction
        travel = Local(-direction.east, -direction.north, -direction.up)
        levels = []
        for beam in self.satellite.beams:
            frame = self.frame_at(beam.aim if beam.aim is not None else self.satellite.aim)
            axis, right, top = (geometry.in_local_frame(one, *where) for one in frame)
            off_axis, position = geometry.off_axis_and_position_angle(axis, right, top, travel)
            levels.append(
                beam_eirp(
                    off_axis,
                    position,
                    peak_dbw=beam.peak_dbw,
                    major_deg=beam.major_deg,
                    minor_deg=beam.minor_deg,
                    orientation_deg=beam.orientation_deg,
                    pattern=beam.pattern,
                )
            )
        return np.asarray(np.maximum.reduce(levels))

    def usable(self, lowest_elevation: float) -> NDArray[np.bool_]:
        """Where the satellite stands at or above the lowest usable elevation."""
        return np.asarray(self.elevation >= lowest_elevation)
