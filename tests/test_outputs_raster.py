"""Rasters: valid, described, exact, independent of order, whole or absent."""

from __future__ import annotations

import hashlib
import json
import random
import shutil
import subprocess
from collections.abc import Iterator
from pathlib import Path
from typing import Any

import numpy as np
import pytest
import rasterio
from numpy.typing import NDArray
from rio_cogeo.cogeo import cog_validate

from geoskew.errors import InputError, OutputError
from geoskew.layers import Layer
from geoskew.outputs import raster
from geoskew.outputs.raster.storage import encode, storage_of
from geoskew.region import Grid, Window

TAGS = {"title": "Test of the writer", "conventions": "skew positive clockwise looking towards the satellite"}
ACTIONS = (
    (0, "leave"),
    (1, "preset"),
    (2, "turn-at-changeover"),
    (3, "re-aim"),
    (4, "upgrade"),
    (5, "no-sight"),
)


def make(name: str, unit: str, kind: Any, **more: Any) -> Layer:
    return Layer(
        name=name,
        unit=unit,
        description=f"meaning of {name}",
        kind=kind,
        ramp=more.pop("ramp", "level"),
        limits=(0.0, 1.0),
        contour_step=1.0,
        compute=lambda situation: np.zeros(()),
        **more,
    )


SKEW = make("skew_before", "deg", "circular", period=180.0)
AZIMUTH = make("azimuth_before", "deg", "circular", period=360.0)
MARGIN = make("margin_untouched", "dB", "continuous")
RANGE = make("range_before", "km", "continuous")
ACTION = make("action", "", "category", ramp="classes", classes=ACTIONS)
FLAG = make("below_reserve_after", "", "flag", ramp="classes")
LAYERS = [SKEW, AZIMUTH, MARGIN, RANGE, ACTION, FLAG]


def fields(grid: Grid, window: Window) -> dict[str, NDArray[Any]]:
    """Smooth fields of the cells' positions, with wraps, a corner without values, and classes."""
    row = np.arange(window.row, window.row + window.height)[:, None] + 0.5
    column = np.arange(window.column, window.column + window.width)[None, :] + 0.5
    angle = np.degrees(np.arctan2(column - grid.columns / 2 - 0.3, grid.rows / 2 + 0.2 - row))
    hidden = (row + column) < (grid.rows + grid.columns) / 6
    skew = angle / 2.0
    values: dict[str, NDArray[Any]] = {
        "skew_before": np.where(skew <= -90.0, skew + 180.0, skew),
        "azimuth_before": np.mod(angle, 360.0),
        "margin_untouched": np.sin(row / 90.0) * 5.0 + np.cos(column / 70.0) * 3.0,
        "range_before": 36_000.0 + np.hypot(row, column),
    }
    for name in values:
        values[name] = np.where(hidden, np.nan, values[name])
    values["action"] = np.where(hidden, 255, (row // 60 + column // 60) % 6).astype(np.uint8)
    values["below_reserve_after"] = np.where(hidden, 255, values["margin_untouched"] < 0).astype(np.uint8)
    return values


def blocks(
    grid: Grid, *, size: int = 512, seed: int | None = None
) -> Iterator[tuple[Window, dict[str, Any]]]:
    windows = list(grid.windows(size))
    if seed is not None:
        random.Random(seed).shuffle(windows)
    for window in windows:
        yield window, fields(grid, window)


def geographic(rows: int = 700, columns: int = 1100, step: float = 0.05) -> Grid:
    return Grid("EPSG:4326", -76.0, -17.0, step, columns, rows)


def write(folder: Path, grid: Grid, layers: list[Layer] = LAYERS, **more: Any) -> dict[str, Path]:
    folder.mkdir(exist_ok=True)
    seed, size = more.pop("seed", None), more.pop("size", 512)
    paths = raster.write_rasters(
        blocks(grid, seed=seed, size=size), grid=grid, layers=layers, folder=folder, tags=TAGS, **more
    )
    return {path.stem: path for path in paths}


@pytest.fixture(scope="module")
def written(tmp_path_factory: pytest.TempPathFactory) -> dict[str, Path]:
    return write(tmp_path_factory.mktemp("rasters") / "out", geographic())


@pytest.mark.parametrize("layer", LAYERS, ids=lambda layer: layer.name)
def test_valid_by_an_independent_validator(written: dict[str, Path], layer: Layer) -> None:
    valid, errors, warnings = cog_validate(written[layer.name], strict=True)
    assert valid, (errors, warnings)
    assert not warnings


@pytest.mark.parametrize(("rows", "columns"), [(1, 1), (3, 5), (511, 512), (513, 20), (600, 1025)])
def test_valid_at_any_size(tmp_path: Path, rows: int, columns: int) -> None:
    paths = write(tmp_path / "out", geographic(rows, columns), [MARGIN, ACTION])
    for path in paths.values():
        valid, errors, warnings = cog_validate(path, strict=True)
        assert (valid, errors, warnings) == (True, [], [])
        with rasterio.open(path) as dataset:
            assert dataset.shape == (rows, columns)
            assert bool(dataset.overviews(1)) == (max(rows, columns) > 512)


@pytest.mark.parametrize("layer", LAYERS, ids=lambda layer: layer.name)
def test_described(written: dict[str, Path], layer: Layer) -> None:
    with rasterio.open(written[layer.name]) as dataset:
        tags, band = dataset.tags(), dataset.tags(1)
        assert dataset.descriptions == (layer.title,)
        assert (dataset.units[0] or "") == layer.unit
        assert layer.unit in dataset.descriptions[0]
        assert dataset.crs.to_epsg() == 4326
        assert tags["AREA_OR_POINT"] == "Area"
        assert TAGS.items() <= tags.items()
        assert tags["TIFFTAG_SOFTWARE"].startswith("geoskew ")
        assert band["layer"] == layer.name
        values = dataset.read(1, masked=True)
        if layer.is_class:
            assert (dataset.dtypes[0], dataset.nodata) == ("uint8", 255)
            classes = layer.classes or ((0, "no"), (1, "yes"))
            assert all(band[f"class_{code}"] == name for code, name in classes)
        else:
            assert dataset.dtypes[0] == "float32"
            assert np.isnan(dataset.nodata)
            assert float(band["rounded_to"].split()[0]) == (2.0**-6 if layer.unit == "km" else 2.0**-10)
        # numpy is the reference for the statistics
        values = values.compressed().astype(np.float64)
        assert float(band["STATISTICS_MINIMUM"]) == pytest.approx(values.min(), rel=1e-12)
        assert float(band["STATISTICS_MAXIMUM"]) == pytest.approx(values.max(), rel=1e-12)
        assert float(band["STATISTICS_MEAN"]) == pytest.approx(values.mean(), rel=1e-9)
        assert float(band["STATISTICS_STDDEV"]) == pytest.approx(values.std(), rel=1e-6)
        assert float(band["STATISTICS_VALID_PERCENT"]) == pytest.approx(
            100 * values.size / (700 * 1100), rel=1e-3
        )
    assert not list(written[layer.name].parent.glob("*.aux.xml"))


@pytest.mark.parametrize("layer", LAYERS, ids=lambda layer: layer.name)
def test_the_value_of_a_cell_is_that_at_its_centre(written: dict[str, Path], layer: Layer) -> None:
    """Rows and columns through rasterio's own index of a coordinate: a half-cell shift fails."""
    grid = geographic()
    whole = fields(grid, Window(0, 0, grid.rows, grid.columns))[layer.name]
    with rasterio.open(written[layer.name]) as dataset:
        for row, column in [(0, 1099), (350, 550), (699, 0), (123, 456), (511, 512), (512, 511)]:
            longitude = grid.west + (column + 0.5) * grid.step
            latitude = grid.north - (row + 0.5) * grid.step
            assert dataset.index(longitude, latitude) == (row, column)
            assert dataset.xy(row, column) == pytest.approx((longitude, latitude), abs=1e-9)
            (value,) = next(dataset.sample([(longitude, latitude)]))
            tolerance = 0.0 if layer.is_class else (2.0**-7 if layer.unit == "km" else 2.0**-11)
            assert value == pytest.approx(whole[row, column], abs=tolerance * 1.0001)


def test_rounding_is_within_half_a_step_and_full_precision_keeps_float32(tmp_path: Path) -> None:
    grid = geographic()
    whole = fields(grid, Window(0, 0, grid.rows, grid.columns))
    rounded = write(tmp_path / "rounded", grid, [MARGIN, RANGE])
    full = write(tmp_path / "full", grid, [MARGIN, RANGE], precision="full")
    for layer, step in ((MARGIN, 2.0**-10), (RANGE, 2.0**-6)):
        with rasterio.open(rounded[layer.name]) as dataset:
            values = dataset.read(1).astype(np.float64)
            assert dataset.tags(ns="IMAGE_STRUCTURE")["PREDICTOR"] == "2"
        assert np.nanmax(np.abs(values - whole[layer.name])) <= step / 2
        assert np.array_equal(np.rint(values / step) * step, values, equal_nan=True)
        with rasterio.open(full[layer.name]) as dataset:
            assert np.array_equal(dataset.read(1), whole[layer.name].astype(np.float32), equal_nan=True)
            assert dataset.tags(ns="IMAGE_STRUCTURE")["PREDICTOR"] == "3"
            assert "not rounded" in dataset.tags(1)["rounded_to"]
        # at 36 000 km a float32 is itself no finer than 2^-8 km: less is to be gained there
        share = 0.5 if layer is MARGIN else 1.0
        assert rounded[layer.name].stat().st_size < share * full[layer.name].stat().st_size


@pytest.mark.parametrize("precision", ["standard", "full"])
def test_rounding_never_leaves_the_range_of_an_angle(precision: Any) -> None:
    azimuth = np.array([359.99999, 359.9999999999, 0.0, 359.5, np.nan])
    stored = encode(azimuth, AZIMUTH, storage_of(AZIMUTH, precision=precision))
    assert np.nanmax(stored) < 360.0
    assert stored[1] == 0.0
    skew = np.array([-89.9999999999, 90.0, 89.9999999, -89.5, -1e-9, np.nan])
    stored = encode(skew, SKEW, storage_of(SKEW, precision=precision))
    assert np.nanmin(stored) > -90.0
    assert stored[0] == 90.0
    assert np.nanmax(stored) == 90.0
    error = np.abs((stored - skew + 90.0) % 180.0 - 90.0)
    assert np.nanmax(error) <= 2.0**-11
    assert not np.signbit(encode(np.array([-1e-5]), MARGIN, storage_of(MARGIN)))[0], "one zero, not two"


def test_encoding_does_not_depend_on_the_float_type_that_it_gets() -> None:
    values = np.linspace(-90.0, 90.0, 10_001).astype(np.float32)
    for layer in (SKEW, MARGIN, AZIMUTH):
        storage = storage_of(layer)
        single, double = encode(values, layer, storage), encode(values.astype(np.float64), layer, storage)
        assert single.tobytes() == double.tobytes()


def test_an_infinite_value_is_refused() -> None:
    with pytest.raises(OutputError, match="layer margin_untouched: an infinite value"):
        encode(np.array([1.0, np.inf]), MARGIN, storage_of(MARGIN))


def test_same_bytes_for_any_order_of_windows_and_any_number_of_workers(tmp_path: Path) -> None:
    """R9."""
    grid = geographic(1300, 1100)

    def digests(paths: dict[str, Path]) -> dict[str, str]:
        return {name: hashlib.sha256(path.read_bytes()).hexdigest() for name, path in paths.items()}

    straight = digests(write(tmp_path / "a", grid, workers=1))
    assert digests(write(tmp_path / "b", grid, seed=1, workers=2)) == straight
    assert digests(write(tmp_path / "c", grid, seed=2, workers=3)) == straight


def test_blocks_of_several_tiles_give_the_same_values(tmp_path: Path) -> None:
    grid = geographic(1300, 1100)
    small, large = write(tmp_path / "a", grid), write(tmp_path / "b", grid, size=1024)
    for name in small:
        with rasterio.open(small[name]) as one, rasterio.open(large[name]) as other:
            assert np.array_equal(one.read(1), other.read(1), equal_nan=one.dtypes[0] == "float32")


@pytest.mark.parametrize("layer", [SKEW, AZIMUTH], ids=lambda layer: layer.name)
def test_overviews_of_a_wrapped_angle_hold_values_of_the_angle(
    written: dict[str, Path], layer: Layer
) -> None:
    """R3: an average across the wrap would be an angle that no cell near has."""
    with rasterio.open(written[layer.name]) as dataset:
        whole = set(np.unique(dataset.read(1)).tolist())
        levels = len(dataset.overviews(1))
    assert levels
    for level in range(levels):
        with rasterio.open(written[layer.name], overview_level=level) as dataset:
            values = dataset.read(1)
        assert set(values[~np.isnan(values)].tolist()) <= whole


def test_overviews_of_classes_hold_classes(written: dict[str, Path]) -> None:
    """R4."""
    with rasterio.open(written["action"], overview_level=0) as dataset:
        assert set(np.unique(dataset.read(1)).tolist()) <= {0, 1, 2, 3, 4, 5, 255}


@pytest.mark.parametrize("nodata", [None, -9999.0])
def test_overviews_of_a_continuous_layer_average_only_values(tmp_path: Path, nodata: float | None) -> None:
    path = write(tmp_path / "out", geographic(), [MARGIN], nodata=nodata)["margin_untouched"]
    with rasterio.open(path) as dataset:
        whole = dataset.read(1, masked=True).filled(np.nan).astype(np.float64)
        assert dataset.overviews(1) == [2, 4]
    with rasterio.open(path, overview_level=0) as dataset:
        values = dataset.read(1, masked=True).filled(np.nan).astype(np.float64)
    # numpy is the reference for the average of 2 x 2 cells
    four = np.stack([whole[row::2, column::2] for row in (0, 1) for column in (0, 1)])
    count = (~np.isnan(four)).sum(axis=0)
    mean = np.divide(np.nansum(four, axis=0), count, out=np.full(count.shape, np.nan), where=count > 0)
    assert np.array_equal(np.isnan(values), np.isnan(mean))
    assert np.nanmax(np.abs(values - mean)) <= 2.0**-11 * 1.001
    assert np.array_equal(np.rint(values * 1024) / 1024, values, equal_nan=True), "rounded like the cells"


def test_nodata_number_rewrites_values_and_tag_together(tmp_path: Path) -> None:
    grid = geographic()
    paths = write(tmp_path / "out", grid, nodata=-9999.0)
    usual = write(tmp_path / "usual", grid)
    for layer in LAYERS:
        with rasterio.open(paths[layer.name]) as dataset, rasterio.open(usual[layer.name]) as other:
            if layer.is_class:
                assert dataset.nodata == 255
                continue
            values, given = dataset.read(1), other.read(1)
            assert dataset.nodata == -9999.0
            assert not np.isnan(values).any()
            assert np.array_equal(values == -9999.0, np.isnan(given))
            assert np.array_equal(values[values != -9999.0], given[~np.isnan(given)])
            assert dataset.tags(1)["STATISTICS_MINIMUM"] == other.tags(1)["STATISTICS_MINIMUM"]


def test_nodata_that_is_a_value_or_no_number_is_refused(tmp_path: Path) -> None:
    stored = encode(fields(geographic(), Window(300, 300, 1, 1))["skew_before"], SKEW, storage_of(SKEW))
    with pytest.raises(
        InputError, match="is a value of layer skew_before; give a number that no layer takes"
    ):
        write(tmp_path / "out", geographic(), [SKEW], nodata=float(stored[0, 0]))
    with pytest.raises(InputError, match="does not fit"):
        write(tmp_path / "out", geographic(), [MARGIN], nodata=1e300)
    with pytest.raises(InputError, match="compression 'JPEG' is unknown"):
        write(tmp_path / "out", geographic(), [MARGIN], compress="JPEG")
    assert list((tmp_path / "out").iterdir()) == []


def test_classes_have_their_colours(written: dict[str, Path]) -> None:
    with rasterio.open(written["action"]) as dataset:
        table = dataset.colormap(1)
    assert table[0] == (0xA9, 0xC9, 0xB4, 255)
    assert table[5] == (0x2C, 0x2A, 0x30, 255)
    assert table[255][3] == 0
    with rasterio.open(written["below_reserve_after"]) as dataset:
        assert dataset.colormap(1)[1] == (0x8C, 0x3B, 0x1F, 255)


def test_a_region_without_any_value_is_a_message(tmp_path: Path, caplog: pytest.LogCaptureFixture) -> None:
    """R10."""
    grid = geographic(30, 40)
    window = Window(0, 0, 30, 40)
    nothing = np.full((30, 40), np.nan)
    given = {"skew_before": nothing, "margin_untouched": nothing, "action": np.full((30, 40), 255, np.uint8)}
    with pytest.raises(InputError, match="no cell of the region has a value in skew_before, margin"):
        raster.write_rasters(
            [(window, given)], grid=grid, layers=[SKEW, MARGIN, ACTION], folder=tmp_path, tags={}
        )
    assert list(tmp_path.iterdir()) == []
    given["action"] = np.zeros((30, 40), np.uint8)
    paths = raster.write_rasters(
        [(window, given)], grid=grid, layers=[SKEW, ACTION], folder=tmp_path, tags={}
    )
    assert "no value in" in caplog.text or "has a value in skew_before" in caplog.text
    assert cog_validate(paths[0], strict=True)[0]


def test_windows_that_do_not_cover_the_grid_once(tmp_path: Path) -> None:
    grid = geographic(600, 600)
    pairs = list(blocks(grid))

    def attempt(given: list[Any]) -> None:
        raster.write_rasters(given, grid=grid, layers=[MARGIN], folder=tmp_path, tags={})

    with pytest.raises(OutputError, match="3 of 4 tiles were computed, 0 of them"):
        attempt(pairs[:3])
    with pytest.raises(OutputError, match="1 of them more than once"):
        attempt([*pairs, pairs[0]])
    with pytest.raises(OutputError, match="not aligned"):
        attempt([(Window(0, 0, 100, 600), fields(grid, Window(0, 0, 100, 600)))])
    with pytest.raises(OutputError, match="came with values of shape"):
        attempt([(pairs[0][0], {"margin_untouched": np.zeros((2, 2))})])
    assert list(tmp_path.iterdir()) == []


def test_a_failure_while_computing_leaves_nothing(tmp_path: Path) -> None:
    def failing() -> Iterator[Any]:
        yield next(blocks(geographic()))
        raise KeyboardInterrupt

    with pytest.raises(KeyboardInterrupt):
        raster.write_rasters(failing(), grid=geographic(), layers=LAYERS, folder=tmp_path, tags={})
    assert list(tmp_path.iterdir()) == []


def test_a_file_that_reads_back_differently_is_noticed(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """A validator would pass an all-zero file: the values themselves are compared."""
    import rasterio.shutil

    copy = rasterio.shutil.copy

    def damaging(source: Any, target: Any, **options: Any) -> None:
        with rasterio.open(Path(source).with_suffix(".tif"), "r+") as dataset:
            values = dataset.read(1)
            values[400, 300] += 1.0
            dataset.write(values, 1)
        copy(source, target, **options)

    monkeypatch.setattr(rasterio.shutil, "copy", damaging)
    with pytest.raises(OutputError, match="reads back with another values than was written"):
        write(tmp_path / "out", geographic(), [MARGIN])
    assert list((tmp_path / "out").iterdir()) == []


def test_a_projected_grid(tmp_path: Path) -> None:
    grid = Grid("EPSG:32721", 200_000.0, 6_200_000.0, 5_000.0, 90, 70)
    path = write(tmp_path / "out", grid, [SKEW])["skew_before"]
    with rasterio.open(path) as dataset:
        assert dataset.crs.to_epsg() == 32721
        assert dataset.xy(0, 0) == (202_500.0, 6_197_500.0)


def test_a_region_across_180_degrees_keeps_its_extent(tmp_path: Path) -> None:
    """R6: the same fields give the same bytes of values, wherever the region lies."""
    here = write(tmp_path / "a", Grid("EPSG:4326", 10.0, 10.0, 0.1, 200, 100), [SKEW])["skew_before"]
    there = write(tmp_path / "b", Grid("EPSG:4326", 170.0, 10.0, 0.1, 200, 100), [SKEW])["skew_before"]
    with rasterio.open(here) as one, rasterio.open(there) as other:
        assert other.bounds.left == 170.0
        assert other.bounds.right == pytest.approx(190.0)
        assert np.array_equal(one.read(1), other.read(1), equal_nan=True)


def test_progress_is_told(tmp_path: Path) -> None:
    calls: list[tuple[str, int, int]] = []
    write(tmp_path / "out", geographic(), [SKEW, ACTION], on_progress=lambda *call: calls.append(call))
    assert calls[-1] == ("files", 2, 2)
    assert [call for call in calls if call[0] == "cells"][-1] == ("cells", 770_000, 770_000)


def test_the_tools_of_gdal_read_values_and_description(written: dict[str, Path], tmp_path: Path) -> None:
    """R2, V5: another build of GDAL, older than the one that wrote the file where Debian 12 is at hand."""
    gdalinfo, translate = shutil.which("gdalinfo"), shutil.which("gdal_translate")
    if gdalinfo is None or translate is None:
        pytest.skip("GDAL's command line tools are not installed")
    for layer in LAYERS:
        path = written[layer.name]
        told = json.loads(subprocess.run([gdalinfo, "-json", path], capture_output=True, check=True).stdout)
        band = told["bands"][0]
        assert band["description"] == layer.title
        assert band.get("unit", "") == layer.unit
        assert band["metadata"][""]["STATISTICS_MEAN"]
        assert str(band["noDataValue"]).lower() == ("255.0" if layer.is_class else "nan")
        plain = tmp_path / f"{layer.name}.bin"
        subprocess.run([translate, "-q", "-of", "ENVI", path, plain], check=True)
        with rasterio.open(path) as dataset:
            assert plain.read_bytes() == dataset.read(1).tobytes()


def test_a_full_disk_leaves_one_clear_message_and_no_file(tmp_path: Path) -> None:
    """R7: during the work file or during the final copy."""
    mount = shutil.which("mount")
    for size in ("200k", "700k", "1200k"):
        disk = tmp_path / size
        disk.mkdir()
        command = [str(mount), "-t", "tmpfs", "-o", f"size={size}", "tmpfs", str(disk)]
        if mount is None or subprocess.run(command, capture_output=True, check=False).returncode:
            pytest.skip("no right to mount a small disk")
        try:
            grid = geographic(1024, 1024)
            rng = np.random.default_rng(1)
            noise = [(window, {"margin_untouched": rng.normal(size=(512, 512))}) for window in grid.windows()]
            with pytest.raises(OutputError, match="the disk is full"):
                raster.write_rasters(noise, grid=grid, layers=[MARGIN], folder=disk, tags={})
            assert list(disk.iterdir()) == []
        finally:
            subprocess.run(["umount", str(disk)], check=True)
