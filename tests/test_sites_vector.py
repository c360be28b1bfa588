"""Site lists with geometries, and workbooks."""

from __future__ import annotations

import datetime
import json
from pathlib import Path
from typing import Any

import geopandas
import numpy as np
import openpyxl
import pandas
import pytest
import shapely
from site_files import read, read_text, reasons

from geoskew.errors import InputError

POINTS = [shapely.Point(-70.25, -33.5), shapely.Point(-71.0, -34.0)]


def written(
    path: Path, columns: dict[str, Any], geometry: list[Any], crs: str | None = "EPSG:4326", **more: Any
) -> Path:
    frame = geopandas.GeoDataFrame(columns, geometry=geometry, crs=crs)
    if path.suffix == ".parquet":
        frame.to_parquet(path)
    else:
        frame.to_file(path, **more)
    return path


@pytest.mark.parametrize("ending", [".gpkg", ".geojson", ".parquet"])
def test_every_vector_format_gives_the_same_sites(tmp_path: Path, ending: str) -> None:
    columns = {"id": ["007", "NA"], "dish_m": [1.2, None], "note": ["ñ", None], "pupils": [120, 80]}
    sites = read(written(tmp_path / f"sites{ending}", columns, POINTS))
    assert sites.ids == ("007", "NA")
    assert sites.places.longitude.tolist() == [-70.25, -71.0]
    assert sites.places.latitude.tolist() == [-33.5, -34.0]
    np.testing.assert_array_equal(sites.places.columns["dish_m"], [1.2, np.nan])
    assert (sites.reserved, sites.extra) == (("dish_m",), ("note", "pupils"))
    assert sites.back()["pupils"].tolist() == [120, 80]
    assert sites.front().columns.tolist() == ["id", "lat", "lon", "dish_m"]


def test_ids_that_the_file_stores_as_numbers(tmp_path: Path) -> None:
    assert read(written(tmp_path / "whole.gpkg", {"id": [7, 12]}, POINTS)).ids == ("7", "12")
    assert read(written(tmp_path / "real.gpkg", {"id": [7.0, 12.5]}, POINTS)).ids == ("7", "12.5")
    sites = read(written(tmp_path / "none.gpkg", {"id": [7.0, None]}, POINTS))
    assert (sites.ids, reasons(sites)) == (("7",), {2: "id is empty"})


@pytest.mark.parametrize("crs", ["EPSG:32719", "EPSG:5343", "EPSG:3857", "EPSG:4674"])
def test_other_crs_are_reprojected(tmp_path: Path, crs: str) -> None:
    # geopandas carries the points there, the reader carries them back.
    there = geopandas.GeoSeries(POINTS, crs="EPSG:4326").to_crs(crs)
    sites = read(written(tmp_path / "sites.gpkg", {"id": ["A", "B"]}, list(there), crs=crs))
    assert sites.places.longitude == pytest.approx([-70.25, -71.0], abs=1e-8)
    assert sites.places.latitude == pytest.approx([-33.5, -34.0], abs=1e-8)


def test_a_crs_is_honoured_not_assumed(tmp_path: Path) -> None:
    there = list(geopandas.GeoSeries(POINTS, crs="EPSG:4326").to_crs("EPSG:32719"))
    bare = written(tmp_path / "bare.parquet", {"id": ["A", "B"]}, there, crs=None)
    with pytest.raises(InputError, match=r"has no CRS; say it with \[sites\] crs"):
        read(bare)
    assert read(bare, crs="EPSG:32719").places.longitude == pytest.approx([-70.25, -71.0], abs=1e-8)
    stated = written(tmp_path / "stated.gpkg", {"id": ["A", "B"]}, there, crs="EPSG:32719")
    assert len(read(stated, crs="EPSG:32719")) == 2
    with pytest.raises(InputError, match=r"is in EPSG:32719, but .* says EPSG:32720; leave that key out"):
        read(stated, crs="EPSG:32720")
    sites = read(written(tmp_path / "wrong.gpkg", {"id": ["A", "B"]}, [POINTS[0], there[1]]))
    assert "lat 6236040" in reasons(sites)[2]
    assert "out of range" in reasons(sites)[2]


def test_geometries_that_are_no_points(tmp_path: Path) -> None:
    shapes = [
        POINTS[0],
        None,
        shapely.Point(),
        shapely.box(0, 0, 1, 1),
        shapely.MultiPoint([POINTS[1]]),
        shapely.MultiPoint(POINTS),
        shapely.Point(0, 95),
    ]
    sites = read(written(tmp_path / "sites.parquet", {"id": list("ABCDEFG")}, shapes))
    assert sites.ids == ("A", "E")
    assert sites.places.longitude.tolist() == [-70.25, -71.0]
    assert reasons(sites) == {
        2: "has no geometry; a site is a point",
        3: "has no geometry; a site is a point",
        4: "geometry is a Polygon; a site is a point",
        6: "geometry is a MultiPoint; a site is a point",
        7: "lat 95 is out of range: −90 to 90; lat and lon look swapped",
    }
    assert sites.rejected[0].row == "B"


def test_geometry_against_columns(tmp_path: Path) -> None:
    same = {"id": ["A", "B"], "lat": [-33.5, -34.0], "lon": [-70.25, -71.0]}
    sites = read(written(tmp_path / "same.gpkg", same, POINTS))
    assert (sites.extra, sites.warnings) == ((), [])
    other = {"id": ["A", "B"], "lat": [-33.5, -35.0], "lon": [-70.25, -71.0]}
    sites = read(written(tmp_path / "other.gpkg", other, POINTS))
    assert sites.places.latitude.tolist() == [-33.5, -34.0]
    assert sites.extra == ("lat_given", "lon_given")
    assert sites.warnings[0] == "lat and lon differ from the geometry in 1 rows; the geometry is used"
    mapped = read(tmp_path / "other.gpkg", columns={"lat": "lat", "lon": "lon"})
    assert mapped.places.latitude.tolist() == [-33.5, -35.0]


def test_layers(tmp_path: Path) -> None:
    path = tmp_path / "sites.gpkg"
    written(path, {"id": ["A", "B"]}, POINTS, layer="old")
    written(path, {"id": ["C", "D"]}, POINTS, layer="new")
    written(path, {"id": ["E", "F"]}, [shapely.box(0, 0, 1, 1)] * 2, layer="areas")
    with pytest.raises(InputError, match=r"several layers that could be meant \(old, new\)"):
        read(path)
    assert read(path, layer="new").ids == ("C", "D")
    with pytest.raises(InputError, match="has no layer 'newest'; it has old, new, areas"):
        read(path, layer="newest")


def test_tables_without_geometry(tmp_path: Path) -> None:
    table = pandas.DataFrame({"id": ["A", "B"], "lat": [1.5, 2.5], "lon": [3.0, np.nan]})
    table.to_parquet(tmp_path / "sites.parquet")
    sites = read(tmp_path / "sites.parquet")
    assert (sites.ids, sites.places.latitude.tolist()) == (("A",), [1.5])
    assert reasons(sites) == {2: "lon is empty"}


def test_broken_vector_files(tmp_path: Path) -> None:
    for name in ("sites.gpkg", "sites.geojson", "sites.parquet", "sites.xlsx"):
        with pytest.raises(InputError, match="cannot be read as") as caught:
            read_text(tmp_path, b"nothing of the kind", name=name)
        assert "\n" not in str(caught.value)
    features = {"type": "FeatureCollection", "features": []}
    with pytest.raises(InputError, match=r"no column 'id'|no row"):
        read_text(tmp_path, json.dumps(features), name="none.geojson")


def test_geojson_with_text_where_numbers_belong(tmp_path: Path) -> None:
    columns = {"id": ["A", "B"], "dish_m": ["1,2", "0,9"], "transmits": [True, False]}
    sites = read(written(tmp_path / "sites.geojson", columns, POINTS))
    assert sites.places.columns["dish_m"].tolist() == [1.2, 0.9]
    assert sites.front()["transmits"].tolist() == [1, 0]


def workbook(path: Path, *rows: list[Any], more: str | None = None) -> Path:
    book = openpyxl.Workbook()
    for row in rows:
        book.worksheets[0].append(row)
    if more is not None:
        book.create_sheet(more).append(["id", "lat", "lon"])
        book[more].append(["Z", 1, 2])
    book.save(path)
    return path


def test_a_workbook(tmp_path: Path) -> None:
    path = workbook(
        tmp_path / "sites.xlsx",
        [],
        ["id", "lat", "lon", "dish_m", "last_visit", "note", None],
        [7, -33.5, -70.25, 1.2, datetime.date(2026, 5, 3), 12, None],
        [],
        ["007", -34, "-71", None, None, None, None],
        [None, 1, 2, None, None, None, None],
        [7.0, 1, 2],
        ["X", "abc", 2, None, None, "a,b", None],
        [1.5, 1, 2],
    )
    sites = read(path)
    assert sites.ids == ("7", "007", "1.5")
    assert sites.places.longitude.tolist() == [-70.25, -71.0, 2.0]
    assert sites.frame["last_visit"].tolist() == ["2026-05-03", "", ""]
    assert sites.extra == ("note",)
    assert reasons(sites) == {
        6: "id is empty",
        7: "id '7' is that of row 3 already",
        8: "lat 'abc' is not a number",
    }
    assert sites.rejected[2].row == 'X,abc,2,,,"a,b",'


def test_decimal_commas_typed_into_a_workbook(tmp_path: Path) -> None:
    path = workbook(
        tmp_path / "sites.xlsx", ["id", "lat", "lon"], ["A", -33.5, -70.25], ["B", "-34,5", "-71,5"]
    )
    assert read(path).places.latitude.tolist() == [-33.5, -34.5]


def test_sheets(tmp_path: Path) -> None:
    path = workbook(tmp_path / "sites.xlsx", ["id", "lat", "lon"], ["A", 1, 2], more="Second")
    assert read(path).ids == ("A",)
    assert read(path).warnings == ["the first of 2 sheets is read: 'Sheet'; name another with [sites] layer"]
    assert read(path, layer="Second").ids == ("Z",)
    with pytest.raises(InputError, match="has no sheet 'Third'; it has Sheet, Second"):
        read(path, layer="Third")
    with pytest.raises(InputError, match="is empty"):
        read(workbook(tmp_path / "empty.xlsx"))
    with pytest.raises(InputError, match="column 'lat' stands 2 times"):
        read(workbook(tmp_path / "twice.xlsx", ["id", "lat", "lat", "lon"], ["A", 1, 1, 2]))
