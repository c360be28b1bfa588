"""Files that are no scenario or no TOML, the index of lines, and whatever else may stand at a key."""

from __future__ import annotations

import tomllib
from pathlib import Path
from typing import Any

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from geoskew.errors import InputError, Problem
from geoskew.scenario import Scenario, from_dict, load
from geoskew.scenario.lines import LineIndex

# Line numbers below count from the first line of this text.
GOOD = """\
title = "Test"
changeover = 2027-05-18T03:00:00Z

[outgoing]
longitude_deg = -66.2
tilt_deg = 21.0
eirp_dbw = 50.0

[incoming]
longitude_deg = -66.2
eirp_dbw = 50.0

[carrier]
polarisation = "V"
frequency_ghz = 11.95
symbol_rate_mbaud = 27.5
modcod = "8PSK 3/4"

[terminal]
dish_m = 0.9

[region]
bounds_deg = [-76, -56, -53, -17]
step_deg = 0.5

[decision]
reserve_db = 1.0
"""


def problems_of(folder: Path, content: str | bytes) -> tuple[Problem, ...]:
    path = folder / "study.toml"
    path.write_bytes(content.encode() if isinstance(content, str) else content)
    with pytest.raises(InputError) as caught:
        load(path)
    for problem in caught.value.problems:
        assert problem.file == path
        assert "\n" not in str(problem)
    return caught.value.problems


@pytest.mark.parametrize(
    ("before", "after", "line", "words"),
    [
        ("11.95", "11,95", 15, "decimal point, not a comma"),
        ('"Test"', "Test", 1, "text needs quotes"),
        ('"Test"', "", 1, "a value is missing behind ="),
        ("0.9", "0.9 m", 20, "numbers stand without a unit"),
        ("[terminal]", "[terminal", 19, "a header ends with ]"),
        ('"Test"', '"C:\\data"', 1, "write / instead of"),
        ("2027-05-18T", "2027-15-18T", 2, "dates are written like"),
        ("tilt_deg = 21.0", "longitude_deg = 1", 6, "is not TOML"),
        ("[terminal]", "[carrier]", 19, "is not TOML"),
        ("reserve_db = 1.0", "reserve_db 1.0", 27, "key = value"),
    ],
)
def test_broken_toml_is_told_with_line_and_column(
    tmp_path: Path, before: str, after: str, line: int, words: str
) -> None:
    (problem,) = problems_of(tmp_path, GOOD.replace(before, after, 1))
    assert words in problem.message
    assert "is not TOML" in problem.message
    assert problem.line == line


@pytest.mark.parametrize(
    ("content", "words"),
    [
        (b"", "is empty"),
        (b"# only a remark\n", "is empty"),
        (GOOD.replace("Test", "Año").encode("latin-1"), "byte 0xf1 is not UTF-8"),
        (b"\xff\xfe" + GOOD.encode("utf-16-le"), "is not UTF-8"),
        (b"a = " + b"[" * 5000, "nested too deeply"),
        (b"#" * 10_000_001, "larger than 10 MB"),
        (b"a = " + b"9" * 5000, "is not TOML"),
        (b"PK\x03\x04", "is not TOML"),
    ],
)
def test_files_that_are_no_scenario(tmp_path: Path, content: bytes, words: str) -> None:
    (problem,) = problems_of(tmp_path, content)
    assert words in problem.message


def test_no_file_a_folder_and_a_file_behind_a_file(tmp_path: Path) -> None:
    (tmp_path / "file").touch()
    for path, words in (
        (tmp_path / "none.toml", "there is no such scenario file"),
        (tmp_path, "is a folder"),
        (tmp_path / "file" / "x.toml", "cannot be read"),
        (tmp_path / ("x" * 300), "cannot be read"),
        (tmp_path / "a\0b", "cannot be read"),
    ):
        with pytest.raises(InputError, match=words):
            load(path)


def test_lines_of_nested_and_many_line_values() -> None:
    text = '''\
a = """
[not.a.header]
b = 1
"""
c = [ # [remark]
  "]",
]
[d."e f"]
g.h = 1
[[i]]
j = { k = 1 }
[[i]]
[i.l]
m = '#'
n = "\\\\"
o = 1
'''
    tomllib.loads(text)
    lines = LineIndex(text)
    expected: dict[tuple[str | int, ...], int | None] = {
        ("a",): 1,
        ("b",): None,
        ("c",): 5,
        ("d", "e f"): 8,
        ("d", "e f", "g", "h"): 9,
        ("i", 0): 10,
        ("i", 0, "j", "k"): 11,
        ("i", 1): 12,
        ("i", 1, "l"): 13,
        ("i", 1, "l", "m"): 14,
        ("i", 1, "l", "n"): 15,
        ("i", 1, "l", "o"): 16,
        ("i", 1, "missing"): 12,
    }
    assert {place: lines.line(place) for place in expected} == expected


FULL: dict[str, Any] = tomllib.loads(
    GOOD
    + """
[[incoming.carrier]]
roll_off = 0.1
[weather]
availability_percent = 99
[[neighbour]]
longitude_deg = 3
polarisation = "V"
eirp_dbw = 40
[[crew]]
name = "a"
base = { lon_deg = 1, lat_deg = 2 }
visits_per_day = 1
km_per_day = 9
[visits]
first_day = 2027-05-01
"""
)
ANYTHING = st.recursive(
    st.none()
    | st.booleans()
    | st.integers()
    | st.floats()
    | st.text(max_size=5)
    | st.datetimes()
    | st.dates(),
    lambda inner: st.lists(inner, max_size=4) | st.dictionaries(st.text(max_size=5), inner, max_size=3),
    max_leaves=6,
)


def places(value: Any, place: tuple[Any, ...] = ()) -> list[tuple[Any, ...]]:
    found = [place] if place else []
    items = value.items() if isinstance(value, dict) else enumerate(value) if isinstance(value, list) else ()
    for key, inner in items:
        found += places(inner, (*place, key))
    return found


def put(value: Any, place: tuple[Any, ...], new: Any) -> Any:
    if not place:
        return new
    copy = value.copy()
    copy[place[0]] = put(value[place[0]], place[1:], new)
    return copy


def outcome(document: dict[str, Any]) -> Scenario | tuple[Problem, ...]:
    try:
        return from_dict(document)
    except InputError as error:
        return error.problems


@given(place=st.sampled_from(places(FULL)), new=ANYTHING)
@settings(max_examples=300, deadline=None, suppress_health_check=[HealthCheck.too_slow])
def test_whatever_stands_at_a_key_gives_a_scenario_or_problems(place: tuple[Any, ...], new: Any) -> None:
    found = outcome(put(FULL, place, new))
    if isinstance(found, Scenario):
        assert found.digest
    else:
        assert found
        assert all(problem.message for problem in found)
