"""The site list as text: what is read right, what is rejected, what is refused as a whole."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from site_files import ROWS, read, read_text, reasons, scenario

from geoskew.errors import InputError, MissingPartError
from geoskew.sites import Rejected, read_sites
from geoskew.sites.records import records


def test_a_plain_list(tmp_path: Path) -> None:
    sites = read_text(tmp_path, "id,lat,lon\n" + ROWS)
    assert sites.ids == ("A", "B")
    assert sites.places.latitude.tolist() == [-33.5, -34.0]
    assert sites.places.longitude.tolist() == [-70.25, -71.0]
    assert np.isnan(sites.places.height).all()
    assert sites.places.shape == (2,)
    assert sites.places.columns == {}
    assert (sites.rejected, sites.warnings, sites.reserved, sites.extra) == ([], [], (), ())
    assert sites.lines.tolist() == [2, 3]


@pytest.mark.parametrize("mark", [b"", b"\xef\xbb\xbf"], ids=["plain", "BOM"])
@pytest.mark.parametrize("ending", ["\n", "\r\n", "\r"], ids=["LF", "CRLF", "CR"])
@pytest.mark.parametrize(
    ("separator", "decimal"), [(",", "."), (";", "."), (";", ","), ("\t", "."), ("\t", ",")], ids=str
)
def test_every_way_to_write_the_same_list(
    tmp_path: Path, mark: bytes, ending: str, separator: str, decimal: str
) -> None:
    rows = [
        ["id", "lat", "lon", "name", "dish_m"],
        ["007", "-33.5", "−70.25", "Ñuñoa", "1.2"],
        ["NA", "1", ".5", "", ""],
    ]
    lines = [separator.join(c.replace(".", decimal) for c in row) + ending for row in rows]
    sites = read_text(tmp_path, mark + "".join(lines).encode())
    assert sites.ids == ("007", "NA")
    assert sites.places.latitude.tolist() == [-33.5, 1.0]
    assert sites.places.longitude.tolist() == [-70.25, 0.5]
    assert sites.frame["name"].tolist() == ["Ñuñoa", ""]
    np.testing.assert_array_equal(sites.places.columns["dish_m"], [1.2, np.nan])
    assert sites.frame["dish_m"].tolist() == [
        "1.2".replace(".", decimal),
        "",
    ]  # given values stay as they are
    assert sites.front()["dish_m"].tolist()[0] == 1.2


@pytest.mark.parametrize(
    "name", ["007", "NA", "1E5", "null", "nan", "True", "1.0", "-", "2027-05-18", "=1+1"]
)
def test_ids_are_text(tmp_path: Path, name: str) -> None:
    assert read_text(tmp_path, f"id,lat,lon\n{name},1,2\n").ids == (name,)


def test_columns_keep_their_order_and_their_text(tmp_path: Path) -> None:
    text = "zone,lat,code,lon,dish_m,note,name\nN,1.50,A,2,0.90,007,x\n"
    sites = read_text(tmp_path, text, columns={"id": "code"})
    assert list(sites.frame.columns) == ["zone", "lat", "id", "lon", "dish_m", "note", "name"]
    assert sites.frame.iloc[0].tolist() == ["N", "1.50", "A", "2", "0.90", "007", "x"]
    assert sites.reserved == ("dish_m", "name")
    assert sites.extra == ("zone", "note")
    assert list(sites.front().columns) == ["id", "lat", "lon", "dish_m", "name"]
    assert sites.back().iloc[0].tolist() == ["N", "007"]


def test_cells_over_several_lines_keep_true_line_numbers(tmp_path: Path) -> None:
    text = 'id,name,lat,lon\nA,"one\ntwo, three",1,2\n\nB,plain,x,2\nC,"say ""hello""",3,4\n'
    sites = read_text(tmp_path, text)
    assert sites.frame["name"].tolist() == ["one\ntwo, three", 'say "hello"']
    assert sites.lines.tolist() == [2, 6]
    assert sites.rejected == [Rejected(5, "B", "lat 'x' is not a number", "B,plain,x,2")]
    sites = read_text(tmp_path, 'id,name,lat,lon\nA,"one\ntwo",x,2\nB,,1,2\n')
    assert sites.rejected == [Rejected(2, "A", "lat 'x' is not a number", 'A,"one\ntwo",x,2')]


def test_a_header_over_two_lines_and_a_spreadsheets_hint(tmp_path: Path) -> None:
    assert read_text(tmp_path, '\nid,"lat","lon","a\nb"\nA,1,2,3\n').extra == ("a\nb",)
    assert read_text(tmp_path, "sep=;\nid;lat;lon\nA;1,5;2\n").places.latitude.tolist() == [1.5]


BAD_CELLS = {
    ",1,2": "id is empty",
    "A,,2": "lat is empty",
    "A,1,": "lon is empty",
    "A,abc,2": "lat 'abc' is not a number",
    "A,nan,2": "lat 'nan' is not a number",
    "A,inf,2": "lat 'inf' is not a number",
    "A,1e999,2": "lat '1e999' is not a number",
    "A,0x1F,2": "lat '0x1F' is not a number",
    "A,1_0,2": "lat '1_0' is not a number",
    "A,33° 27' S,2": 'lat "33° 27\' S" is not a number; write decimal degrees, south and west negative',
    "A,33.5S,2": "lat '33.5S' is not a number; write decimal degrees",
    'A,"-33,5",2': "lat '-33,5' is not a number; a decimal comma is read only",
    "A,91,2": "lat 91 is out of range: −90 to 90; lat and lon look swapped",
    "A,-104.5,-33": "lat -104.5 is out of range: −90 to 90; lat and lon look swapped",
    "A,-104.5,-133": "lat -104.5 is out of range: −90 to 90; lon",
    "A,9000,2": "lat 9000 is out of range: −90 to 90",
    "A,1,181": "lon 181 is out of range: −180 to 180, west negative",
    "A,x,": "lat 'x' is not a number; lon is empty",
    "A,1": "2 cells where the header has 3",
    "A,1,2,3": "4 cells where the header has 3",
    ",,": "the row is empty",
    'A,"1,2': "a quote opens here and is never closed",
    'A,"1"0,2': "text follows a closing quote",
}


@pytest.mark.parametrize("row", list(BAD_CELLS))
def test_a_bad_cell_rejects_its_row_alone(tmp_path: Path, row: str) -> None:
    text = "id,lat,lon\nfirst,1,2\n" + row + "\nlast,3,4\n"
    sites = read_text(tmp_path, text)
    assert sites.ids == ("first", "last")
    (rejected,) = sites.rejected
    assert rejected.line == 3
    assert rejected.row == row
    assert BAD_CELLS[row].rstrip("; lon") in rejected.reason


def test_of_a_repeated_id_the_first_usable_row_stays(tmp_path: Path) -> None:
    sites = read_text(tmp_path, "id,lat,lon\nA,x,2\nA,1,2\nB,3,4\n A ,5,6\nA,7,8\n")
    assert sites.ids == ("A", "B")
    assert sites.places.latitude.tolist() == [1.0, 3.0]
    assert reasons(sites)[5] == reasons(sites)[6] == "id 'A' is that of line 3 already"


def test_a_stray_quote_does_not_swallow_the_rows_below_it(tmp_path: Path) -> None:
    text = 'id,name,lat,lon\nA,"open,1,2\nB,plain,1,2\nC,"closed",1,2\nD,"open again,1,2\nE,plain,1,2\n'
    sites = read_text(tmp_path, text)
    assert sites.ids == ("B", "C", "E")
    assert sorted(reasons(sites)) == [2, 5]


REFUSED = {
    "empty": (b"", "is empty; a site list has a header"),
    "only blank lines": (b"\n\n", "is empty"),
    "only a header": (b"id,lat,lon\n", "has a header but no row"),
    "Latin-1": ("id,lat,lon\nA,1,2\nB,1,2\nCórdoba,1,2\n".encode("latin-1"), "sites.csv:4: is not UTF-8.*Córdoba"),
    "UTF-16": ("id,lat,lon\nA,1,2\n".encode("utf-16"), "is UTF-16, not UTF-8"),
    "NUL": (b"id,lat,lon\nA,1,\0\n", "sites.csv:2: holds a NUL byte"),
    "bars": (b"id|lat|lon\nA|1|2\n", "sites.csv:1: the separator cannot be told from the header"),
    "two separators": (b"id;place,lat;x,lon\n1,2\n", "sites.csv:1: the separator cannot be told"),
    "mixed decimals": (
        b"id;lat;lon\nA;-33,5;-70,5\nB;-33.5;-70.5\n",
        "sites.csv:3: the decimal sign cannot be told: comma in line 2, point in line 3",
    ),
    "no lat": (b"id,latitude,lon\nA,1,2\n", r"sites.csv:1: has no column 'lat'; is 'latitude' meant\? .* = \"latitude\""),
    "other case": (b"ID,lat,lon\nA,1,2\n", "has no column 'id'; is 'ID' meant"),
    "lat twice": (b"id,lat,lon,lat\nA,1,2,3\n", "sites.csv:1: column 'lat' stands 2 times"),
    "dish twice": (b"id,lat,lon,dish_m,dish_m\nA,1,2,3,3\n", "column 'dish_m' stands 2 times"),
    "open header": (b'id,lat,"lon\nA,1,2\n', "quote that is never closed|separator cannot be told"),
    "nothing usable": (b"id,lat,lon\nA,x,2\nB,1,y\n", "no row can be used: all 2 are rejected(.|\n)*sites.csv:2: lat 'x'"),
}  # fmt: skip


@pytest.mark.parametrize("case", list(REFUSED))
def test_a_list_that_cannot_be_read_is_refused(tmp_path: Path, case: str) -> None:
    content, message = REFUSED[case]
    with pytest.raises(InputError, match=message) as caught:
        read_text(tmp_path, content)
    assert caught.value.problems[0].file == tmp_path / "sites.csv"


def test_an_ending_that_is_not_read_and_a_scenario_without_sites(tmp_path: Path) -> None:
    with pytest.raises(InputError, match=r"the ending '.xls' is not read: a site list ends in one of .csv"):
        read_text(tmp_path, "id,lat,lon\n", name="sites.xls")
    with pytest.raises(MissingPartError, match="sites: is missing"):
        read_sites(scenario(tmp_path / "sites.xls").model_copy(update={"sites": None}))


TEXT = st.text(st.characters(codec="utf-8", exclude_characters="\0", exclude_categories=("Cs",)), max_size=8)


@settings(deadline=None, max_examples=60)
@given(st.lists(st.lists(TEXT, min_size=3, max_size=3), min_size=1, max_size=6))
def test_no_row_is_lost(tmp_path_factory: pytest.TempPathFactory, rows: list[list[str]]) -> None:
    import csv
    import io

    text = io.StringIO()
    csv.writer(text).writerows([["id", "lat", "lon"], ["sure", "1", "2"], *rows])
    sites = read_text(tmp_path_factory.mktemp("list"), text.getvalue())
    assert len(sites) + len(sites.rejected) == 1 + len(rows)
    assert sites.ids[0] == "sure"
    assert len(set(sites.ids)) == len(sites.ids)


@given(st.text('ab,;"\n', max_size=40))
def test_records_cover_all_lines_in_order(text: str) -> None:
    lines = text.splitlines(keepends=True)
    at = 0
    for record in records(lines, 0, ","):
        assert record.begin == at
        at = record.end
    assert at == len(lines)


def test_a_list_longer_than_one_chunk_keeps_lines_and_values(tmp_path: Path) -> None:
    count = 120_000
    rows = (f"{n:06d},{n / 1e4 - 60:.4f},{n / 1e4 - 70:.4f},1.2,note {n}\n" for n in range(count))
    sites = read_text(tmp_path, "id,lat,lon,dish_m,note\n" + "".join(rows) + "bad,91,0,1,\n")
    assert len(sites) == count
    assert sites.ids[77_777] == "077777"
    assert sites.places.latitude[77_777] == float(f"{77_777 / 1e4 - 60:.4f}")
    assert sites.frame["note"][77_777] == "note 77777"
    assert sites.lines[77_777] == 77_779
    assert sites.rejected[0].line == count + 2
    assert read(tmp_path / "sites.csv").ids == sites.ids
