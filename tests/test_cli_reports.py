"""``geoskew reports``: from report files to what became of each site and what is left to do."""

from __future__ import annotations

import csv
import json
import random
import sqlite3
from contextlib import closing
from pathlib import Path

import pytest

from geoskew.cli import main

SCENARIO = """
title = "Twelve sites at one meridian"
changeover = 2027-05-18T03:00:00Z
[outgoing]
name = "Old"
longitude_deg = -66.0
tilt_deg = 21.0
eirp_dbw = 48.0
[incoming]
name = "New"
longitude_deg = -66.0
eirp_dbw = 48.0
[carrier]
polarisation = "V"
frequency_ghz = 11.95
symbol_rate_mbaud = 27.5
required_es_n0_db = 10.2
[terminal]
dish_m = 0.9
setting_spread_deg = 1.0
[sites]
file = "sites.csv"
[decision]
reserve_db = 1.0
[[crew]]
name = "North"
base = { lon_deg = -66.0, lat_deg = -30.0 }
visits_per_day = 3
km_per_day = 900
[visits]
first_day = 2027-04-20
"""
HEADER = "site,date,setting_scale,setting_inclinometer,quality_before,quality_after,note"
# On the satellites' own meridian: skew 21° before and 0° after, 10.5° for both, 31.5° after a wrong turn.
REQUIRED = 10.2
SHARED, WRONG, HALF, PORT = 10.5, 31.5, 15.75, -79.5
ROWS = [
    f"S01,2027-05-03,,{SHARED + 0.3},,,",
    f"S02,2027-05-03,,{SHARED - 0.6},,,",
    f"S03,2027-05-03,,{WRONG},,,",
    f"S04,2027-05-04,,{HALF},,,",
    f"S05,2027-05-04,,{PORT},,,",
    "S06,2027-05-04,,21.2,,,",
    "S07,2027-05-05,,-40,,,",
    f"S08,2027-05-05,,{SHARED},,,twice",
    f"S08,2027-05-05,,{WRONG},,,twice",
]
BROKEN = "S77,2027-05-03,,1,,,"


@pytest.fixture
def scenario(tmp_path: Path) -> Path:
    """A scenario of twelve sites, each to be preset by one turn of −10.5°."""
    (tmp_path / "plan.toml").write_text(SCENARIO, encoding="utf-8")
    sites = "".join(f"S{number:02d},{-29.0 - 0.2 * number:.1f},-66.0\n" for number in range(1, 13))
    (tmp_path / "sites.csv").write_text("id,lat,lon\n" + sites, encoding="utf-8")
    return tmp_path / "plan.toml"


def write(path: Path, rows: list[str]) -> Path:
    path.write_text("\n".join([HEADER, *rows]) + "\n", encoding="utf-8")
    return path


def run(scenario: Path, out: str, *files: Path) -> Path:
    folder = scenario.parent / out
    given = [word for file in files for word in ("--reports", str(file))]
    assert main(["reports", str(scenario), *given, "--out", str(folder), "-q"]) == 0
    return folder


def table(path: Path, key: str = "id") -> dict[str, dict[str, str]]:
    with path.open(encoding="utf-8", newline="") as file:
        return {row[key]: row for row in csv.DictReader(file)}


def outcome(folder: Path) -> tuple[object, ...]:
    """History, verdicts, what is left and cards of a folder; a rejected row by its content, not its line."""
    with closing(sqlite3.connect(folder / "history.sqlite")) as database:
        history = database.execute("SELECT * FROM reports ORDER BY key").fetchall()
    names = ("sites.csv", "to_do.csv", "visits.csv", "reports.json", "cards.html", "fieldmap.html")
    return history, *((folder / name).read_bytes() for name in names)


def test_each_kind_of_fault_is_named_and_what_is_left_is_planned(scenario: Path) -> None:
    folder = run(scenario, "out", write(scenario.parent / "r.csv", [*ROWS[:4], BROKEN, *ROWS[4:]]))
    sites = table(folder / "sites.csv")
    states = {site: row["state"] for site, row in sites.items()}
    assert states == {
        "S01": "done", "S02": "done", "S03": "wrong-way", "S04": "half-turn", "S05": "wrong-port",
        "S06": "undone", "S07": "elsewhere", "S08": "contradicted",
        **{f"S{number:02d}": "not-reported" for number in range(9, 13)},
    }  # fmt: skip
    # Reading 31.5° with 0.5°, spread of the wrong turn √2°: (31.5/0.25 + 31.5/2)/(1/0.25 + 1/2) = 31.5°.
    assert float(sites["S03"]["setting_deg"]) == pytest.approx(WRONG, abs=0.1)
    assert float(sites["S03"]["setting_error"]) == pytest.approx((1 / 0.25 + 1 / 2) ** -0.5, abs=0.02)
    assert float(sites["S03"]["turn_shared"]) == pytest.approx(SHARED - WRONG, abs=0.1)
    assert float(sites["S01"]["margin_untouched"]) > 1.0
    assert float(sites["S03"]["margin_untouched"]) < float(sites["S01"]["margin_untouched"]) - 2.0
    todo = table(folder / "to_do.csv")
    assert set(todo) == set(sites) - {"S01", "S02"}
    assert {row["crew"] for row in todo.values()} == {"North"}
    assert min(row["day"] for row in todo.values()) == "2027-05-06"
    assert max(row["day"] for row in todo.values()) < "2027-05-18"
    cards = (folder / "cards.html").read_text(encoding="utf-8")
    assert "S03" in cards
    assert "S01" not in cards
    rejected = table(folder / "rejected_reports.csv", "line")
    assert {line: row["id"] for line, row in rejected.items()} == {"6": "S77", "10": "S08", "11": "S08"}


@pytest.mark.slow
def test_the_same_reports_in_any_parcels_lead_to_the_same(scenario: Path) -> None:
    here = scenario.parent
    rows = [*ROWS[:4], BROKEN, *ROWS[4:]]
    whole = run(scenario, "whole", write(here / "r.csv", rows))
    expected = outcome(whole)
    listed = (whole / "rejected_reports.csv").read_bytes()
    run(scenario, "whole", here / "r.csv")
    assert outcome(whole) == expected
    assert (whole / "rejected_reports.csv").read_bytes() == listed
    mixed = list(rows)
    random.Random(4).shuffle(mixed)
    assert outcome(run(scenario, "mixed", write(here / "mixed.csv", mixed))) == expected
    first, second = write(here / "one.csv", rows[6:]), write(here / "two.csv", rows[:8])
    run(scenario, "parts", first)
    assert outcome(run(scenario, "parts", second)) == expected
    assert outcome(run(scenario, "both", first, second)) == expected


def test_a_later_visit_settles_a_fault(scenario: Path) -> None:
    here = scenario.parent
    run(scenario, "out", write(here / "r.csv", ROWS))
    mended = [f"S03,2027-05-10,,{SHARED},,,", f"S08,2027-05-10,,{SHARED},,,"]
    folder = run(scenario, "out", write(here / "more.csv", mended))
    sites = table(folder / "sites.csv")
    assert sites["S03"]["state"] == sites["S08"]["state"] == "done"
    assert not {"S03", "S08"} & set(table(folder / "to_do.csv"))


def test_after_the_changeover_the_signal_tells_and_work_goes_on_from_there(scenario: Path) -> None:
    here = scenario.parent
    # What a meter shows is margin and required Es/N0.
    sites = table(run(scenario, "plan", write(here / "none.csv", [])) / "sites.csv")
    good = float(sites["S01"]["margin_shared_after"]) + REQUIRED
    wrong = float(sites["S01"]["margin_reversed"]) + REQUIRED
    first = float(sites["S01"]["margin_before"]) + REQUIRED
    shared = float(sites["S01"]["margin_shared_before"]) + REQUIRED
    rows = []
    for site, after in (("S01", good), ("S02", good), ("S03", wrong)):
        rows += [f"{site},2027-05-03,,,{first:.2f},{shared:.2f},", f"{site},2027-05-25,,,,{after:.2f},"]
    folder = run(scenario, "out", write(here / "r.csv", rows[::2]))
    # Before the changeover the signal cannot tell a wrong-way turn from a right one.
    assert table(folder / "sites.csv")["S03"]["state"] == "done"
    assert float(table(folder / "sites.csv")["S03"]["setting_error"]) > 3.0
    folder = run(scenario, "out", write(here / "later.csv", rows[1::2]))
    assert [table(folder / "sites.csv")[site]["state"] for site in ("S01", "S02", "S03")] == [
        "done",
        "done",
        "wrong-way",
    ]
    todo = table(folder / "to_do.csv")
    assert {row["action"] for row in todo.values()} == {"turn-at-changeover"}
    assert min(row["day"] for row in todo.values()) == "2027-05-26"
    assert float(todo["S09"]["turn"]) == pytest.approx(-21.0, abs=0.1)


def test_a_dish_out_of_aim_is_to_be_peaked_and_has_no_card(scenario: Path) -> None:
    here = scenario.parent
    sites = table(run(scenario, "plan", write(here / "none.csv", [])) / "sites.csv")
    first = float(sites["S01"]["margin_before"]) + REQUIRED
    low = float(sites["S01"]["margin_shared_before"]) + REQUIRED - 4.0
    folder = run(scenario, "out", write(here / "r.csv", [f"S01,2027-05-03,,{SHARED},{first:.2f},{low:.2f},"]))
    assert table(folder / "sites.csv")["S01"]["state"] == "out-of-aim"
    todo = table(folder / "to_do.csv")
    assert todo["S01"]["action"] == "peak-dish"
    assert todo["S01"]["crew"] == "North"
    assert "S01" not in (folder / "cards.html").read_text(encoding="utf-8")


def test_facts_are_stated_and_a_strange_history_is_refused(
    scenario: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    folder = run(scenario, "out", write(scenario.parent / "r.csv", ROWS))
    facts = json.loads((folder / "reports.json").read_text(encoding="utf-8"))
    assert facts["reports_kept"] == 9
    assert sum(facts["by_state"].values()) == 12
    other = scenario.parent / "strange"
    other.mkdir()
    (other / "history.sqlite").write_text("mine", encoding="utf-8")
    reports = str(scenario.parent / "r.csv")
    assert main(["reports", str(scenario), "--reports", reports, "--out", str(other)]) == 2
    assert "is no history of reports" in capsys.readouterr().err
    assert [path.name for path in other.iterdir()] == ["history.sqlite"]


def test_broken_rows_stop_a_strict_run(scenario: Path, capsys: pytest.CaptureFixture[str]) -> None:
    reports = str(write(scenario.parent / "r.csv", [ROWS[0], BROKEN]))
    out = str(scenario.parent / "out")
    assert main(["reports", str(scenario), "--reports", reports, "--out", out, "--strict"]) == 2
    assert "1 row of reports could not be used" in capsys.readouterr().err
