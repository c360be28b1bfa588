"""Contour files: formats, reference systems, levels as text, and one clear message for each wrong file."""

from __future__ import annotations

import json

import geopandas
import numpy as np
import pytest
import shapely

from geoskew.coverage import contour_field
from geoskew.coverage.files import read_contours
from geoskew.errors import InputError

CIRCLES = {20.0: 46.0, 15.0: 47.0, 11.0: 48.0, 7.0: 49.0}


def circles():
    around = np.linspace(0.0, 2 * np.pi, 121)
    return [
        shapely.LineString(np.column_stack([10 + radius * np.cos(around), 30 + radius * np.sin(around)]))
        for radius in CIRCLES
    ]


def frame(levels=None, crs="EPSG:4326", name="dbw"):
    levels = list(CIRCLES.values()) if levels is None else levels
    return geopandas.GeoDataFrame({name: levels}, geometry=circles(), crs=crs)


def write(tmp_path, data, name="eirp.gpkg", **more):
    path = tmp_path / name
    data.to_file(path, **more)
    return path


@pytest.mark.parametrize("name", ["eirp.gpkg", "eirp.geojson", "eirp.shp", "eirp.fgb"])
def test_formats_give_the_same_field(tmp_path, name):
    path = write(tmp_path, frame(), name)
    field = contour_field(path, "dbw")
    assert field.levels == (46.0, 47.0, 48.0, 49.0)
    assert float(field.eirp(10.0, 45.0)) == pytest.approx(47.0, abs=0.02)
    assert contour_field(path, "dbw") is field


def test_other_reference_system_and_levels_as_text(tmp_path):
    projected = frame(levels=["46", " 47.0", "48,0", "49.0"]).to_crs("EPSG:3857")
    field = contour_field(write(tmp_path, projected), "dbw")
    assert field.levels == (46.0, 47.0, 48.0, 49.0)
    assert float(field.eirp(10.0, 41.0)) == pytest.approx(48.0, abs=0.02)


def test_changed_file_is_read_again(tmp_path):
    path = write(tmp_path, frame(), "eirp.geojson")
    first = contour_field(path, "dbw")
    path.unlink()
    write(tmp_path, frame(levels=[56.5, 57.5, 58.5, 59.5]), "eirp.geojson")
    assert first.levels[0] == 46.0
    assert contour_field(path, "dbw").levels[0] == 56.5


def test_peak_is_handed_on(tmp_path):
    field = contour_field(write(tmp_path, frame()), "dbw", peak_dbw=51.0)
    assert float(field.eirp(10.0, 30.0)) == pytest.approx(51.0, abs=0.05)


def refusal(path, field="dbw"):
    with pytest.raises(InputError) as caught:
        contour_field(path, field)
    assert all(problem.file == path for problem in caught.value.problems)
    return str(caught.value)


def test_missing_column_lists_the_columns(tmp_path):
    assert "has no column 'level'; its columns: dbw" in refusal(write(tmp_path, frame()), "level")


def test_level_that_is_no_number_names_the_feature(tmp_path):
    path = write(tmp_path, frame(levels=["46", "47", "forty-eight", "49"]))
    assert "feature 3: dbw = 'forty-eight' is not a number" in refusal(path)


@pytest.mark.filterwarnings("ignore:'crs' was not provided")  # on purpose
def test_no_reference_system(tmp_path):
    path = write(tmp_path, frame(crs=None), "eirp.shp")
    assert "has no coordinate reference system" in refusal(path)


def test_wrong_reference_system(tmp_path):
    # Metres stored as if they were degrees.
    projected = frame().to_crs("EPSG:3857").set_crs("EPSG:4326", allow_override=True)
    assert "feature 1 (46 dBW): the coordinate" in refusal(write(tmp_path, projected))


def test_unclosed_polygon_names_the_feature(tmp_path):
    rings = [[list(point) for point in line.coords] for line in circles()]
    rings[1] = rings[1][:-1]
    path = tmp_path / "eirp.geojson"
    features = [
        {
            "type": "Feature",
            "properties": {"dbw": level},
            "geometry": {"type": "Polygon", "coordinates": [ring]},
        }
        for ring, level in zip(rings, CIRCLES.values(), strict=True)
    ]
    path.write_text(json.dumps({"type": "FeatureCollection", "features": features}), encoding="utf-8")
    assert "feature 1: its ring is not closed" in refusal(path)


def test_crossing_contours_carry_the_file(tmp_path):
    data = frame()
    data.loc[2, "geometry"] = shapely.transform(data.geometry[2], lambda xy: xy + [9.0, 0.0])
    assert "feature 3 (48 dBW) meet near" in refusal(write(tmp_path, data))


def test_unreadable_and_absent_files(tmp_path):
    path = tmp_path / "notes.gpkg"
    path.write_text("no map", encoding="utf-8")
    assert "cannot be read as a vector file" in refusal(path)
    assert "cannot be read as a vector file" in refusal(tmp_path / "absent.gpkg")


def test_file_without_features(tmp_path):
    assert "has no features" in refusal(write(tmp_path, frame().iloc[:0]))


def test_two_layers_with_the_column(tmp_path):
    path = write(tmp_path, frame(), layer="first")
    frame().to_file(path, layer="second")
    assert "several layers with a column 'dbw' (first, second)" in refusal(path)


def test_feature_names_are_those_of_the_file(tmp_path):
    _, _, names = read_contours(write(tmp_path, frame()), "dbw")
    assert names == ["feature 1", "feature 2", "feature 3", "feature 4"]
