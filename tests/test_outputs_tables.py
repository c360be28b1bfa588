"""Tables: the same in every format, nothing changed, nothing taken for what it is not."""

from __future__ import annotations

import csv
import json
import shutil
import sqlite3
import subprocess
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import geopandas
import numpy as np
import openpyxl
import pandas as pd
import pyogrio
import pytest

from geoskew.errors import InputError, OutputError
from geoskew.layers import Layer
from geoskew.outputs import tables
from geoskew.outputs.tables import ColumnInfo

IDS = ["007", "NA", "1E5", "=1+1", "null", "@x", 'ä,ö;\n"z"']
HOSTILE = ["+cmd", "-2+3", "#N/A", "<b>", "`${x}`", " spaces ", "😀"]
COLUMNS = [
    ColumnInfo("id", "", "identifier"),
    ColumnInfo("lat", "deg", "latitude, WGS 84"),
    ColumnInfo("lon", "deg", "longitude, WGS 84"),
    ColumnInfo("dish_m", "m", "diameter of the dish"),
    ColumnInfo("ports", "", "ports led out"),
    ColumnInfo("skew_before", "deg", "skew before", "layer"),
    ColumnInfo("action", "", "what is to be done"),
    ColumnInfo("below_reserve_after", "", "best margin below the reserve", "flag"),
    ColumnInfo("note", "", "passed through"),
    ColumnInfo("open", "", "passed through"),
    ColumnInfo("seen", "", "passed through"),
]


def sample() -> pd.DataFrame:
    return pd.DataFrame(
        {
            "seen": pd.to_datetime(["2027-05-18T03:00:00Z", None] + ["2027-01-01T00:00:00Z"] * 5, utc=True),
            "id": IDS,
            "lat": [-33.123456789, 0.1 + 0.2, 45.0, -90.0, 90.0, 1e-7, 12.5],
            "lon": [-66.2, 179.999999999, -180.0, 0.0, 190.25, 33.3, -5.0],
            "dish_m": [0.9, np.nan, 1.2, 0.1 + 0.2, 3.0, np.nan, 0.75],
            "ports": pd.array([1, None, 2, 1, 1, 2, 1], dtype="Int64"),
            "skew_before": [1.23456789, np.nan, -89.99999999, -1e-9, 0.0000014, 12.0, 90.0],
            "action": ["leave", None, "preset", "re-aim", "no-sight", "upgrade", "turn-at-changeover"],
            "below_reserve_after": np.array([0, 255, 1, 0, 1, 1, 0], np.uint8),
            "note": HOSTILE,
            "open": [True, False, True, True, False, True, False],
        }
    )


WANTED: dict[str, list[Any]] = {
    "id": IDS,
    "lat": [-33.123456789, 0.1 + 0.2, 45.0, -90.0, 90.0, 1e-7, 12.5],
    "lon": [-66.2, 179.999999999, -180.0, 0.0, 190.25, 33.3, -5.0],
    "dish_m": [0.9, None, 1.2, 0.1 + 0.2, 3.0, None, 0.75],
    "ports": [1, None, 2, 1, 1, 2, 1],
    "skew_before": [1.234568, None, -90.0, 0.0, 0.000001, 12.0, 90.0],
    "action": ["leave", None, "preset", "re-aim", "no-sight", "upgrade", "turn-at-changeover"],
    "below_reserve_after": [0, None, 1, 0, 1, 1, 0],
    "note": HOSTILE,
    "open": [1, 0, 1, 1, 0, 1, 0],
}


def write(path: Path) -> Path:
    tables.write_table(path, sample(), columns=COLUMNS)
    return path


def read(path: Path) -> list[dict[str, Any]]:
    """Rows of any of the formats, by an independent reader, text as text."""
    if path.suffix == ".csv":
        with path.open(encoding="utf-8", newline="") as file:
            return list(csv.DictReader(file))
    if path.suffix == ".geojson":
        content = json.loads(path.read_text(encoding="utf-8"))
        return [feature["properties"] for feature in content["features"]]
    if path.suffix == ".xlsx":
        rows = list(openpyxl.load_workbook(path)["sites"].iter_rows(values_only=True))
        return [dict(zip(rows[0], row, strict=True)) for row in rows[1:]]
    table = geopandas.read_parquet(path) if path.suffix == ".parquet" else pyogrio.read_dataframe(path)
    table = pd.DataFrame(table.drop(columns="geometry"))
    return [
        {name: None if pd.isna(value) else value for name, value in row.items()}
        for row in table.astype(object).to_dict("records")
    ]


@pytest.mark.parametrize("ending", tables.ENDINGS)
def test_every_format_holds_the_same(tmp_path: Path, ending: str) -> None:
    """V1, V2: names, order, number of rows, ids as text, no value as no value."""
    rows = read(write(tmp_path / f"sites{ending}"))
    assert len(rows) == 7
    assert list(rows[0]) == [column.name for column in COLUMNS]
    for name, wanted in WANTED.items():
        found = [row[name] for row in rows]
        if ending == ".csv":
            number = not isinstance(wanted[0], str)
            found = [None if cell == "" else (float(cell) if number else cell) for cell in found]
        if ending == ".xlsx" and name in ("lat", "dish_m"):
            # a workbook keeps 16 significant digits
            wanted = [value if value is None else pytest.approx(value, rel=1e-15) for value in wanted]
        assert found == wanted, name


@pytest.mark.parametrize("ending", tables.ENDINGS)
def test_same_content_same_bytes(tmp_path: Path, ending: str) -> None:
    for folder in ("a", "b"):
        (tmp_path / folder).mkdir()
        write(tmp_path / folder / f"sites{ending}")
    assert (tmp_path / "a" / f"sites{ending}").read_bytes() == (
        tmp_path / "b" / f"sites{ending}"
    ).read_bytes()
    assert [path.name for path in (tmp_path / "a").iterdir()] == [f"sites{ending}"]


def test_csv_is_plain(tmp_path: Path) -> None:
    text = write(tmp_path / "sites.csv").read_bytes().decode("utf-8")
    assert text.startswith("id,lat,lon,dish_m,ports,skew_before,action,below_reserve_after,note,open,seen\n")
    assert "\r" not in text
    first = text.splitlines()[1]
    assert first.startswith("007,-33.123456789,-66.2,0.9,1,1.234568,leave,0,+cmd,1,2027-05-18T03:00:00Z")
    assert "0.30000000000000004" in text, "a given value goes back into a program unchanged"
    assert text.endswith('"ä,ö;\n""z""",12.5,-5,0.75,1,90,turn-at-changeover,0,😀,0,2027-01-01T00:00:00Z\n')


def test_geojson_follows_rfc_7946(tmp_path: Path) -> None:
    """Longitude before latitude (3.1.1), WGS 84 without a crs member (4), within ±180 (3.1.9)."""
    content = json.loads(write(tmp_path / "s.geojson").read_text(encoding="utf-8"))
    assert content["type"] == "FeatureCollection"
    assert "crs" not in content
    points = [feature["geometry"]["coordinates"] for feature in content["features"]]
    assert points[0] == [-66.2, -33.123456789]
    assert points[4] == [-169.75, 90.0]
    assert all(-180 <= x <= 180 and -90 <= y <= 90 for x, y in points)
    assert content["features"][4]["properties"]["lon"] == 190.25, "the column stays as given"
    table = pyogrio.read_dataframe(tmp_path / "s.geojson")
    assert len(table) == 7
    assert table.crs.to_epsg() == 4326


def test_nothing_in_a_workbook_is_a_formula_or_an_error(tmp_path: Path) -> None:
    book = openpyxl.load_workbook(write(tmp_path / "s.xlsx"))
    kinds = {cell.data_type for sheet in book for row in sheet.iter_rows() for cell in row}
    assert kinds <= {"s", "inlineStr", "n"}
    assert book["sites"]["A5"].value == "=1+1"
    assert book["sites"]["A2"].number_format == "@", "an id stays text when it is edited"
    meanings = list(book["columns"].iter_rows(values_only=True))
    assert meanings[0] == ("name", "unit", "meaning")
    assert ("dish_m", "m", "diameter of the dish") in meanings


def test_the_geopackage_says_what_its_columns_mean(tmp_path: Path) -> None:
    """V3, V8."""
    path = write(tmp_path / "s.gpkg")
    assert [name for name, _ in pyogrio.list_layers(path)] == ["sites"]
    info = pyogrio.read_info(path)
    assert info["crs"] == "EPSG:4326"
    assert info["geometry_type"] == "Point"
    assert info["fid_column"] == "fid"
    table = pyogrio.read_dataframe(path)
    assert [(point.x, point.y) for point in table.geometry] == list(
        zip(table["lon"], table["lat"], strict=True)
    )
    assert str(table["seen"][0]) == "2027-05-18 03:00:00+00:00"
    database = sqlite3.connect(path)
    rows = database.execute("SELECT column_name, title, description FROM gpkg_data_columns").fetchall()
    extensions = database.execute("SELECT table_name, extension_name FROM gpkg_extensions").fetchall()
    types = {row[1]: row[2] for row in database.execute("PRAGMA table_info(sites)")}
    wrong = (
        database.execute("PRAGMA integrity_check").fetchall()
        + database.execute("PRAGMA foreign_key_check").fetchall()
    )
    database.close()
    assert [row[0] for row in rows] == [column.name for column in COLUMNS]
    assert ("skew_before", "skew_before", "skew before (deg)") in rows
    assert ("gpkg_data_columns", "gpkg_schema") in extensions
    assert types["id"].startswith("TEXT")
    assert types["ports"] in ("INTEGER", "MEDIUMINT")
    assert wrong == [("ok",)]
    assert [path.name for path in tmp_path.iterdir()] == ["s.gpkg"], "no log is left beside it"


def test_names_that_a_geopackage_cannot_hold_side_by_side(tmp_path: Path) -> None:
    table = pd.DataFrame({"id": ["a"], "lat": [1.0], "lon": [2.0], "fid": ["x"], "geom": ["y"], "ID": ["z"]})
    columns = [ColumnInfo(name, "", f"meaning of {name}") for name in table.columns]
    tables.write_table(tmp_path / "s.gpkg", table, columns=columns)
    found = pyogrio.read_dataframe(tmp_path / "s.gpkg")
    assert found.drop(columns="geometry").iloc[0].to_dict() == {
        "id": "a",
        "lat": 1.0,
        "lon": 2.0,
        "fid": "x",
        "geom": "y",
        "ID_2": "z",
    }
    with sqlite3.connect(tmp_path / "s.gpkg") as database:
        title = database.execute("SELECT title FROM gpkg_data_columns WHERE column_name = 'ID_2'").fetchone()
    database.close()
    assert title == ("ID",)
    table["geometry"] = ["mine"]
    columns.append(ColumnInfo("geometry"))
    tables.write_table(tmp_path / "s.parquet", table, columns=columns)
    back = geopandas.read_parquet(tmp_path / "s.parquet")
    assert back["geometry"][0] == "mine"
    assert back.geometry.name == "geometry_2"


def test_columns_of_mixed_values_become_text(tmp_path: Path) -> None:
    table = pd.DataFrame(
        {
            "id": ["a", "b", "c", "d"],
            "lat": 1.0,
            "lon": 2.0,
            "mixed": pd.Series([1, "x", None, True], dtype=object),
        }
    )
    columns = [ColumnInfo(name) for name in table.columns]
    for ending in tables.ENDINGS:
        tables.write_table(tmp_path / f"s{ending}", table, columns=columns)
        found = [row["mixed"] or None for row in read(tmp_path / f"s{ending}")]
        assert found == ["1", "x", None, "1"], ending


@pytest.mark.parametrize("ending", tables.ENDINGS)
def test_a_table_without_rows_keeps_its_columns(tmp_path: Path, ending: str) -> None:
    path = tmp_path / f"sites{ending}"
    tables.write_table(path, sample().iloc[:0], columns=COLUMNS)
    assert path.exists()
    if ending == ".csv":
        assert path.read_text().count("\n") == 1
    elif ending == ".gpkg":
        assert list(pyogrio.read_info(path)["fields"]) == [column.name for column in COLUMNS]
    elif ending == ".parquet":
        assert list(geopandas.read_parquet(path).columns[:-1]) == [column.name for column in COLUMNS]
    else:
        assert read(path) == []


def test_a_layer_knows_its_column() -> None:
    def make(kind: Any) -> Layer:
        return Layer("n", "dB", "meaning", kind, "level", (0, 1), 0.0, lambda situation: np.zeros(()))

    assert tables.layer_column(make("continuous")) == ColumnInfo("n", "dB", "meaning", "layer")
    assert tables.layer_column(make("circular")).kind == "layer"
    assert tables.layer_column(make("flag")).kind == "flag"
    assert tables.layer_column(make("category")).kind == "given"


def test_wrong_requests(tmp_path: Path) -> None:
    with pytest.raises(
        InputError, match=r"sites\.shp: the ending tells the format .* \.csv, \.gpkg, \.geojson"
    ):
        write(tmp_path / "sites.shp")
    with pytest.raises(ValueError, match="missing from the table"):
        tables.write_table(tmp_path / "s.csv", sample(), columns=[*COLUMNS, ColumnInfo("none")])
    with pytest.raises(OutputError, match="does not exist"):
        write(tmp_path / "none" / "sites.csv")
    table = sample()
    table.loc[0, "note"] = "x" * 40_000
    with pytest.raises(InputError, match="column note has a cell with 40000 characters"):
        tables.write_table(tmp_path / "s.xlsx", table, columns=COLUMNS)
    table.loc[0, "note"] = "a\x07b"
    with pytest.raises(InputError, match="control characters"):
        tables.write_table(tmp_path / "s.xlsx", table, columns=COLUMNS)
    assert list(tmp_path.iterdir()) == []


@dataclass
class Row:
    line: int
    id: str
    reason: str
    row: str


def test_rejected_rows(tmp_path: Path) -> None:
    """V4; the file is there even when nothing was rejected."""
    path = tmp_path / "rejected.csv"
    tables.write_rejected(path, [])
    assert path.read_text(encoding="utf-8") == "line,id,reason,row\n"
    tables.write_rejected(path, [Row(7, "=x", "lat 95: beyond 90", 'a,"b\nc",d')])
    with path.open(encoding="utf-8", newline="") as file:
        assert list(csv.reader(file))[1] == ["7", "=x", "lat 95: beyond 90", 'a,"b\nc",d']


def test_dictionary(tmp_path: Path) -> None:
    tables.write_dictionary(tmp_path / "columns.csv", COLUMNS)
    with (tmp_path / "columns.csv").open(encoding="utf-8", newline="") as file:
        rows = list(csv.reader(file))
    assert rows[0] == ["name", "unit", "meaning"]
    assert ["skew_before", "deg", "skew before"] in rows
    assert len(rows) == len(COLUMNS) + 1


def test_the_tools_of_gdal_open_the_geopackage(tmp_path: Path) -> None:
    """V5."""
    ogrinfo = shutil.which("ogrinfo")
    if ogrinfo is None:
        pytest.skip("GDAL's command line tools are not installed")
    path = write(tmp_path / "s.gpkg")
    told = subprocess.run([ogrinfo, "-ro", "-al", path, "sites"], capture_output=True, check=True, text=True)
    assert "Feature Count: 7" in told.stdout
    assert "id (String) = 007" in told.stdout
    assert told.stderr == ""
