"""What part of the world a field map shows."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from geoskew.outputs.fieldmap.content import Box, MapContent
from geoskew.outputs.fieldmap.lines import near
from geoskew.outputs.fieldmap.overlays import MOST_LATITUDE, latitude_of, mercator_y, to_mercator


@dataclass(frozen=True, slots=True)
class Extent:
    """Edges in degrees; east may run past 180."""

    west: float
    south: float
    east: float
    north: float

    @property
    def middle(self) -> float:
        """Longitude about which everything is laid out."""
        return (self.west + self.east) / 2.0

    def frame(self) -> Box:
        """The box to which outlines are cut and beyond which the map does not move."""
        top, bottom = (float(mercator_y(edge)) for edge in (self.north, self.south))
        width, height = self.east - self.west, top - bottom
        # A wide screen shows much beside a tall area, a phone much above and below a wide one.
        half = min(180.0, max(width / 2.0 + 8.0, 0.8 * width, 1.5 * height))
        above = max(height / 2.0 + 8.0, 0.8 * height, 1.3 * width)
        middle = (top + bottom) / 2.0
        return (
            round(self.middle - half, 3),
            round(float(latitude_of(max(middle - above, -180.0))), 3),
            round(self.middle + half, 3),
            round(float(latitude_of(min(middle + above, 180.0))), 3),
        )


def extent_of(content: MapContent) -> Extent:
    """Bounds of overlays and sites together; of the land under the satellites where there are neither."""
    boxes: list[tuple[float, float, float, float]] = []
    for overlay in content.overlays:
        # Two cells are enough to know the edges.
        grid = to_mercator(overlay, long_side=2)
        boxes.append((grid.west, grid.south, grid.east, grid.north))
    if content.sites is not None and len(content.sites):
        longitude = content.sites["lon"].to_numpy(dtype=np.float64)
        latitude = content.sites["lat"].to_numpy(dtype=np.float64)
        middle = (boxes[0][0] + boxes[0][2]) / 2.0 if boxes else _middle(longitude)
        # A site far off on the other side of the world must not stretch the view of all the others.
        x = near(longitude, middle)
        boxes.append((float(x.min()), float(latitude.min()), float(x.max()), float(latitude.max())))
    if not boxes:
        slot = content.geometry.incoming.longitude
        boxes.append((slot - 60.0, -60.0, slot + 60.0, 60.0))
    west, south = min(box[0] for box in boxes), min(box[1] for box in boxes)
    east, north = max(box[2] for box in boxes), max(box[3] for box in boxes)
    if east - west > 360.0:
        west, east = (west + east) / 2.0 - 180.0, (west + east) / 2.0 + 180.0
    return Extent(west, max(south, -MOST_LATITUDE), east, min(north, MOST_LATITUDE))


def _middle(longitude: np.ndarray[tuple[int, ...], np.dtype[np.float64]]) -> float:
    """Middle of the shortest arc that holds all longitudes: opposite the widest gap."""
    around = np.unique(np.mod(longitude, 360.0))
    gaps = np.diff(np.append(around, around[0] + 360.0))
    after = int(np.argmax(gaps))
    start = around[(after + 1) % around.size]
    middle = start + (360.0 - float(gaps[after])) / 2.0
    return float(np.mod(middle + 180.0, 360.0) - 180.0)
