"""EIRP towards a place: elliptical beams, published contours, rasters. Arrays in, arrays out."""

from __future__ import annotations

from geoskew.coverage.beams import PATTERNS, beam_eirp, beam_isolation, strongest
from geoskew.coverage.contours import ContourField, fit
from geoskew.coverage.files import contour_field
from geoskew.coverage.rasterfiles import RasterField, raster_field

__all__ = [
    "PATTERNS",
    "ContourField",
    "RasterField",
    "beam_eirp",
    "beam_isolation",
    "contour_field",
    "fit",
    "raster_field",
    "strongest",
]
