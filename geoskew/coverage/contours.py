"""A smooth field of EIRP from published contours.

Method. A thin plate (see `spline`) is fitted through points along the contours, so that the field has
no terraces and no kinks at the levels; where the plate would overshoot the levels between which a face
of the map lies, it is held there by one-sided penalties (an obstacle problem), so that between
neighbouring contours the field stays between their levels. Above a contour with none inside of it
the plate's own rise is kept in shape and bent to end at the stated peak, or after half a contour step at
most. Outside of the lowest contour the plate's own fall is kept for one contour step at most and for no
further than a stated distance; beyond there is no value.

The plane of the fit is plate carrée with its longitudes shortened by the cosine of the middle latitude.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

from geoskew.coverage.faces import faces_of, refuse_crossings
from geoskew.coverage.features import Feature, features_of, lines_of
from geoskew.coverage.fitting import Fitting, Plane
from geoskew.coverage.spline import Surface, evaluate
from geoskew.errors import InputError

Array = NDArray[np.float64]


@dataclass(frozen=True)
class ContourField:
    """A field of EIRP fitted to contours; evaluate it with `eirp`. Small, immutable and picklable.

    Attributes
    ----------
    levels : tuple of float
        The levels of the contours, dBW, rising.
    peak : float or None
        The stated peak, dBW.
    reach_deg : float
        Distance outside of the contoured area, degrees of latitude, beyond which there is no value.
    misfit_db : float
        The largest distance of the field from a level along its own contour, dB.
    """

    surface: Surface
    outside: Array
    plane: Plane
    levels: tuple[float, ...]
    peak: float | None
    reach_deg: float
    misfit_db: float

    @property
    def floor(self) -> float:
        """Lowest value of the field, dBW: the lowest level less one contour step."""
        return 2.0 * self.levels[0] - self.levels[1]

    def eirp(self, longitude: ArrayLike, latitude: ArrayLike) -> Array:
        """EIRP at places.

        Parameters
        ----------
        longitude, latitude : array_like
            Degrees, broadcastable; a row of longitudes with a column of latitudes is fastest.

        Returns
        -------
        ndarray
            dBW, the broadcast shape; NaN outside of the coverage. Visibility is not looked at.
        """
        x, y = self.plane.coordinates(longitude, latitude)
        values = self.surface.values(x, y)
        distance = evaluate(self.outside, self.surface.lattice, x, y, degree=1)
        with np.errstate(invalid="ignore"):
            known = (values >= self.floor) & (distance <= self.reach_deg)
        return np.where(known, values, np.nan)


def fit(
    geometries: Sequence[Any],
    levels: Sequence[float],
    *,
    peak: float | None = None,
    names: Sequence[str] | None = None,
) -> ContourField:
    """Fit a smooth field to contour lines or polygons.

    Parameters
    ----------
    geometries : sequence of shapely geometries
        Lines or polygons in degrees of longitude and latitude, WGS 84; closed, nested, several of one
        level, or open where the map's edge cuts them.
    levels : sequence of float
        The level of each, dBW.
    peak : float, optional
        EIRP at the highest point, dBW, above the highest level.
    names : sequence of str, optional
        What to call each geometry in a message; "feature 1" and so on when not given.

    Returns
    -------
    ContourField
        Meets the levels along the contours; between neighbouring ones it stays between their levels.

    Raises
    ------
    InputError
        For contours that cross, are out of order or not closed, levels or coordinates that cannot be,
        fewer than two levels, or a peak that is not above the highest level; names the feature.
    """
    lines = check(geometries, levels, names=names)
    faces = faces_of(lines)
    heights = tuple(sorted({line.level for line in lines}))
    if peak is not None and peak <= heights[-1]:
        raise InputError(
            f"peak {peak:g} dBW is not above the highest contour, {heights[-1]:g} dBW; state a higher peak"
        )
    fitting = Fitting(lines, faces, heights, peak)
    surface, misfit = fitting.surface()
    return ContourField(
        surface=surface,
        outside=fitting.outside(),
        plane=fitting.plane,
        levels=heights,
        peak=peak,
        reach_deg=fitting.reach,
        misfit_db=misfit,
    )


def check(
    geometries: Sequence[Any], levels: Sequence[float], *, names: Sequence[str] | None = None
) -> list[Feature]:
    """Turn drawn contours into lines and refuse those that cross; `faces.faces_of` checks the order.

    Arguments and Raises as `fit`.
    """
    lines = lines_of(features_of(geometries, levels, names))
    refuse_crossings(lines)
    return lines
