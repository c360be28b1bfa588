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
            level, _ = self.strongest_beam
        else:
            level = np.asarray(satellite.eirp_dbw, dtype=np.float64)
        return np.asarray(level + satellite.eirp_offset_db)

    @cached_property
    def isolation(self) -> Array:
        """Cross-polar isolation of the satellite's antenna towards each place, dB.

        The stated one; towards the flank of an elliptical beam no more than its cross-polar pattern leaves.
        """
        stated = np.asarray(self.satellite.isolation_db, dtype=np.float64)
        if self._coverage is not None or not getattr(self.satellite, "beams", ()):
            return stated
        from geoskew.coverage import beam_isolation

        leaves = [beam_isolation(*where, **_ellipse(beam)) for beam, where in self._beams]
        serving = np.maximum(self.strongest_beam[1], 0)
        return np.asarray(np.minimum(stated, np.choose(serving, np.broadcast_arrays(*leaves))))

    @cached_property
    def strongest_beam(self) -> tuple[Array, NDArray[np.intp]]:
        """EIRP of the strongest beam without the offset, dBW, and its number; NaN and −1: none."""
        from geoskew.coverage import strongest

        return strongest(self._beam_levels)

    @cached_property
    def _beams(self) -> list[tuple[Any, tuple[Array, Array]]]:
        """Each beam with the places' angle off its axis and position angle."""
        where = (self.places.longitude, self.places.latitude)
        direction = self.sight.direction
        travel = Local(-direction.east, -direction.north, -direction.up)
        found = []
        for beam in self.satellite.beams:
            frame = self.frame_at(beam.aim if beam.aim is not None else self.satellite.aim)
            axes = [geometry.in_local_frame(one, *where) for one in frame]
            found.append((beam, geometry.off_axis_and_position_angle(axes[0], axes[1], axes[2], travel)))
        return found

    @cached_property
    def _beam_levels(self) -> list[Array]:
        from geoskew.coverage import beam_eirp

        return [beam_eirp(*where, peak_dbw=beam.peak_dbw, **_ellipse(beam)) for beam, where in self._beams]

    def usable(self, lowest_elevation: float) -> NDArray[np.bool_]:
        """Where the satellite stands at or above the lowest usable elevation."""
        return np.asarray(self.elevation >= lowest_elevation)


def _ellipse(beam: Any) -> dict[str, Any]:
    return {
        "major_deg": beam.major_deg,
        "minor_deg": beam.minor_deg,
        "orientation_deg": beam.orientation_deg,
        "pattern": beam.pattern,
    }
