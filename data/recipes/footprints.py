"""Makes the invented footprints of the demonstration: contour lines of two synthetic, smooth beams.

Run from the root of a checkout: ``.venv/bin/python data/recipes/footprints.py``. The level at a
direction (u to the east, v to the north, degrees seen from the satellite) is the power sum of a few
lobes, each a Gaussian of its own width, axis and peak. Lines are traced on a fine grid of directions
in the satellite's view, thinned to a kilometre or so and written as GeoJSON, one closed line a level.
"""

from __future__ import annotations

import json
from pathlib import Path
from typing import NamedTuple

import contourpy
import numpy as np
import shapely
from numpy.typing import NDArray

SLOT_DEG = -66.2
EARTH_RADIUS_KM = 6371.0
ORBIT_RADIUS_KM = 42164.17
FOLDER = Path(__file__).resolve().parent.parent / "southern-cone"


class Lobe(NamedTuple):
    """Peak (dBW), aim point (degrees), half-power half-widths (degrees) and lean of the long axis."""

    peak: float
    longitude: float
    latitude: float
    long_deg: float
    short_deg: float
    lean_deg: float


BEAMS = {
    "eirp-velarin": (
        range(44, 54),
        (Lobe(52.4, -67.5, -43.0, 1.05, 1.0, 90.0), Lobe(52.0, -62.5, -26.5, 1.6, 1.25, 70.0)),
    ),
    "eirp-osmara": (
        range(42, 55),
        (Lobe(54.3, -62.0, -28.0, 1.65, 1.25, 75.0), Lobe(47.4, -68.5, -44.0, 0.95, 0.9, 90.0)),
    ),
}


def view(longitude: NDArray[np.float64], latitude: NDArray[np.float64]) -> tuple[NDArray[np.float64], ...]:
    """Direction of places seen from the satellite on a spherical Earth: u, v in degrees."""
    lon, lat = np.radians(longitude - SLOT_DEG), np.radians(latitude)
    depth = ORBIT_RADIUS_KM - EARTH_RADIUS_KM * np.cos(lat) * np.cos(lon)
    east = EARTH_RADIUS_KM * np.cos(lat) * np.sin(lon)
    north = EARTH_RADIUS_KM * np.sin(lat)
    return np.degrees(np.arctan2(east, depth)), np.degrees(np.arctan2(north, np.hypot(depth, east)))


def ground(u: NDArray[np.float64], v: NDArray[np.float64]) -> tuple[NDArray[np.float64], ...]:
    """Longitude and latitude where a direction meets the sphere; NaN where it misses it."""
    east, north = np.cos(np.radians(v)) * np.sin(np.radians(u)), np.sin(np.radians(v))
    ahead = np.cos(np.radians(v)) * np.cos(np.radians(u))
    root = (ORBIT_RADIUS_KM * ahead) ** 2 - ORBIT_RADIUS_KM**2 + EARTH_RADIUS_KM**2
    distance = ORBIT_RADIUS_KM * ahead - np.sqrt(np.where(root > 0.0, root, np.nan))
    longitude = SLOT_DEG + np.degrees(np.arctan2(distance * east, ORBIT_RADIUS_KM - distance * ahead))
    return longitude, np.degrees(np.arcsin(distance * north / EARTH_RADIUS_KM))


def level(lobes: tuple[Lobe, ...], u: NDArray[np.float64], v: NDArray[np.float64]) -> NDArray[np.float64]:
    """EIRP in dBW at directions, the power sum of the lobes."""
    power = np.zeros(np.broadcast_shapes(u.shape, v.shape))
    for lobe in lobes:
        aim_u, aim_v = view(np.array(lobe.longitude), np.array(lobe.latitude))
        lean = np.radians(lobe.lean_deg)
        along = (u - aim_u) * np.cos(lean) + (v - aim_v) * np.sin(lean)
        across = (v - aim_v) * np.cos(lean) - (u - aim_u) * np.sin(lean)
        fall = 3.0 * ((along / lobe.long_deg) ** 2 + (across / lobe.short_deg) ** 2)
        power += 10.0 ** ((lobe.peak - fall) / 10.0)
    return 10.0 * np.log10(power)


def contours(levels: range, lobes: tuple[Lobe, ...]) -> list[dict[str, object]]:
    """GeoJSON features of the closed contour lines, lowest level first."""
    u, v = np.arange(-6.0, 6.001, 0.02), np.arange(-8.68, 1.001, 0.02)
    generator = contourpy.contour_generator(u, v, level(lobes, u[None, :], v[:, None]))
    features: list[dict[str, object]] = []
    for value in levels:
        for line in generator.lines(float(value)):
            path = shapely.LineString(np.column_stack(ground(line[:, 0], line[:, 1]))).simplify(0.01)
            points = np.round(shapely.get_coordinates(path), 3).tolist()
            if points[0] != points[-1] or not np.isfinite(points).all():
                raise SystemExit(f"the {value} dBW line is not closed on the Earth; change the lobes")
            geometry = {"type": "LineString", "coordinates": points}
            features.append({"type": "Feature", "properties": {"dbw": value}, "geometry": geometry})
    return features


def main() -> None:
    """Write both footprints."""
    for name, (levels, lobes) in BEAMS.items():
        lines = ",\n".join(json.dumps(feature, separators=(",", ":")) for feature in contours(levels, lobes))
        text = f'{{"type":"FeatureCollection","features":[\n{lines}\n]}}\n'
        (FOLDER / f"{name}.geojson").write_text(text, encoding="utf-8")


if __name__ == "__main__":
    main()
