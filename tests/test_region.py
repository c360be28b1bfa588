"""The grid: where its cells lie, what its outline holds, and what cannot be a grid."""

from __future__ import annotations

import pickle
from pathlib import Path

import geopandas
import numpy as np
import pyproj
import pytest
import rasterio
import shapely
from hypothesis import given
from hypothesis import strategies as st

from geoskew.errors import InputError, MissingPartError
from geoskew.region import Grid, Window, grid_of
from geoskew.region.build import projected_bounds
from geoskew.scenario import Region, Scenario, from_dict

SOUTHERN_CONE = [-76.0, -56.0, -53.0, -17.0]


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


def test_bounds_on_multiples_of_the_step_are_the_edges() -> None:
    grid = grid_of(scenario(bounds_deg=SOUTHERN_CONE, step_deg=0.05))
    assert (grid.crs, grid.west, grid.north, grid.columns, grid.rows) == ("EPSG:4326", -76.0, -17.0, 460, 780)
    assert grid.bounds == pytest.approx((-76.0, -56.0, -53.0, -17.0), abs=1e-9)
    assert grid.cells == 460 * 780


def test_other_bounds_reach_outward_to_whole_cells() -> None:
    grid = grid_of(scenario(bounds_deg=[-70.03, -33.98, -69.0, -33.0], step_deg=0.05))
    assert (grid.west, grid.north) == (-70.05, -33.0)
    assert grid.south == pytest.approx(-34.0, abs=1e-9)


@given(
    st.integers(-1700, 1600),
    st.integers(-800, 700),
    st.integers(1, 100),
    st.integers(1, 100),
    st.integers(0, 90),
)
def test_neighbouring_runs_share_cells(west: int, south: int, width: int, height: int, shift: int) -> None:
    step = 0.1
    one = grid_of(
        scenario(
            bounds_deg=[west / 10, south / 10, (west + width) / 10, (south + height) / 10], step_deg=step
        )
    )
    assert (one.columns, one.rows) == (width, height)
    two = grid_of(
        scenario(
            bounds_deg=[(west + shift) / 10, south / 10, (west + shift + width) / 10, (south + height) / 10],
            step_deg=step,
        )
    )
    offset = (two.west - one.west) / step
    assert offset == pytest.approx(round(offset), abs=1e-6)
    assert two.north == one.north


def test_pixel_is_area_as_rasterio_reads_it(tmp_path: Path) -> None:
    grid = grid_of(scenario(bounds_deg=[10.0, -5.0, 13.0, 0.0], step_deg=0.5))
    places = grid.block(Window(2, 1, 4, 3))
    assert places.longitude.shape == (1, 3)
    assert places.latitude.shape == (4, 1)
    assert places.shape == (4, 3)
    assert places.inside is None
    assert np.isnan(places.height).all()
    transform = rasterio.Affine(*grid.transform)
    x, y = rasterio.transform.xy(transform, [2, 5], [1, 3])  # centres, by rasterio's own convention
    assert places.longitude[0, [0, 2]] == pytest.approx(x, abs=1e-12)
    assert places.latitude[[0, 3], 0] == pytest.approx(y, abs=1e-12)


def test_windows_cover_every_cell_once_on_multiples_of_their_size() -> None:
    grid = Grid("EPSG:4326", 0.0, 10.0, 0.001, 1300, 1025)
    seen = np.zeros(grid.shape, dtype=int)
    for window in grid.windows():
        assert window.row % 512 == 0
        assert window.column % 512 == 0
        seen[window.row : window.row + window.height, window.column : window.column + window.width] += 1
    assert (seen == 1).all()


@pytest.mark.parametrize(
    "window", [Window(0, 0, 11, 1), Window(-1, 0, 1, 1), Window(0, 9, 1, 2), Window(0, 0, 0, 1)]
)
def test_windows_beyond_the_grid_are_refused(window: Window) -> None:
    with pytest.raises(ValueError, match="does not lie within the grid"):
        Grid("EPSG:4326", 0.0, 10.0, 1.0, 10, 10).block(window)
    with pytest.raises(ValueError, match="not above zero"):
        list(Grid("EPSG:4326", 0.0, 10.0, 1.0, 10, 10).windows(0))


def test_blocks_are_parts_of_the_whole(tmp_path: Path) -> None:
    outline = written(tmp_path / "o.gpkg", shapely.Point(-65, -30).buffer(4.3))
    for more in ({"step_deg": 0.1}, {"crs": "EPSG:32720", "step_m": 9000}):
        grid = grid_of(scenario(outline=outline, **more))
        full = grid.block(whole(grid))
        longitude, latitude = (np.broadcast_to(v, grid.shape) for v in (full.longitude, full.latitude))
        assert full.inside is not None
        for window in grid.windows(32):
            part = grid.block(window)
            cut = np.s_[window.row : window.row + window.height, window.column : window.column + window.width]
            np.testing.assert_allclose(
                np.broadcast_to(part.longitude, part.shape), longitude[cut], rtol=0, atol=1e-12
            )
            np.testing.assert_allclose(
                np.broadcast_to(part.latitude, part.shape), latitude[cut], rtol=0, atol=1e-12
            )
            np.testing.assert_array_equal(part.inside, full.inside[cut])


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


def test_bounds_across_180_run_past_it() -> None:
    grid = grid_of(scenario(bounds_deg=[170, -50, -170, -30], step_deg=0.1))
    assert grid.bounds == pytest.approx((170.0, -50.0, 190.0, -30.0), abs=1e-9)
    assert grid.columns == 200
    assert grid.block(Window(0, 199, 1, 1)).longitude.item() == pytest.approx(189.95, abs=1e-9)
    assert grid.covers([175, -175, 185, 165, np.nan], [-40] * 5).tolist() == [True, True, True, False, False]


def test_bounds_beyond_180_are_the_usual_ones() -> None:
    assert grid_of(scenario(bounds_deg=[200, 0, 210, 5], step_deg=1)).bounds == (-160.0, 0.0, -150.0, 5.0)


def test_the_whole_earth_with_its_poles() -> None:
    grid = grid_of(scenario(bounds_deg=[-180, -90, 180, 90], step_deg=0.25))
    assert grid.bounds == (-180.0, -90.0, 180.0, 90.0)
    assert grid.shape == (720, 1440)
    # A step that does not divide the circle never reaches past a pole nor twice around.
    grid = grid_of(scenario(bounds_deg=[-180, -90, 180, 90], step_deg=0.7))
    assert grid.north <= 90.0
    assert grid.columns * grid.step <= 360.0


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


def test_a_projected_grid_has_the_places_that_pyproj_gives() -> None:
    grid = grid_of(scenario(bounds_deg=SOUTHERN_CONE, crs="EPSG:5343", step_m=5000))
    assert grid.west % 5000 == 0
    assert grid.north % 5000 == 0
    places = grid.block(Window(100, 50, 3, 4))
    assert places.longitude.shape == places.latitude.shape == (3, 4)
    inverse = pyproj.Transformer.from_crs("EPSG:4326", "EPSG:5343", always_xy=True)
    x, y = inverse.transform(places.longitude, places.latitude)
    np.testing.assert_allclose(x[0], grid.west + 5000 * (np.arange(50, 54) + 0.5), atol=1e-3)
    np.testing.assert_allclose(y[:, 0], grid.north - 5000 * (np.arange(100, 103) + 0.5), atol=1e-3)
    # Every point of the region lies in the grid, not only its corners.
    lon, lat = np.meshgrid(np.linspace(-76, -53, 40), np.linspace(-56, -17, 40))
    assert grid.covers(lon, lat).all()


def test_a_polar_region_in_a_polar_projection_holds_the_pole() -> None:
    grid = grid_of(scenario(bounds_deg=[-180, 60, 180, 90], crs="EPSG:3995", step_m=50_000))
    assert grid.covers([0.0, 90.0, 13.0], [90.0, 60.0, 61.0]).all()
    assert np.isfinite(grid.block(whole(grid)).latitude).all()


def test_cells_beyond_the_earth_are_not_inside() -> None:
    globe = "+proj=ortho +lat_0=0 +lon_0=0"
    grid = Grid(globe, -8_000_000.0, 8_000_000.0, 1_000_000.0, 16, 16)
    places = grid.block(whole(grid))
    assert places.inside is not None
    assert not places.inside[0, 0]
    assert np.isnan(places.longitude[0, 0])
    assert places.inside[8, 8]


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


@pytest.mark.parametrize(
    ("region", "message"),
    [
        (
            {"bounds_deg": [0, 0, 1, 1], "step_deg": 2},
            "step_deg: 2 is larger than the region, which is 1° wide",
        ),
        ({"bounds_deg": [0, 0, 90, 80], "step_deg": 1e-5}, "9,000,000 × 8,000,000 cells; the most is"),
        (
            {"bounds_deg": [170, -50, -170, -30], "crs": "EPSG:3857", "step_m": 5000},
            "tears or stretches the region",
        ),
        (
            {"bounds_deg": [10, 0, 12, 2], "crs": "EPSG:32633", "step_m": 3e6},
            r"step_m: 3e\+06 is larger than",
        ),
        ({"bounds_deg": [10, 0, 12, 2], "step_m": 5000}, "crs: is missing"),
        ({"bounds_deg": [10, 0, 12, 2]}, "step_deg: is missing"),
        ({"bounds_deg": [10, 0, 12, 2], "crs": "EPSG:32633", "step_deg": 1}, "EPSG:32633 goes with step_m"),
        ({"step_deg": 1}, "bounds_deg: is missing; give bounds_deg or outline"),
    ],
)
def test_grids_that_cannot_be(region: dict[str, object], message: str) -> None:
    with pytest.raises(InputError, match=message) as caught:
        grid_of(scenario(**region))
    assert caught.value.problems[0].file is not None
    assert str(caught.value.problems[0].key).startswith("region.")


def test_bounds_where_a_projection_ends() -> None:
    with pytest.raises(InputError, match="has no coordinates at longitude -100, latitude -10"):
        projected_bounds((-100.0, -10.0, 100.0, 10.0), "+proj=gnom +lat_0=0 +lon_0=0")


def test_without_a_region_the_part_is_named() -> None:
    bare = scenario(bounds_deg=[0, 0, 1, 1], step_deg=0.5).model_copy(update={"region": None})
    with pytest.raises(MissingPartError, match="region: is missing, and a raster needs it"):
        grid_of(bare)


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
