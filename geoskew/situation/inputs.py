"""What a scenario's files become once, before any place is looked at."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any, Protocol

from numpy.typing import ArrayLike

from geoskew.errors import InputError, Problem
from geoskew.geometry import Array
from geoskew.scenario import Scenario


class Coverage(Protocol):
    """Anything that gives the EIRP towards places."""

    def eirp(self, longitude: ArrayLike, latitude: ArrayLike) -> Array:
        """EIRP in dBW, broadcast shape; NaN outside of the coverage."""
        ...


@dataclass(frozen=True)
class Inputs:
    """Read once a run, shared by all blocks and workers; picklable.

    ``coverage_before`` and ``coverage_after`` are None where a satellite has one number or beams.
    """

    coverage_before: Coverage | None = None
    coverage_after: Coverage | None = None


def prepare(scenario: Scenario) -> Inputs:
    """Read the footprints that the scenario names.

    Raises
    ------
    InputError
        Footprints that cannot be used, those of both satellites; the messages name file and feature.
    """
    fields: list[Coverage | None] = []
    problems: dict[Problem, None] = {}
    for satellite in (scenario.outgoing, scenario.incoming):
        try:
            fields.append(_coverage(satellite))
        except InputError as error:
            problems |= dict.fromkeys(error.problems)
    if problems:
        raise InputError(problems)
    return Inputs(*fields)


def _coverage(satellite: Any) -> Coverage | None:
    if satellite.eirp_contours is not None:
        from geoskew.coverage import contour_field

        given = satellite.eirp_contours
        return contour_field(given.file, given.field, peak_dbw=given.peak_dbw)
    if satellite.eirp_raster is not None:
        from geoskew.coverage import raster_field

        return raster_field(satellite.eirp_raster)
    return None
