"""Weather on the path, from the long-term statistics of the ITU-R P series. Arrays and floats only.

Two steps: `climate` looks the places up on the maps, once for all satellites and percentages;
`attenuation` (or `ladder`, for outages) evaluates the closed formulas for each place's own elevation,
height and polarisation tilt. `discrimination` is the depolarisation by rain and ice, `percentage_where`
turns margins along the ladder into the part of a year in which they are lost.
"""

from __future__ import annotations

from geoskew.weather.attenuation import Attenuation, attenuation, clear_sky_gas, combined, ladder
from geoskew.weather.climate import (
    CLEAR_PERCENTAGE,
    HELD_PERCENTAGE,
    Climate,
    clear_zenith,
    climate,
    climates,
)
from geoskew.weather.depolarisation import discrimination
from geoskew.weather.editions import EDITIONS
from geoskew.weather.outage import HOURS_PER_YEAR, PERCENTAGES, Crossing, hours, percentage_where

__all__ = [
    "CLEAR_PERCENTAGE",
    "EDITIONS",
    "HELD_PERCENTAGE",
    "HOURS_PER_YEAR",
    "PERCENTAGES",
    "Attenuation",
    "Climate",
    "Crossing",
    "attenuation",
    "clear_sky_gas",
    "clear_zenith",
    "climate",
    "climates",
    "combined",
    "discrimination",
    "hours",
    "ladder",
    "percentage_where",
]
