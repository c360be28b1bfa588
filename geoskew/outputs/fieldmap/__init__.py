"""The field map: one HTML file that needs no network.

The page is data and one script of our own on Leaflet, inside folium's figure and map. Every text that
comes from a file travels as an inert block and reaches the page as text content only.
"""

from __future__ import annotations

from geoskew.outputs.fieldmap.content import (
    Basemap,
    ContourLine,
    GeometryFacts,
    MapContent,
    Overlay,
    PlaceName,
    Route,
    SatelliteFacts,
    Tiles,
)
from geoskew.outputs.fieldmap.privacy import blurred, only
from geoskew.outputs.fieldmap.writing import compose, size_remark, tile_origin, write_fieldmap

__all__ = [
    "Basemap",
    "ContourLine",
    "GeometryFacts",
    "MapContent",
    "Overlay",
    "PlaceName",
    "Route",
    "SatelliteFacts",
    "Tiles",
    "blurred",
    "compose",
    "only",
    "size_remark",
    "tile_origin",
    "write_fieldmap",
]
