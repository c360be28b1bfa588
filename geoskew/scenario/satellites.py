"""The satellites of a scenario: the two that the changeover joins, and their neighbours on the orbit."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated, Any, Literal, TypeAlias

from pydantic import BeforeValidator, Field

from geoskew.scenario.parts import (
    Isolation,
    Longitude,
    LonLat,
    Offset,
    Power,
    SubSatelliteLatitude,
    Table,
    Tilt,
)
from geoskew.scenario.values import choice, existing, number, refuse, shown, text

Polarisation: TypeAlias = Annotated[Literal["V", "H", "L", "R"], choice("polarisation", "V", "H", "L", "R")]
_BeamWidth: TypeAlias = Annotated[float, number("a half-power width in degrees", low=0, above=True, high=20)]

EIRP_KINDS = ("eirp_dbw", "eirp_contours", "eirp_raster", "beam")


class EirpContours(Table):
    """Published contours of EIRP: a vector file and the column that holds each contour's level, dBW."""

    file: Annotated[Path, existing("a vector file of contours")] = Field(
        description="the path of a vector file of contours"
    )
    field: Annotated[str, text("the name of the column that holds the level in dBW")] = Field(
        description="the name of the column that holds the level in dBW"
    )
    peak_dbw: Power | None = None


class Beam(Table):
    """An elliptical beam around ``aim``, else around the satellite's own aim.

    Widths are full half-power widths; the orientation is that of the major axis, counter-clockwise from
    the equatorial plane's direction as seen from the satellite.
    """

    peak_dbw: Power = Field(description="the EIRP at the beam's axis in dBW")
    major_deg: _BeamWidth = Field(description="the larger half-power width in degrees")
    minor_deg: _BeamWidth = Field(description="the smaller half-power width in degrees")
    orientation_deg: Annotated[float, number("the turn of the major axis, degrees", low=-180, high=180)] = 0.0
    aim: LonLat | None = None
    pattern: Annotated[
        Literal["gaussian", "appendix-30", "fast-roll-off"],
        choice("beam pattern", "gaussian", "appendix-30", "fast-roll-off"),
    ] = "gaussian"


def _one_or_several(value: Any) -> Any:
    """Take one table for a list of one."""
    if isinstance(value, dict):
        return [value]
    if isinstance(value, list) and not value:
        raise refuse("[] is empty: give one beam as a table or several as an array of tables")
    return value


class Satellite(Table):
    """A satellite with its polarisation frame and its power; ``beams`` is the file's key ``beam``."""

    name: Annotated[str, text("the satellite's name")]
    longitude_deg: Longitude = Field(description="the satellite's longitude in degrees east, such as -66.2")
    latitude_deg: SubSatelliteLatitude = 0.0
    tilt_deg: Tilt = 0.0
    aim: LonLat | None = None
    isolation_db: Isolation = 30.0
    eirp_dbw: Power | None = None
    eirp_contours: EirpContours | None = None
    eirp_raster: Annotated[Path, existing("a raster of EIRP in dBW")] | None = None
    beams: Annotated[tuple[Beam, ...], BeforeValidator(_one_or_several)] = ()
    eirp_offset_db: Offset = 0.0
    eirp_spread_db: Annotated[float, number("a standard deviation in dB", low=0, high=20)] = 0.0


class Neighbour(Table):
    """A satellite that disturbs, at its place on the orbit before the changeover, after it, or both."""

    name: Annotated[str, text("the neighbour's name")]
    longitude_deg: Longitude = Field(description="the neighbour's longitude in degrees east")
    latitude_deg: SubSatelliteLatitude = 0.0
    eirp_dbw: Power = Field(
        description="its EIRP towards the region in dBW, within the wanted carrier's bandwidth"
    )
    tilt_deg: Tilt = 0.0
    polarisation: Polarisation = Field(description='the polarisation that it sends: "V", "H", "L" or "R"')
    isolation_db: Isolation = 30.0
    when: Annotated[Literal["both", "before", "after"], choice("moment", "both", "before", "after")] = "both"


def check_axes(beam: dict[str, Any]) -> str | None:
    """Say what is wrong with the two widths of a beam, or nothing."""
    major, minor = beam.get("major_deg"), beam.get("minor_deg")
    if isinstance(major, int | float) and isinstance(minor, int | float) and minor > major:
        return (
            f"minor_deg {shown(minor)} is larger than major_deg {shown(major)}: "
            "swap them and turn orientation_deg by 90"
        )
    return None
