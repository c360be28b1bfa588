"""Rasters of EIRP: a plane comes back exactly, missing cells stay missing, wrong files are refused."""

from __future__ import annotations

import pickle

import numpy as np
import pyproj
import pytest
import rasterio
from affine import Affine

from geoskew.coverage import raster_field, rasterfiles
from geoskew.coverage.rasters import bilinear
from geoskew.errors import InputError

NODATA = -9999.0


def plane(x, y):
    """A plane; bilinear interpolation gives it back exactly."""
    return 50.0 + 0.1 * x - 0.05 * y


def write(path, values, *, west=0.0, north=50.0, step=0.5, crs="EPSG:4326", **more):
    values = np.atleast_3d(values.T).T
    profile = {"driver": "GTiff", "count": values.shape[0], "dtype": values.dtype, "nodata": NODATA} | more
    height, width = values.shape[1:]
    transform = Affine(step, 0.0, west, 0.0, -step, north)
    with rasterio.open(
        path, "w", height=height, width=width, crs=crs, transform=transform, **profile
    ) as target:
        target.write(values)
    return path


def cells(west=0.0, north=50.0, step=0.5, width=60, height=40):
    x = west + step * (np.arange(width) + 0.5)
    y = north - step * (np.arange(height) + 0.5)
    return x[None, :], y[:, None]


@pytest.fixture
def plane_file(tmp_path):
    return write(tmp_path / "eirp.tif", plane(*cells()))


@pytest.mark.parametrize("kept", [10**9, 0], ids=["in memory", "by window"])
def test_plane_comes_back(plane_file, monkeypatch, kept):
    monkeypatch.setattr(rasterfiles, "KEPT_CELLS", kept)
    field = pickle.loads(pickle.dumps(raster_field(plane_file)))
    longitude, latitude = np.linspace(0.3, 29.7, 71)[None, :], np.linspace(30.3, 49.7, 53)[:, None]
    values = field.eirp(longitude, latitude)
    assert values.shape == (53, 71)
    np.testing.assert_allclose(values, plane(longitude, latitude), atol=1e-10)
    assert float(field.eirp(10.1, 40.1)) == pytest.approx(plane(10.1, 40.1))
    np.testing.assert_allclose(field.eirp(np.array([370.1]), 40.1), plane(10.1, 40.1), atol=1e-9)


@pytest.mark.parametrize("kept", [10**9, 0], ids=["in memory", "by window"])
def test_no_value_outside_nor_beside_missing_cells(tmp_path, monkeypatch, kept):
    monkeypatch.setattr(rasterfiles, "KEPT_CELLS", kept)
    values = plane(*cells())
    values[10, 20] = NODATA
    field = raster_field(write(tmp_path / "eirp.tif", values))
    x, y = cells()
    assert np.isnan(field.eirp(x[0, 20], y[10, 0]))
    assert np.isnan(field.eirp(x[0, 20] + 0.2, y[10, 0] - 0.2))
    # On the centre of the neighbour the missing cell has no weight.
    assert float(field.eirp(x[0, 21], y[10, 0])) == pytest.approx(plane(x[0, 21], y[10, 0]))
    outside = field.eirp(np.array([-0.1, 30.1, 10.0, 10.0, np.nan]), np.array([40.0, 40.0, 50.1, 29.9, 40.0]))
    assert np.all(np.isnan(outside))
    # Within the outer half of an edge cell the edge's own value holds.
    assert float(field.eirp(0.1, y[5, 0])) == pytest.approx(plane(x[0, 0], y[5, 0]))


def test_other_reference_system(tmp_path):
    x, y = cells(4e5, 5.4e6, 1e4, 50, 50)
    path = write(
        tmp_path / "utm.tif", plane(x / 1e5, y / 1e5), west=4e5, north=5.4e6, step=1e4, crs="EPSG:32633"
    )
    longitude, latitude = np.array([15.2, 16.0, 18.5]), np.array([45.0, 47.1, 46.2])
    east, north = pyproj.Transformer.from_crs(4326, 32633, always_xy=True).transform(longitude, latitude)
    values = raster_field(path).eirp(longitude, latitude)
    np.testing.assert_allclose(values, plane(east / 1e5, north / 1e5), atol=1e-9)
    # Half a turn away the projection has no answer, so there is no value either.
    assert np.isnan(raster_field(path).eirp(-165.0, 0.0))


def test_scaled_integers(tmp_path):
    path = write(tmp_path / "eirp.tif", np.full((4, 4), 5025, dtype=np.int16), nodata=-1)
    with rasterio.open(path, "r+") as target:
        target.scales, target.offsets = (0.01,), (0.5,)
    assert float(raster_field(path).eirp(1.0, 49.0)) == pytest.approx(50.75)


def test_one_missing_corner_is_enough():
    values = np.array([[50.0, 51.0], [52.0, np.nan]])
    assert np.isnan(bilinear(values, 0.5, 0.5))
    assert float(bilinear(values, 0.5, 0.0)) == 50.5


@pytest.mark.parametrize(
    ("values", "more", "message"),
    [
        (np.full((4, 4), 50.0), {"crs": None}, "no coordinate reference system"),
        (np.full((3, 4, 4), 50.0), {}, "has 3 bands"),
        (np.full((4, 4), 1e5), {}, r"values from 100000 to 100000, which cannot be EIRP in dBW"),
        (np.full((4, 4), NODATA), {}, "no value in any cell"),
        (np.full((4, 4), -999.0), {}, r"from -999 to -999.*nodata"),
    ],
    ids=["no crs", "bands", "implausible", "empty", "undeclared nodata"],
)
@pytest.mark.filterwarnings("ignore:Dataset has no geotransform")
def test_wrong_rasters_are_refused(tmp_path, values, more, message):
    path = write(tmp_path / "eirp.tif", values, **more)
    with pytest.raises(InputError, match=message) as caught:
        raster_field(path)
    assert caught.value.problems[0].file == path


def test_unreadable_raster(tmp_path):
    path = tmp_path / "eirp.tif"
    path.write_text("no raster", encoding="utf-8")
    with pytest.raises(InputError, match="cannot be read as a raster"):
        raster_field(path)
    with pytest.raises(InputError, match="cannot be read as a raster"):
        raster_field(tmp_path / "absent.tif")
