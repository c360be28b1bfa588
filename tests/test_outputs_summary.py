"""The summary: areas against geodesic areas, counts, worst sites, plain JSON."""

from __future__ import annotations

import json
from datetime import UTC, date, datetime
from pathlib import Path
from typing import Any

import numpy as np
import pandas as pd
import pytest
import rasterio
from numpy.typing import NDArray
from pyproj import Geod, Transformer

from geoskew.errors import InputError, OutputError
from geoskew.outputs import summary

CLASSES = ((0, "leave"), (1, "preset"), (5, "no-sight"))


def save(path: Path, codes: NDArray[np.uint8], crs: str, west: float, north: float, step: float) -> Path:
    with rasterio.open(
        path,
        "w",
        driver="GTiff",
        height=codes.shape[0],
        width=codes.shape[1],
        count=1,
        dtype="uint8",
        nodata=255,
        crs=crs,
        transform=rasterio.Affine(step, 0.0, west, 0.0, -step, north),
    ) as dataset:
        dataset.write(codes, 1)
    return path


def geodesic_km2(longitude: NDArray[np.float64], latitude: NDArray[np.float64]) -> float:
    """Area of a densified polygon on WGS 84 (Karney 2013, through pyproj), the reference here."""
    return abs(Geod(ellps="WGS84").polygon_area_perimeter(longitude, latitude)[0]) / 1e6


def ring(west: float, south: float, east: float, north: float) -> tuple[Any, Any]:
    n = 4001
    x = np.concatenate(
        [np.linspace(west, east, n), np.full(n, east), np.linspace(east, west, n), np.full(n, west)]
    )
    y = np.concatenate(
        [np.full(n, south), np.linspace(south, north, n), np.full(n, north), np.linspace(north, south, n)]
    )
    return x, y


def test_areas_of_a_geographic_raster(tmp_path: Path) -> None:
    codes = np.full((600, 40), 255, np.uint8)
    codes[:200, :] = 0  # 60 N to 40 N
    codes[200:500, 10:] = 1  # 40 N to 10 N, 9 degrees wide
    path = save(tmp_path / "a.tif", codes, "EPSG:4326", -70.0, 60.0, 0.1)
    areas = summary.area_by_class(path, CLASSES)
    # 4000 chords an edge leave the parallel by less than 1e-7 of the area
    assert areas["leave"]["km2"] == pytest.approx(geodesic_km2(*ring(-70, 40, -66, 60)), rel=1e-6)
    assert areas["preset"]["km2"] == pytest.approx(geodesic_km2(*ring(-69, 10, -66, 40)), rel=1e-6)
    assert areas["no-sight"] == {"km2": 0.0, "percent": 0.0}
    assert sum(area["percent"] for area in areas.values()) == pytest.approx(100.0)


def test_the_whole_earth(tmp_path: Path) -> None:
    path = save(tmp_path / "a.tif", np.zeros((180, 360), np.uint8), "EPSG:4326", -180.0, 90.0, 1.0)
    area = summary.area_by_class(path, CLASSES)["leave"]
    # surface of the WGS 84 ellipsoid by the geodesic polygon of the whole sphere, twice a hemisphere
    hemisphere = geodesic_km2(np.arange(0.0, 360.0, 0.05), np.zeros(7200))
    assert area["km2"] == pytest.approx(2.0 * hemisphere, rel=1e-9)
    assert area["percent"] == 100.0


@pytest.mark.parametrize("crs", ["EPSG:32721", "EPSG:3857"])
def test_areas_of_a_projected_raster(tmp_path: Path, crs: str) -> None:
    """A conformal projection stretches areas: by 0.1 % in UTM, by half at 35 degrees in web maps."""
    x0, y0 = Transformer.from_crs("EPSG:4326", crs, always_xy=True).transform(-60.0, -33.0)
    codes = np.zeros((300, 200), np.uint8)
    codes[:, 100:] = 1
    path = save(tmp_path / "a.tif", codes, crs, x0, y0, 1000.0)
    areas = summary.area_by_class(path, CLASSES)
    back = Transformer.from_crs(crs, "EPSG:4326", always_xy=True)
    for name, west in (("leave", x0), ("preset", x0 + 100_000.0)):
        corners = back.transform(*ring(west, y0 - 300_000.0, west + 100_000.0, y0))
        # straight lines over 64 km in place of a parabola of radius R: 64**2 / (6 * 6371**2) = 1.7e-5
        assert areas[name]["km2"] == pytest.approx(geodesic_km2(*corners), rel=3e-5)


def test_a_raster_without_any_class(tmp_path: Path) -> None:
    path = save(tmp_path / "a.tif", np.full((3, 3), 255, np.uint8), "EPSG:4326", 0.0, 3.0, 1.0)
    assert np.isnan(summary.area_by_class(path, CLASSES)["leave"]["percent"])
    (tmp_path / "b.tif").write_text("no raster")
    with pytest.raises(InputError, match="cannot be read as a raster"):
        summary.area_by_class(tmp_path / "b.tif", CLASSES)


def test_worst_sites() -> None:
    table = pd.DataFrame(
        {
            "id": ["a", "b", "c", "d", "e"],
            "lat": 1.0,
            "lon": 2.0,
            "margin_untouched": [3.0, -1.0, np.nan, -1.0, 0.5],
        }
    )
    worst = summary.worst_sites(table, "margin_untouched", count=3)
    assert [site["id"] for site in worst] == ["b", "d", "e"]
    assert list(worst[0]) == ["id", "lat", "lon", "margin_untouched"]
    assert summary.worst_sites(table, "margin_untouched", count=99)[-1]["id"] == "a"


def test_json_is_plain_and_the_same_each_time(tmp_path: Path) -> None:
    content = {
        "title": "ä",
        "changeover": datetime(2027, 5, 18, 3, tzinfo=UTC),
        "day": date(2027, 5, 18),
        "values": np.array([1.0, np.nan, np.inf]),
        "flag": np.bool_(True),
        "file": Path("a/b"),
        "versions": summary.versions(),
    }
    for name in ("a.json", "b.json"):
        summary.write_summary(tmp_path / name, content)
    text = (tmp_path / "a.json").read_text(encoding="utf-8")
    assert text == (tmp_path / "b.json").read_text(encoding="utf-8")
    assert '"title": "ä"' in text
    back = json.loads(text)
    assert back["changeover"] == "2027-05-18T03:00:00Z"
    assert back["values"] == [1.0, None, None]
    assert back["flag"] is True
    assert list(back) == list(content)
    assert {"geoskew", "python", "numpy", "rasterio"} <= set(back["versions"])
    with pytest.raises(TypeError, match="a summary cannot hold"):
        summary.write_summary(tmp_path / "c.json", {"x": object()})
    with pytest.raises(OutputError, match="does not exist"):
        summary.write_summary(tmp_path / "none" / "c.json", {})
    assert sorted(path.name for path in tmp_path.iterdir()) == ["a.json", "b.json"]
