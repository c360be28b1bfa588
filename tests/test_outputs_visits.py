"""The plan of visits as files: read back with general libraries and compared with the plan."""

from __future__ import annotations

import csv
import sqlite3
from contextlib import closing
from datetime import UTC, date, datetime, timedelta
from pathlib import Path

import icalendar
import numpy as np
import openpyxl
import pandas as pd
import pyogrio
import pytest

from geoskew.errors import InputError, OutputError
from geoskew.outputs.visits import ENDINGS, VisitSheets, write_visits

CHANGEOVER = datetime(2027, 5, 18, 3, tzinfo=UTC)
HOSTILE = '=HYPERLINK("x"), <b>; \\n ☃ long ' + "ñ" * 90


def sheets(**more: object) -> VisitSheets:
    visits = pd.DataFrame(
        {
            "crew": ["North", "North", "South/[1]"],
            "day": [date(2027, 5, 3), date(2027, 5, 3), date(2027, 5, 18)],
            "order": [1, 2, 1],
            "id": ["007", "NA", "=1+1"],
            "action": ["preset", "preset", "re-aim"],
            "turn": [10.5, -3.25, np.nan],
            "km_leg": [12.5, 7.25, 30.0],
            "lon": [-64.1, -64.2, 179.95],
            "lat": [-33.5, -33.6, -17.5],
            "name": [HOSTILE, None, "Escuela"],
            "weight": ["2", "1,5", ""],
        }
    )
    days = pd.DataFrame(
        {
            "crew": ["North", "South/[1]"],
            "day": [date(2027, 5, 3), date(2027, 5, 18)],
            "visits": [2, 1],
            "km": [40.0, 60.0],
            "base_lon": [-64.0, -179.95],
            "base_lat": [-33.5, -17.5],
            "start_lon": [-64.0, -179.95],
            "start_lat": [-33.5, -17.5],
            "end_lon": [-64.0, -179.95],
            "end_lat": [-33.5, -17.5],
            "night": ["base", "base"],
        }
    )
    lost = {"id": ["X1"], "action": ["preset"], "reason": ["out of time"], "lon": [-65.0], "lat": [-34.0]}
    given = {"title": "Lesson network, 2; x", "changeover": CHANGEOVER, "visits": visits, "days": days}
    given |= {"unreached": pd.DataFrame(lost), "missing_crew_days": 1, "notes": ("Great circles times 1.3.",)}
    return VisitSheets(**(given | more))  # type: ignore[arg-type]


def empty() -> VisitSheets:
    some = sheets()
    return sheets(visits=some.visits[:0], days=some.days[:0], unreached=some.unreached[:0])


def test_table_holds_every_stop_and_who_is_not_reached(tmp_path: Path) -> None:
    path = tmp_path / "visits.csv"
    write_visits(path, sheets())
    with path.open(encoding="utf-8", newline="") as stream:
        rows = list(csv.DictReader(stream))
    assert [row["id"] for row in rows] == ["007", "NA", "=1+1", "X1"]
    assert rows[0]["name"] == HOSTILE
    assert [row["day"] for row in rows] == ["2027-05-03", "2027-05-03", "2027-05-18", ""]
    assert [float(row["km_leg"]) for row in rows[:3]] == [12.5, 7.25, 30.0]
    # A plus is clockwise from behind the dish, and the other way round from in front (conventions).
    assert (rows[0]["from_behind"], rows[0]["from_front"]) == ("10.5° clockwise", "10.5° counter-clockwise")
    assert (rows[1]["from_behind"], rows[1]["from_front"]) == ("3.2° counter-clockwise", "3.2° clockwise")
    assert (rows[2]["from_behind"], rows[3]["reason"]) == ("", "out of time")


def test_workbook_has_a_sheet_a_crew_and_no_formula(tmp_path: Path) -> None:
    path = tmp_path / "visits.xlsx"
    write_visits(path, sheets())
    book = openpyxl.load_workbook(path)
    assert book.sheetnames == ["North", "South  1", "days", "not reached", "notes"]
    for sheet in book:
        assert all(cell.data_type != "f" for line in sheet.iter_rows() for cell in line)
    head, first, second = book["North"].iter_rows(values_only=True)
    assert dict(zip(head, first, strict=True))["name"] == HOSTILE
    assert dict(zip(head, second, strict=True))["id"] == "NA"
    assert [
        line[0] for line in book["South  1"].iter_rows(min_row=2, max_col=4, min_col=4, values_only=True)
    ] == ["=1+1"]
    assert ("Crew days missing", 1) in list(book["notes"].iter_rows(values_only=True))


def test_geopackage_has_lines_in_order_of_driving(tmp_path: Path) -> None:
    path = tmp_path / "visits.gpkg"
    write_visits(path, sheets())
    assert [name for name, _ in pyogrio.list_layers(path)] == ["tours", "visits", "unreached"]
    tours = pyogrio.read_dataframe(path, layer="tours")
    assert tours.crs.to_epsg() == 4326
    assert list(tours.geometry[0].coords) == [(-64.0, -33.5), (-64.1, -33.5), (-64.2, -33.6), (-64.0, -33.5)]
    # Across 180° the line stays short: 0.1° of longitude and back.
    assert tours.geometry[1].length == pytest.approx(0.2)
    assert list(tours["day"].astype(str)) == ["2027-05-03", "2027-05-18"]
    visits = pyogrio.read_dataframe(path, layer="visits")
    assert list(visits["id"]) == ["007", "NA", "=1+1"]
    assert list(visits["order"]) == [1, 2, 1]
    assert list(visits["weight"].fillna(-1.0)) == [2.0, 1.5, -1.0]
    assert list(visits.geometry.x) == [-64.1, -64.2, 179.95]
    lost = pyogrio.read_dataframe(path, layer="unreached")
    assert list(lost["reason"]) == ["out of time"]
    with closing(sqlite3.connect(path)) as database:
        described = dict(
            database.execute(
                "SELECT column_name, description FROM gpkg_data_columns WHERE table_name = 'visits'"
            )
        )
    assert "clockwise seen from behind" in described["turn"]


def test_calendar_reads_back(tmp_path: Path) -> None:
    path = tmp_path / "visits.ics"
    write_visits(path, sheets())
    calendar = icalendar.Calendar.from_ical(path.read_bytes())
    events = calendar.walk("VEVENT")
    assert len({str(event["UID"]) for event in events}) == 3
    change, north, south = events
    assert change.decoded("DTSTART") == CHANGEOVER
    assert north.decoded("DTSTART") == date(2027, 5, 3)
    assert north.decoded("DTEND") == date(2027, 5, 3) + timedelta(days=1)
    assert str(north["SUMMARY"]) == "North: 2 visits, 40 km"
    lines = str(north["DESCRIPTION"]).split("\n")
    assert lines[0].startswith(
        f"1. 007 {HOSTILE}: preset; from behind the dish 10.5° clockwise, from in front 10.5°"
    )
    assert lines[1].startswith("2. NA: preset; from behind the dish 3.2° counter-clockwise")
    assert (south["GEO"].latitude, south["GEO"].longitude) == (-17.5, -179.95)


def test_what_goes_with_a_turn_stands_in_table_and_calendar(tmp_path: Path) -> None:
    plain = sheets()
    remarks = ["exchange the leads", "", "cannot reach: do not force it, report to the planner"]
    told = sheets(visits=plain.visits.assign(turn_remark=remarks))
    for ending in ENDINGS:
        write_visits(tmp_path / f"visits{ending}", told)
    with (tmp_path / "visits.csv").open(encoding="utf-8", newline="") as stream:
        rows = list(csv.DictReader(stream))
    assert [one["turn_remark"] for one in rows if one["crew"]] == remarks
    text = icalendar.Calendar.from_ical((tmp_path / "visits.ics").read_bytes())
    described = [str(event.get("description", "")) for event in text.walk("VEVENT")]
    assert any("from in front 10.5° counter-clockwise; exchange the leads (" in one for one in described)
    assert any("re-aim; cannot reach: do not force it, report to the planner (" in one for one in described)
    layer = pyogrio.read_dataframe(tmp_path / "visits.gpkg", layer="visits", read_geometry=False)
    assert layer["turn_remark"].fillna("").tolist() == remarks


def test_calendar_keeps_the_rules_of_rfc_5545(tmp_path: Path) -> None:
    path = tmp_path / "visits.ics"
    write_visits(path, sheets())
    content = path.read_bytes()
    # 3.1: lines end in CR LF and hold at most 75 octets; 3.6: VERSION and PRODID are required;
    # 3.6.1: each event needs UID and DTSTAMP, the latter in UTC (3.8.7.2).
    assert content.endswith(b"END:VCALENDAR\r\n")
    assert content.count(b"\n") == content.count(b"\r\n")
    assert max(map(len, content.split(b"\r\n"))) <= 75
    assert content.count(b"VERSION:2.0\r\n") == 1
    assert content.count(b"PRODID:") == 1
    for event in content.split(b"BEGIN:VEVENT")[1:]:
        assert event.count(b"\r\nUID:") == 1
        assert b"\r\nDTSTAMP:20270518T030000Z\r\n" in event


@pytest.mark.parametrize("ending", [".csv", ".gpkg", ".ics"])
def test_same_plan_gives_the_same_bytes(ending: str, tmp_path: Path) -> None:
    for name in ("one", "two"):
        write_visits(tmp_path / (name + ending), sheets())
    assert (tmp_path / f"one{ending}").read_bytes() == (tmp_path / f"two{ending}").read_bytes()


@pytest.mark.parametrize("ending", list(ENDINGS))
def test_an_empty_plan_is_written_too(ending: str, tmp_path: Path) -> None:
    path = tmp_path / f"visits{ending}"
    write_visits(path, empty())
    assert path.stat().st_size > 0
    if ending == ".gpkg":
        assert len(pyogrio.list_layers(path)) == 3


def test_unknown_ending_and_missing_folder(tmp_path: Path) -> None:
    with pytest.raises(InputError, match=r"\.txt names no form of a plan of visits; give one of \.csv"):
        write_visits(tmp_path / "visits.txt", sheets())
    with pytest.raises(OutputError, match="does not exist"):
        write_visits(tmp_path / "none" / "visits.csv", sheets())
    assert list(tmp_path.iterdir()) == []
