"""The outline of a region: what it holds, across 180°, around a pole, and what cannot be an outline."""

from __future__ import annotations

import pickle
from pathlib import Path

import geopandas
import numpy as np
import pyproj
import pytest
import shapely
from region_files import scenario, whole, written

from geoskew.errors import InputError
from geoskew.region import Window, grid_of


def test_the_mask_is_shapelys_point_in_polygon_at_cell_centres(tmp_path: Path) -> None:
    ring = shapely.Point(-65.2, -30.1).buffer(4.3).difference(shapely.Point(-65, -30).buffer(1.7))
    island = shapely.Point(-58.0, -33.3).buffer(0.77)
    grid = grid_of(scenario(outline=written(tmp_path / "o.gpkg", ring, island), step_deg=0.013))
    for window in grid.windows(256):
        places = grid.block(window)
        x, y = np.broadcast_arrays(places.longitude, places.latitude)
        np.testing.assert_array_equal(places.inside, shapely.contains_xy(shapely.union(ring, island), x, y))


def test_overlapping_polygons_are_melted(tmp_path: Path) -> None:
    path = written(tmp_path / "o.geojson", shapely.box(0, 0, 4, 4), shapely.box(2, 0, 6, 4))
    grid = grid_of(scenario(outline=path, step_deg=0.5))
    assert grid.bounds == (0.0, 0.0, 6.0, 4.0)
    assert grid.block(whole(grid)).inside.all()  # type: ignore[union-attr]


def test_bounds_and_outline_together_cut_the_outline(tmp_path: Path) -> None:
    path = written(tmp_path / "o.gpkg", shapely.box(0, 0, 4, 4))
    grid = grid_of(scenario(bounds_deg=[2, -2, 8, 3], outline=path, step_deg=0.5))
    inside = grid.block(whole(grid)).inside
    assert grid.bounds == (2.0, -2.0, 8.0, 3.0)
    assert inside is not None
    assert np.count_nonzero(inside) == 4 * 6  # 2 by 3 degrees


CIRCLE = shapely.Point(180.0, -20.0).buffer(8.0, 64)


def turned(geometry: shapely.Geometry, by: float) -> shapely.Geometry:
    return shapely.transform(geometry, lambda points: points + [by, 0.0])


ACROSS_180 = {
    "written past 180": CIRCLE,
    "written past -180": turned(CIRCLE, -360.0),
    "cut at 180": shapely.MultiPolygon(
        [
            shapely.intersection(CIRCLE, shapely.box(100, -90, 180, 90)),
            turned(shapely.intersection(CIRCLE, shapely.box(180, -90, 260, 90)), -360.0),
        ]
    ),
    "jumping within its ring": shapely.transform(
        CIRCLE, lambda points: np.column_stack(((points[:, 0] + 180.0) % 360.0 - 180.0, points[:, 1]))
    ),
}


@pytest.mark.parametrize("shape", list(ACROSS_180))
def test_an_outline_across_180_is_the_same_however_it_is_written(tmp_path: Path, shape: str) -> None:
    path = written(tmp_path / "o.gpkg", ACROSS_180[shape])
    grid = grid_of(scenario(outline=path, step_deg=0.25))
    assert grid.bounds == (172.0, -28.0, 188.0, -12.0)
    inside = grid.block(whole(grid)).inside
    assert inside is not None
    # A circle's area, within the length of its edge times half a cell's diagonal.
    assert abs(np.count_nonzero(inside) * 0.25**2 - CIRCLE.area) < CIRCLE.length * 0.18
    np.testing.assert_array_equal(inside, inside[:, ::-1])  # no gap and no double column at 180
    in_bounds = grid_of(scenario(bounds_deg=[170, -30, -170, -10], outline=path, step_deg=0.25))
    assert np.count_nonzero(in_bounds.block(whole(in_bounds)).inside) == np.count_nonzero(inside)
    projected = grid_of(scenario(outline=path, crs="EPSG:3832", step_m=25_000))  # Mercator centred on 150° E
    assert 70 <= projected.columns <= 75


def test_an_edge_that_can_be_read_in_two_ways_is_refused(tmp_path: Path) -> None:
    path = written(tmp_path / "o.gpkg", shapely.Polygon([(177, -20), (-178, -20), (-178, -15), (177, -15)]))
    with pytest.raises(InputError, match=r"from longitude 177 to -178: across 180° or the long way round\?"):
        grid_of(scenario(outline=path, step_deg=0.5))


def test_an_outline_around_a_pole_from_a_polar_projection(tmp_path: Path) -> None:
    path = written(tmp_path / "cap.gpkg", shapely.Point(0, 0).buffer(2_000_000, 64), crs="EPSG:3031")
    grid = grid_of(scenario(outline=path, step_deg=1.0))
    inside = grid.block(whole(grid)).inside
    assert (grid.west, grid.columns, grid.south) == (-180.0, 360, -90.0)
    assert inside is not None
    # 2000 km from the pole in EPSG:3031 is 71.6° S by PROJ itself.
    _, edge = pyproj.Transformer.from_crs("EPSG:3031", "EPSG:4326", always_xy=True).transform(0, 2_000_000)
    rows = np.flatnonzero(inside.any(axis=1))
    assert edge - 1.0 < grid.north - (rows[0] + 0.5) <= edge
    assert inside[rows[0] + 1 :].all()


def test_a_grid_travels_to_another_process(tmp_path: Path) -> None:
    grid = grid_of(scenario(outline=written(tmp_path / "o.gpkg", CIRCLE), step_deg=0.5))
    again = pickle.loads(pickle.dumps(grid))
    assert again == grid
    np.testing.assert_array_equal(again.block(whole(grid)).inside, grid.block(whole(grid)).inside)


def test_a_region_larger_than_memory_costs_only_its_blocks(tmp_path: Path) -> None:
    path = written(tmp_path / "o.gpkg", shapely.Point(-65, -30).buffer(12, 256))
    grid = grid_of(scenario(bounds_deg=[-180, -90, 180, 90], outline=path, step_deg=0.001))
    assert grid.cells == 360_000 * 180_000
    corner = Window(120_000, 115_000, 512, 512)
    assert grid.block(corner).inside is not None
    assert grid.block(corner).inside.all()  # type: ignore[union-attr]
    assert not grid.block(Window(0, 0, 512, 512)).inside.any()  # type: ignore[union-attr]


def test_outlines_that_cannot_be(tmp_path: Path) -> None:
    def refused(path: Path, message: str, **more: object) -> None:
        with pytest.raises(InputError, match=message) as caught:
            grid_of(scenario(outline=str(path), **({"step_deg": 0.5} | more)))
        assert caught.value.problems[0].file == path

    line, here = shapely.LineString([(0, 0), (1, 1)]), tmp_path
    written(here / "line.gpkg", line)
    refused(here / "line.gpkg", "holds LineString; the outline of a region is made of polygons only")
    geopandas.GeoDataFrame(geometry=[shapely.box(0, 0, 1, 1)]).to_parquet(here / "bare.parquet")
    refused(here / "bare.parquet", "has no CRS")
    (here / "text.gpkg").write_text("no database")
    refused(here / "text.gpkg", "cannot be read as a vector file")
    written(here / "two.gpkg", shapely.box(0, 0, 1, 1), layer="a")
    written(here / "two.gpkg", shapely.box(0, 0, 1, 1), layer="b")
    refused(here / "two.gpkg", r"several layers that could be meant \(a, b\)")
    written(here / "tiny.gpkg", shapely.box(0.01, 0.01, 0.02, 0.02))
    refused(here / "tiny.gpkg", "no cell's centre lies within the outline", bounds_deg=[0, 0, 5, 5])
    refused(here / "tiny.gpkg", "no cell's centre lies within the outline", bounds_deg=[50, 0, 55, 5])
    (here / "empty.geojson").write_text('{"type": "FeatureCollection", "features": []}')
    refused(here / "empty.geojson", "no geometry|no layer")


def test_the_one_layer_with_polygons_is_meant(tmp_path: Path) -> None:
    path = tmp_path / "o.gpkg"
    written(path, shapely.Point(0, 0), layer="towns")
    written(path, shapely.box(0, 0, 4, 4), layer="land")
    assert grid_of(scenario(outline=str(path), step_deg=1)).bounds == (0.0, 0.0, 4.0, 4.0)


def test_an_outline_as_geoparquet_and_in_another_crs(tmp_path: Path) -> None:
    square = geopandas.GeoDataFrame(geometry=[shapely.box(-66, -32, -62, -28)], crs="EPSG:4326")
    square.to_parquet(tmp_path / "o.parquet")
    assert grid_of(scenario(outline=str(tmp_path / "o.parquet"), step_deg=0.5)).bounds == (-66, -32, -62, -28)
    dense = square.set_geometry(square.geometry.segmentize(0.01)).to_crs("EPSG:32720")
    dense.to_file(tmp_path / "utm.gpkg")
    grid = grid_of(
        scenario(outline=str(tmp_path / "utm.gpkg"), bounds_deg=[-67, -33, -61, -27], step_deg=0.1)
    )
    assert np.count_nonzero(grid.block(whole(grid)).inside) == 40 * 40
