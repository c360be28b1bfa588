"""EIRP towards a place: elliptical beams, published contours, rasters. Arrays in, arrays out."""
