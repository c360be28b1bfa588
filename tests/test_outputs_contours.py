"""Isolines against closed forms: planes, cones, and angles about a point."""

from __future__ import annotations

import shutil
import sqlite3
import subprocess
from pathlib import Path
from typing import Any

import numpy as np
import pyogrio
import pytest
import rasterio
import shapely
from numpy.typing import NDArray

from geoskew.errors import InputError
from geoskew.layers import Layer
from geoskew.outputs import contours
from geoskew.outputs.contours import source
from geoskew.outputs.contours.levels import levels_of
from geoskew.outputs.contours.trace import isolines


def make(name: str, kind: Any = "continuous", *, unit: str = "dB", step: float = 1.0, **more: Any) -> Layer:
    return Layer(
        name=name,
        unit=unit,
        description=f"meaning of {name}",
        kind=kind,
        ramp="level",
        limits=(0.0, 1.0),
        contour_step=step,
        compute=lambda situation: np.zeros(()),
        **more,
    )


PLANE = make("margin_untouched")
AZIMUTH = make("azimuth_before", "circular", unit="deg", step=15.0, period=360.0)
SKEW = make("skew_before", "circular", unit="deg", step=10.0, period=180.0)

X = -5.0 + 0.1 * (np.arange(101) + 0.5)
Y = 4.0 - 0.1 * (np.arange(81) + 0.5)


def bearing(x0: float = 0.0123, y0: float = 0.0271) -> NDArray[np.float64]:
    """Clockwise from north about a point that is no cell centre, [0, 360)."""
    return np.mod(np.degrees(np.arctan2(X[None, :] - x0, Y[:, None] - y0)), 360.0)


def fold(angle: NDArray[np.float64]) -> NDArray[np.float64]:
    """Modulo 180 into (-90, 90]."""
    return 90.0 - np.mod(90.0 - angle, 180.0)


def length(parts: tuple[NDArray[np.float64], ...]) -> float:
    return float(sum(np.hypot(*np.diff(part, axis=0).T).sum() for part in parts))


def test_the_lines_of_a_plane_are_straight_through_cell_centres() -> None:
    plane = 2.0 * X[None, :] + 1.0 * Y[:, None]
    levels, step = levels_of(plane, 1.0, layer=PLANE)
    found = isolines(plane, X, Y, levels)
    assert [line.level for line in found] == levels == [float(level) for level in range(-13, 15)]
    assert step == 1.0
    for line in found:
        (part,) = line.parts
        assert 2.0 * part[:, 0] + part[:, 1] == pytest.approx(line.level, abs=1e-9)


def test_the_lines_of_a_cone_are_circles_with_larger_values_on_the_left() -> None:
    cone = np.hypot(X[None, :] - 0.03, Y[:, None] + 0.01)
    for line in isolines(cone, X, Y, [1.0, 2.0, 3.0]):
        (part,) = line.parts
        assert np.array_equal(part[0], part[-1]), "closed"
        # linear interpolation over a cell of 0.1 is within its sagitta, h^2 / 8r
        assert np.hypot(part[:, 0] - 0.03, part[:, 1] + 0.01) == pytest.approx(line.level, abs=0.1**2 / 4)
        assert not shapely.LinearRing(part).is_ccw, "larger outside is on the left when going clockwise"


@pytest.mark.parametrize("flip", [(1, 1), (1, -1), (-1, 1), (-1, -1)])
def test_the_direction_does_not_depend_on_how_the_axes_run(flip: tuple[int, int]) -> None:
    plane = np.broadcast_to(X[None, :], (Y.size, X.size))
    part = isolines(plane[:: flip[0], :: flip[1]], X[:: flip[1]], Y[:: flip[0]], [1.0])[0].parts[0]
    assert part[0, 1] > part[-1, 1], "larger values lie east: on the left of a line that runs south"


def test_the_lines_of_a_bearing_are_rays_each_level_once() -> None:
    field = bearing()
    levels, _ = levels_of(field, 15.0, layer=AZIMUTH)
    assert levels == [15.0 * k for k in range(24)]
    found = isolines(field, X, Y, levels, kind="circular", period=360.0)
    assert [line.level for line in found] == levels
    for line in found:
        assert len(line.parts) == 1, line.level
        part = line.parts[0]
        angle = np.degrees(np.arctan2(part[:, 0] - 0.0123, part[:, 1] - 0.0271))
        radius = np.hypot(part[:, 0] - 0.0123, part[:, 1] - 0.0271)
        off = np.abs(np.mod(angle - line.level + 180.0, 360.0) - 180.0)
        # an angle is not linear over a cell: half a cell beside the point, next to nothing further out
        assert np.all(np.radians(off) * radius < 0.05)
        assert off[radius > 1.0].max() < 0.15
        to_edge = min(
            4.95 / max(abs(np.sin(np.radians(line.level))), 1e-9),
            3.95 / max(abs(np.cos(np.radians(line.level))), 1e-9),
        )
        assert radius.max() > 0.9 * to_edge, "reaches the edge"
        assert radius.min() < 0.3, "begins beside the point"
        assert length(line.parts) == pytest.approx(radius.max() - radius.min(), rel=0.01), (
            "a ray and no bundle"
        )


def test_the_lines_of_an_angle_of_period_180_close_across_the_wrap() -> None:
    """Half of a bearing covers (-90, 90] once around: one ray a level, one at the wrap itself."""
    field = fold(bearing() / 2.0)
    levels, _ = levels_of(field, 10.0, layer=SKEW)
    assert levels == [float(level) for level in range(-80, 91, 10)]
    found = {line.level: line for line in isolines(field, X, Y, levels, kind="circular", period=180.0)}
    assert sorted(found) == levels
    for level, line in found.items():
        assert len(line.parts) == 1
        part = line.parts[0]
        angle = np.degrees(np.arctan2(part[:, 0] - 0.0123, part[:, 1] - 0.0271))
        radius = np.hypot(part[:, 0] - 0.0123, part[:, 1] - 0.0271)
        off = np.abs(np.mod(angle - 2.0 * level + 180.0, 360.0) - 180.0)
        assert off[radius > 1.0].max() < 0.3


def test_an_angle_that_only_touches_the_wrap_has_no_bundle_there() -> None:
    """A plane of angles from 60 to 120, folded: 90 is one straight line, -90 none."""
    plane = np.broadcast_to(90.0 + 6.0 * X[None, :], (Y.size, X.size))
    field = fold(plane)
    levels, _ = levels_of(field, 10.0, layer=SKEW)
    assert levels == [-80.0, -70.0, -60.0, 70.0, 80.0, 90.0]
    found = isolines(field, X, Y, levels, kind="circular", period=180.0)
    assert [line.level for line in found] == levels
    for line in found:
        (part,) = line.parts
        where = (np.mod(line.level, 180.0) - 90.0) / 6.0
        assert part[:, 0] == pytest.approx(where, abs=1e-9)
        assert length(line.parts) == pytest.approx(Y[0] - Y[-1], abs=1e-9)


@pytest.mark.parametrize(
    ("low", "high", "step", "wanted"),
    [
        (350.5, 372.0, 5.0, [0.0, 5.0, 10.0, 355.0]),
        (1.0, 9.0, 5.0, [5.0]),
        (350.5, 359.5, 5.0, [355.0]),
        (10.0, 20.0, 5.0, [15.0]),
    ],
)
def test_levels_of_an_arc(low: float, high: float, step: float, wanted: list[float]) -> None:
    field = np.mod(np.linspace(low, high, 5000), 360.0)
    assert levels_of(field, step, layer=AZIMUTH)[0] == wanted


def test_levels_are_short_decimals() -> None:
    levels, _ = levels_of(np.array([0.05, 1.05]), 0.1, layer=PLANE)
    assert levels == [0.1, 0.2, 0.3, 0.4, 0.5, 0.6, 0.7, 0.8, 0.9, 1.0]


def test_too_many_levels_are_refused_or_the_usual_step_is_widened() -> None:
    values = np.array([0.0, 1000.5])
    with pytest.raises(
        InputError, match=r"margin_untouched: contours every 0\.5 dB would be about 2001 levels"
    ):
        levels_of(values, 0.5, layer=PLANE)
    levels, step = levels_of(values, 0.5, layer=PLANE, widen=True)
    assert (step, len(levels)) == (10.0, 100)
    with pytest.raises(InputError, match="at most 200"):
        levels_of(bearing(), 1e-7, layer=AZIMUTH)
    assert len(levels_of(np.linspace(10.0, 10.5, 99), 0.01, layer=AZIMUTH)[0]) == 49


def test_no_lines_beside_missing_values_nor_without_a_crossing() -> None:
    plane = np.broadcast_to(X[None, :], (Y.size, X.size)).copy()
    plane[30:40, :] = np.nan
    (line,) = isolines(plane, X, Y, [0.0])
    assert len(line.parts) == 2
    gaps = [part[:, 1] for part in line.parts]
    assert all(np.all((part >= Y[29]) | (part <= Y[40])) for part in gaps)
    assert isolines(np.full((5, 5), np.nan), X[:5], Y[:5], [0.0]) == []
    assert isolines(np.full((5, 5), 3.0), X[:5], Y[:5], [3.0]) == []
    assert isolines(np.full((1, 5), 3.0), X[:5], Y[:1], [3.0]) == []
    assert levels_of(np.full((5, 5), np.nan), 1.0, layer=PLANE)[0] == []
    assert levels_of(np.full((5, 5), np.nan), 1.0, layer=SKEW)[0] == []
    assert levels_of(np.full((5, 5), 3.0), 1.0, layer=PLANE)[0] == []


def test_parts_without_length_go() -> None:
    """A single cell that touches the level exactly gives a loop of one point."""
    field = np.zeros((5, 5))
    field[2, 2] = 1.0
    field[1, 1] = 2.0
    for level in (1.0, 1.0 - 1e-15):
        for line in isolines(field, X[:5], Y[:5], [level]):
            for part in line.parts:
                assert len(part) >= 2
                assert np.all(np.hypot(*np.diff(part, axis=0).T) > 0.0)


def save(path: Path, values: NDArray[Any], *, crs: str = "EPSG:4326", west: float = -5.0) -> Path:
    with rasterio.open(
        path,
        "w",
        driver="GTiff",
        height=values.shape[0],
        width=values.shape[1],
        count=1,
        dtype="float32",
        crs=crs,
        nodata=np.nan,
        transform=rasterio.Affine(0.1, 0.0, west, 0.0, -0.1, 4.0),
    ) as dataset:
        dataset.write(values.astype(np.float32), 1)
    return path


@pytest.fixture
def rasters(tmp_path: Path) -> dict[str, Path]:
    return {
        "margin_untouched": save(tmp_path / "margin_untouched.tif", 2.0 * X[None, :] + Y[:, None]),
        "azimuth_before": save(tmp_path / "azimuth_before.tif", bearing()),
    }


def test_the_geopackage_carries_level_unit_layer_and_meaning(
    tmp_path: Path, rasters: dict[str, Path]
) -> None:
    """V3, V7, V8."""
    path = tmp_path / "contours.gpkg"
    assert contours.write_contours(path, rasters, layers=[PLANE, AZIMUTH]) == []
    assert [name for name, _ in pyogrio.list_layers(path)] == ["margin_untouched", "azimuth_before"]
    for layer, count in ((PLANE, 28), (AZIMUTH, 24)):
        table = pyogrio.read_dataframe(path, layer=layer.name)
        assert list(table.columns) == ["level", "unit", "layer", "geometry"]
        assert len(table) == count == table["level"].nunique()
        assert set(table["unit"]) == {layer.unit}
        assert set(table["layer"]) == {layer.name}
        assert table.crs.to_epsg() == 4326
        assert (shapely.length(table.geometry.to_numpy()) > 0).all()
        assert set(table.geom_type) == {"MultiLineString"}
    row = pyogrio.read_dataframe(path, layer="margin_untouched", where="level = 3")
    for x, y in shapely.get_coordinates(row.geometry.to_numpy()):
        assert 2 * x + y == pytest.approx(3.0, abs=1e-6)
    database = sqlite3.connect(path)
    described = dict(
        database.execute(
            "SELECT column_name, description FROM gpkg_data_columns WHERE table_name = 'azimuth_before'"
        ).fetchall()
    )
    database.close()
    assert described["level"].endswith("(deg)")
    assert set(described) == {"level", "unit", "layer"}


def test_same_content_same_bytes(tmp_path: Path, rasters: dict[str, Path]) -> None:
    for name in ("a", "b"):
        (tmp_path / name).mkdir()
        contours.write_contours(tmp_path / name / "c.gpkg", rasters, layers=[PLANE, AZIMUTH])
    assert (tmp_path / "a" / "c.gpkg").read_bytes() == (tmp_path / "b" / "c.gpkg").read_bytes()
    assert pyogrio.get_gdal_config_option("OGR_CURRENT_DATE") is None


def test_a_step_of_ones_own(tmp_path: Path, rasters: dict[str, Path]) -> None:
    path = tmp_path / "c.gpkg"
    contours.write_contours(path, rasters, layers=[PLANE], every=5.0)
    assert sorted(pyogrio.read_dataframe(path)["level"]) == [-10.0, -5.0, 0.0, 5.0, 10.0]


def test_a_field_across_180_degrees_gives_the_same_lines(tmp_path: Path) -> None:
    """R6."""
    here = save(tmp_path / "here.tif", bearing(), west=-5.0)
    there = save(tmp_path / "there.tif", bearing(), west=175.0)
    lines = []
    for path in (here, there):
        out = path.with_suffix(".gpkg")
        contours.write_contours(out, {"azimuth_before": path}, layers=[AZIMUTH])
        lines.append(shapely.get_coordinates(pyogrio.read_dataframe(out).geometry.to_numpy()))
    assert lines[1] == pytest.approx(lines[0] + np.array([180.0, 0.0]), abs=1e-9)


def test_a_layer_without_a_crossing_is_an_empty_layer_and_said(tmp_path: Path) -> None:
    flat = save(tmp_path / "flat.tif", np.full((20, 30), 0.5))
    path = tmp_path / "c.gpkg"
    notes = contours.write_contours(path, {"margin_untouched": flat}, layers=[PLANE])
    assert notes == ["margin_untouched: no contour, as no level is crossed within the region"]
    assert len(pyogrio.read_dataframe(path, layer="margin_untouched")) == 0


def test_a_very_large_raster_is_thinned_and_said(
    tmp_path: Path, rasters: dict[str, Path], monkeypatch: pytest.MonkeyPatch
) -> None:
    """The thinned field must sit where its cells sit: the plane's lines stay where they are."""
    monkeypatch.setattr(source, "MOST_CELLS", 900)
    monkeypatch.setattr(source, "_STRIP", 7)
    path = tmp_path / "c.gpkg"
    (note,) = contours.write_contours(path, rasters, layers=[PLANE])
    assert "every 4th cell" in note
    table = pyogrio.read_dataframe(path)
    for level, line in zip(table["level"], table.geometry, strict=True):
        points = shapely.get_coordinates(line)
        assert 2 * points[:, 0] + points[:, 1] == pytest.approx(level, abs=1e-5)


@pytest.mark.parametrize(
    ("layer", "every", "text"),
    [
        (make("action", "category", unit=""), None, "holds classes"),
        (make("margin_untouched", step=0.0), None, "give one with --every"),
        (PLANE, 0.0, "not above 0"),
        (PLANE, float("nan"), "not above 0"),
        (PLANE, 0.001, "at most 200"),
    ],
)
def test_wrong_requests(
    tmp_path: Path, rasters: dict[str, Path], layer: Layer, every: float | None, text: str
) -> None:
    with pytest.raises(InputError, match=text):
        contours.write_contours(tmp_path / "c.gpkg", rasters, layers=[layer], every=every)
    assert not list(tmp_path.glob("c.gpkg*"))


def test_wrong_files(tmp_path: Path, rasters: dict[str, Path]) -> None:
    with pytest.raises(InputError, match=r"ends in \.gpkg"):
        contours.write_contours(tmp_path / "c.shp", rasters, layers=[PLANE])
    broken = tmp_path / "broken.tif"
    broken.write_text("no raster")
    with pytest.raises(InputError, match="cannot be read as a raster"):
        contours.write_contours(tmp_path / "c.gpkg", {"margin_untouched": broken}, layers=[PLANE])


def test_the_tools_of_gdal_open_it(tmp_path: Path, rasters: dict[str, Path]) -> None:
    """V5."""
    ogrinfo = shutil.which("ogrinfo")
    if ogrinfo is None:
        pytest.skip("GDAL's command line tools are not installed")
    path = tmp_path / "contours.gpkg"
    contours.write_contours(path, rasters, layers=[PLANE, AZIMUTH])
    told = subprocess.run(
        [ogrinfo, "-ro", "-so", path, "azimuth_before"], capture_output=True, check=True, text=True
    )
    assert "Feature Count: 24" in told.stdout
    assert "WGS 84" in told.stdout
    assert told.stderr == ""
