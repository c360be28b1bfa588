"""Azimuth, elevation, range and skew of a grid: compiled loops against other ways, per cell.

The other libraries give no skew: theirs is the easier job. The last lines watch over the vectoriser: the
same formulas with the C library's functions, cell by cell, run in scalar registers.
"""

from __future__ import annotations

import argparse
import math

import numpy as np
import pymap3d
from numpy.typing import NDArray
from pyproj import Transformer
from timing import machine, rounds, table

from geoskew import geometry, polarisation
from geoskew.kernels.compiling import compiled
from geoskew.kernels.sights import NOT_WANTED, ground, look

Array = NDArray[np.float64]
SATELLITE = geometry.satellite_position(-66.2)
FRAME = polarisation.beam_frame(SATELLITE, (-64.0, -36.5))
TILT = 21.0
VECTORISED_AT_LEAST = 4.0


@compiled
def cell_by_cell(longitude, latitude, position, frame, out):  # type: ignore[no-untyped-def]
    """The same four layers, each cell with the C library's functions."""
    squared = 0.0066943799901413165
    for i in range(latitude.size):
        for j in range(longitude.size):
            lon, lat = math.radians(longitude[j]), math.radians(latitude[i])
            so, co, sa, ca = math.sin(lon), math.cos(lon), math.sin(lat), math.cos(lat)
            root = math.sqrt(1.0 - squared * sa * sa)
            a = 6378137.0
            p = np.empty((3, 3))
            for k in range(3):
                x, y, z = (
                    (position[0], position[1], position[2])
                    if k == 0
                    else (frame[k - 1, 0], frame[k - 1, 1], frame[k - 1, 2])
                )
                away = x * co + y * so
                p[k, 0], p[k, 1], p[k, 2] = y * co - x * so, z * ca - sa * away, z * sa + ca * away
            p[0, 1] += squared * a / root * sa * ca
            p[0, 2] -= a * root
            e, n, u = p[0, 0], p[0, 1], p[0, 2]
            r = math.sqrt(e * e + n * n + u * u)
            f = -(p[1, 0] * e + p[1, 1] * n + p[1, 2] * u) / (r - (p[2, 0] * e + p[2, 1] * n + p[2, 2] * u))
            right = (p[1, 0] - f * p[2, 0]) * n - (p[1, 1] - f * p[2, 1]) * e
            top = r * p[1, 2] - f * (r * p[2, 2] - u)
            out[0, i, j] = math.degrees(math.atan2(e, n)) % 360.0
            out[1, i, j] = math.degrees(math.atan2(u, math.hypot(e, n)))
            out[2, i, j] = 1e-3 * r
            out[3, i, j] = math.degrees(math.atan(right / top))


def main() -> None:
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--size", type=int, default=4000, help="rows and columns [4000]")
    parser.add_argument("--rounds", type=int, default=5)
    given = parser.parse_args()
    size = given.size
    longitude = np.linspace(-76.0, -53.0, size)[np.newaxis, :]
    latitude = np.linspace(-17.0, -56.0, size)[:, np.newaxis]
    out = np.empty((4, size, size), dtype=np.float32)
    scalar = np.empty((4, size, size), dtype=np.float32)
    angle = np.deg2rad(TILT)
    frame = np.array([np.cos(angle) * FRAME.top - np.sin(angle) * FRAME.right, FRAME.axis])

    def loops() -> None:
        look(*ground(longitude, latitude, np.zeros((1, 1))), SATELLITE, frame, *out, *(NOT_WANTED,) * 3)

    def plain_full_grid() -> list[Array]:
        lon, lat = np.meshgrid(longitude[0], latitude[:, 0])
        sight = geometry.line_of_sight(lon, lat, 0.0, SATELLITE)
        return [
            geometry.azimuth(sight.direction),
            geometry.elevation(sight.direction),
            sight.range_m / 1000.0,
            polarisation.skew(FRAME, TILT, sight.direction, lon, lat),
        ]

    def by_pymap3d() -> tuple[Array, Array, Array]:
        lon, lat = np.meshgrid(longitude[0], latitude[:, 0])
        return pymap3d.ecef2aer(*SATELLITE, lat, lon, 0.0)

    cart = Transformer.from_pipeline(
        "+proj=pipeline +step +proj=unitconvert +xy_in=deg +xy_out=rad +step +proj=cart +ellps=WGS84"
    )

    def by_pyproj() -> tuple[Array, Array, Array]:
        lon, lat = np.meshgrid(longitude[0], latitude[:, 0])
        x, y, z = cart.transform(lon, lat, np.zeros_like(lon))
        x, y, z = SATELLITE[0] - x, SATELLITE[1] - y, SATELLITE[2] - z
        so, co, sa, ca = (
            np.sin(np.deg2rad(lon)),
            np.cos(np.deg2rad(lon)),
            np.sin(np.deg2rad(lat)),
            np.cos(np.deg2rad(lat)),
        )
        east, away = y * co - x * so, x * co + y * so
        north, up = z * ca - sa * away, z * sa + ca * away
        range_m = np.sqrt(east**2 + north**2 + up**2)
        return np.degrees(np.arctan2(east, north)) % 360.0, np.degrees(np.arcsin(up / range_m)), range_m

    def naive_loops() -> None:
        cell_by_cell(longitude[0], latitude[:, 0], SATELLITE, frame, scalar)

    print(machine())
    print(f"{size} x {size} cells, one thread; x = how many times the loops")
    names = {
        "loops (azimuth, elevation, range, skew)": loops,
        "the same formulas cell by cell, C library": naive_loops,
        "plain numpy, full grid (the same four)": plain_full_grid,
        "pymap3d (azimuth, elevation, range)": by_pymap3d,
        "pyproj cart and numpy (the same three)": by_pyproj,
    }
    times = rounds(names, given.rounds)
    base = next(iter(names))
    table(times, size * size, base)
    meant, theirs = plain_full_grid(), by_pymap3d()
    for name, mine, other in zip(("azimuth", "elevation", "range", "skew"), out, meant, strict=True):
        print(f"  largest difference to plain numpy, {name}: {float(np.abs(mine - other).max()):.1e}")
    print(
        f"  largest difference to pymap3d: azimuth {float(np.abs(out[0] - theirs[0]).max()):.1e}, "
        f"elevation {float(np.abs(out[1] - theirs[1]).max()):.1e}"
    )
    gain = times["the same formulas cell by cell, C library"].cpu / times[base].cpu
    verdict = "vectorised" if gain >= VECTORISED_AT_LEAST else "NOT VECTORISED ANY MORE"
    print(f"  vectoriser: {gain:.1f} times the scalar loops (at least {VECTORISED_AT_LEAST:g}): {verdict}")


if __name__ == "__main__":
    main()
