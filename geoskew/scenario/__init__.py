"""The scenario file: what a changeover study is told, read and validated as a whole."""

from __future__ import annotations

from geoskew.scenario.carrier import Carrier
from geoskew.scenario.fieldwork import Crew, Database, Visits
from geoskew.scenario.ground import (
    RESERVED_COLUMNS,
    Decision,
    Region,
    SitesTable,
    Terminal,
    Terrain,
    Weather,
)
from geoskew.scenario.model import Scenario
from geoskew.scenario.parts import LonLat
from geoskew.scenario.reading import from_dict, load
from geoskew.scenario.satellites import Beam, EirpContours, Neighbour, Satellite
from geoskew.scenario.template import TEMPLATE

__all__ = [
    "RESERVED_COLUMNS",
    "TEMPLATE",
    "Beam",
    "Carrier",
    "Crew",
    "Database",
    "Decision",
    "EirpContours",
    "LonLat",
    "Neighbour",
    "Region",
    "Satellite",
    "Scenario",
    "SitesTable",
    "Terminal",
    "Terrain",
    "Visits",
    "Weather",
    "from_dict",
    "load",
]
