"""What every table of a scenario is made of: the frozen base model and the angles that several share."""

from __future__ import annotations

from typing import Annotated, TypeAlias

from pydantic import BaseModel, ConfigDict, Field

from geoskew.scenario.values import number

MOST_DBW = 75.0


class Table(BaseModel):
    """A table of the scenario file; its attributes are the file's keys, its values cannot be changed."""

    model_config = ConfigDict(frozen=True, extra="forbid")


def _guess_dbm(value: float) -> str | None:
    """Explain a power that is too large to be in dBW."""
    return f"if that is in dBm, write {value - 30:g}" if MOST_DBW < value <= MOST_DBW + 30 else None


def _guess_west(value: float) -> str | None:
    """Explain a longitude far outside of the circle: digits without their decimal point."""
    return "write decimal degrees, west negative" if abs(value) > 360 else None


Longitude: TypeAlias = Annotated[
    float, number("degrees east, negative in the west", low=-180, high=360, guess=_guess_west)
]
Latitude: TypeAlias = Annotated[float, number("degrees north, negative in the south", low=-90, high=90)]
SubSatelliteLatitude: TypeAlias = Annotated[
    float, number("the satellite's latitude at that moment, degrees north", low=-20, high=20)
]
Tilt: TypeAlias = Annotated[
    float, number("the turn of the satellite's polarisation, degrees", low=-180, high=180)
]
Power: TypeAlias = Annotated[float, number("a power in dBW", low=-30, high=MOST_DBW, guess=_guess_dbm)]
Isolation: TypeAlias = Annotated[float, number("a cross-polar isolation in dB", low=0, high=100)]
Offset: TypeAlias = Annotated[float, number("a difference of powers in dB", low=-60, high=60)]
Loss: TypeAlias = Annotated[float, number("a loss in dB, not negative", low=0, high=30)]
Ratio: TypeAlias = Annotated[float, number("a ratio of powers in dB", low=-20, high=100)]


class LonLat(Table):
    """A place on the Earth, degrees."""

    lon_deg: Longitude = Field(description="degrees east")
    lat_deg: Latitude = Field(description="degrees north")
