"""Scenarios with a region and files with outlines, for the tests of the grid."""

from __future__ import annotations

from pathlib import Path

import geopandas
import shapely

from geoskew.region import Grid, Window
from geoskew.scenario import Region, Scenario, from_dict


def scenario(**region: object) -> Scenario:
    """A scenario with this region, which `Region` has checked key by key but not as a whole."""
    satellite = {"longitude_deg": -66.2, "eirp_dbw": 50.0}
    carrier = {
        "polarisation": "V",
        "frequency_ghz": 11.95,
        "symbol_rate_mbaud": 27.5,
        "required_es_n0_db": 7.9,
    }
    document = {
        "outgoing": satellite,
        "incoming": satellite,
        "carrier": carrier,
        "region": {"bounds_deg": [0, 0, 1, 1], "step_deg": 0.5},
    }
    return from_dict(document).model_copy(update={"region": Region(**region)})  # type: ignore[arg-type]


def written(path: Path, *geometries: shapely.Geometry, crs: str = "EPSG:4326", **options: object) -> str:
    geopandas.GeoDataFrame(geometry=list(geometries), crs=crs).to_file(path, **options)
    return str(path)


def whole(grid: Grid) -> Window:
    return Window(0, 0, grid.rows, grid.columns)
