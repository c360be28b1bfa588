"""The grid: where its cells lie, what its outline holds, and what cannot be a grid."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pyproj
import pytest
import rasterio
import shapely
from hypothesis import given
from hypothesis import strategies as st
from region_files import scenario, whole, written

from geoskew.errors import InputError, MissingPartError
from geoskew.region import Grid, Window, grid_of
from geoskew.region.build import projected_bounds

SOUTHERN_CONE = [-76.0, -56.0, -53.0, -17.0]


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
    with pytest.raises(MissingPartError, match="region: is missing, but needed for a raster"):
        grid_of(bare)
