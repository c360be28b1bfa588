"""Report files, their history and what is made of their rows; the formats are the project's own."""

from __future__ import annotations

import os
import signal
import sqlite3
import subprocess
import sys
from collections.abc import Iterator
from contextlib import closing
from datetime import UTC, date, datetime, timedelta
from pathlib import Path

import numpy as np
import pytest

from geoskew.errors import InputError, OutputError
from geoskew.fieldwork.reports import (
    Facts,
    Gathered,
    Gathering,
    History,
    Read,
    Report,
    read_reports,
    slots_of,
)
from geoskew.fieldwork.reports.moments import moment_of

CHANGEOVER = datetime(2027, 5, 18, 3, 0, tzinfo=UTC)
HEADER = "site,date,setting_scale,setting_inclinometer,quality_before,quality_after,note\n"
SITES = ("A1", "A2", "007")


def read(path: Path, text: str, **more: object) -> Read:
    path.write_bytes(text.encode())
    return read_reports(path, sites=SITES, carriers=("main", "second"), changeover=CHANGEOVER)


# Reading -------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    "text",
    [
        HEADER + 'A1,2027-05-03,12,-10.5,9.8,8.75,"loose, mended"\n007,2027-05-04,,,,9,\n',
        "\ufeff"
        + HEADER.replace(",", ";")
        + "A1;2027-05-03;12;-10,5;9,8;8,75;loose, mended\n007;2027-05-04;;;;9;\n",
        HEADER.replace(",", "\t")
        + "A1\t2027-05-03\t12\t-10.5\t9.8\t8.75\tloose, mended\n007\t2027-05-04\t\t\t\t9\t\n",
        "note,quality_after,quality_before,setting_inclinometer,setting_scale,date,site\n"
        '"loose, mended",8.75,9.80,−10.5,12.0,2027-05-03,A1\n,9.0,,,,2027-05-04,007\n',
    ],
    ids=["comma", "semicolon and decimal comma", "tab", "other order, signs and digits"],
)
def test_the_same_rows_in_any_spelling_have_the_same_keys(tmp_path: Path, text: str) -> None:
    found = read(tmp_path / "r.csv", text)
    expected = (
        Report("A1", "2027-05-03", 12.0, -10.5, 9.8, 8.75, "loose, mended"),
        Report("007", "2027-05-04", quality_after=9.0),
    )
    assert found.reports == expected
    assert [one.key for one in found.reports] == [one.key for one in expected]
    assert found.rejected == ()


def test_a_workbook_is_read_like_text(tmp_path: Path) -> None:
    import openpyxl

    book = openpyxl.Workbook()
    book.active.append(["site", "date", "setting_inclinometer", "quality_after"])
    book.active.append(["A1", date(2027, 5, 3), -10.5, 8.75])
    book.save(tmp_path / "r.xlsx")
    found = read_reports(tmp_path / "r.xlsx", sites=SITES, carriers=("main",), changeover=CHANGEOVER)
    assert found.reports == (Report("A1", "2027-05-03", setting_inclinometer=-10.5, quality_after=8.75),)


@pytest.mark.parametrize(
    ("row", "reason"),
    [
        ("A11,2027-05-03,,1,,,", "site 'A11' is not in the site list; is 'A1' meant?"),
        (",2027-05-03,,1,,,", "site is empty"),
        ("A1,,,1,,,", "date is empty; write it as 2027-05-18"),
        ("A1,3rd of May,,1,,,", "is not a date"),
        ("A1,1927-05-03,,1,,,", "more than 5 years from the changeover"),
        ("A1,2027-05-03,,steep,,,", "setting_inclinometer 'steep' is not a number"),
        ("A1,2027-05-03,,200,,,", "setting_inclinometer 200 is impossible: give -180 to 180°"),
        ("A1,2027-05-03,,,,99,", "quality_after 99 is impossible: give -20 to 60 dB"),
        ("A1,2027-05-03,1,2", "4 cells where the header has 7"),
    ],
)
def test_a_broken_row_is_listed_and_its_neighbours_are_kept(tmp_path: Path, row: str, reason: str) -> None:
    found = read(tmp_path / "r.csv", f"{HEADER}A1,2027-05-03,,1,,,\n{row}\nA2,2027-05-03,,2,,,\n")
    assert [one.site for one in found.reports] == ["A1", "A2"]
    assert [(one.line, one.row) for one in found.rejected] == [(3, row)]
    assert reason in found.rejected[0].reason


def test_a_file_without_a_column_for_the_site_is_refused(tmp_path: Path) -> None:
    with pytest.raises(InputError, match="has no column 'site'"):
        read(tmp_path / "r.csv", "place,date,note\nA1,2027-05-03,\n")
    with pytest.raises(InputError, match="is empty"):
        read(tmp_path / "r.csv", "")


# Moments -------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("when", "longitude", "overlap", "moment"),
    [
        # 03:00 UTC is 22:35 of the day before at 66.2° W: that day's work is before, the next day's after.
        ("2027-05-17", -66.2, 0, "before"),
        ("2027-05-18", -66.2, 0, "after"),
        # At 180° it is 15:00: the day alone does not tell.
        ("2027-05-18", 180.0, 0, ""),
        ("2027-05-18T02:59:00+00:00", 180.0, 0, "before"),
        ("2027-05-18T03:00:00+00:00", 180.0, 0, "after"),
        ("2027-05-19", -66.2, 72, ""),
        ("2027-05-22", -66.2, 72, "after"),
    ],
)
def test_whose_signal_it_was(when: str, longitude: float, overlap: int, moment: str) -> None:
    report = Report("A1", when, quality_after=9.0)
    assert moment_of(report, longitude, CHANGEOVER, timedelta(hours=overlap)) == moment


# Rounds --------------------------------------------------------------------------------------------


def gathered(*reports: Report, at_changeover: bool = False, zero: float = 30.0) -> Gathered:
    facts = {site: Facts(-66.0, zero, -1, 6.0, at_changeover) for site in SITES}
    gathering = Gathering(facts, slots_of(1), ("main",), CHANGEOVER, timedelta())
    return gathering.gather(sorted(reports, key=lambda one: (one.site, one.date, one.key)))


def test_a_scale_is_read_by_its_zero_and_sense() -> None:
    found = gathered(Report("A1", "2027-05-03", setting_scale=12.0))
    # Zero at 30°, numbers growing counter-clockwise, a third of a step of 6°.
    assert found.rounds[0].evidence.setting.tolist() == [18.0]
    assert found.rounds[0].evidence.setting_sigma.tolist() == pytest.approx([2.0])
    unknown = gathered(Report("A1", "2027-05-03", setting_scale=12.0), zero=np.nan)
    assert np.isnan(unknown.rounds[0].evidence.setting).all()
    assert unknown.scales_unknown == 1


def test_visits_of_other_days_are_rounds_of_their_own_and_signals_go_to_the_visit_before() -> None:
    found = gathered(
        Report("A1", "2027-05-03", setting_inclinometer=10.0, quality_before=9.0, quality_after=8.0),
        Report("A1", "2027-05-10", setting_inclinometer=11.0, quality_after=8.5),
        Report("A1", "2027-05-20", quality_after=7.5),
        Report("A2", "2027-05-20", quality_after=7.0),
    )
    first, second = found.rounds
    assert first.sites.tolist() == [0, 1]
    assert first.visited.tolist() == [True, False]
    np.testing.assert_array_equal(first.evidence.quality, [[9.0, np.nan, 8.0, np.nan], [np.nan] * 3 + [7.0]])
    np.testing.assert_array_equal(second.evidence.quality, [[np.nan, np.nan, 8.5, 7.5]])
    assert second.days == (date(2027, 5, 20),)


def test_reports_of_one_day_that_contradict_each_other_are_listed_and_not_used() -> None:
    one = Report("A1", "2027-05-03", setting_inclinometer=10.0)
    other = Report("A1", "2027-05-03", setting_inclinometer=-10.0)
    found = gathered(one, other, Report("A2", "2027-05-03", setting_inclinometer=3.0))
    assert {report for report, _ in found.contradictory} == {one, other}
    assert "contradict each other" in found.contradictory[0][1]
    assert found.rounds[0].contradicted.tolist() == [True, False]
    assert np.isnan(found.rounds[0].evidence.setting[0])


def test_reports_of_one_day_that_agree_are_all_used() -> None:
    found = gathered(
        Report("A1", "2027-05-03", setting_inclinometer=10.0),
        Report("A1", "2027-05-03", setting_inclinometer=10.6),
    )
    assert found.contradictory == []
    assert found.rounds[0].evidence.setting.tolist() == pytest.approx([10.3])
    assert found.rounds[0].evidence.setting_sigma.tolist() == pytest.approx([0.5 / np.sqrt(2.0)])


def test_a_site_that_has_left_the_list_is_told() -> None:
    found = gathered(Report("B9", "2027-05-03", setting_inclinometer=10.0))
    assert "not in the site list any more" in found.contradictory[0][1]


# History -------------------------------------------------------------------------------------------

ROWS = [Report(f"S{number:02d}", "2027-05-03", setting_inclinometer=float(number)) for number in range(20)]


def test_history_is_the_same_whatever_the_order_and_however_often(tmp_path: Path) -> None:
    first, second = History(tmp_path / "a"), History(tmp_path / "b")
    assert first.add(ROWS) == 20
    assert first.add(ROWS) == 0
    assert second.add(ROWS[12:][::-1]) == 8
    assert second.add(ROWS[:15]) == 12
    assert first.reports() == second.reports() == tuple(ROWS)


def test_history_is_append_only(tmp_path: Path) -> None:
    history = History(tmp_path / "a")
    history.add(ROWS)
    with closing(sqlite3.connect(history.path)) as database:
        for statement in ("DELETE FROM reports", "UPDATE reports SET note = 'x'"):
            with pytest.raises(sqlite3.IntegrityError, match="append-only"):
                database.execute(statement)


def test_a_row_that_fails_leaves_the_history_as_it_was(tmp_path: Path) -> None:
    history = History(tmp_path / "a")
    history.add(ROWS[:5])

    def failing() -> Iterator[Report]:
        yield ROWS[7]
        raise KeyboardInterrupt

    with pytest.raises(KeyboardInterrupt):
        history.add(failing())
    assert history.reports() == tuple(ROWS[:5])


KILLED = """
import os, signal, sys
from pathlib import Path
from geoskew.fieldwork.reports import History, Report

def rows():
    for number in range(20):
        if number == 11:
            os.kill(os.getpid(), signal.SIGKILL)
        yield Report(f"S{number:02d}", "2027-05-03", setting_inclinometer=float(number))

History(Path(sys.argv[1])).add(rows())
"""


@pytest.mark.skipif(os.name != "posix", reason="not applicable: processes are killed by a signal")
def test_a_process_killed_between_two_rows_loses_nothing(tmp_path: Path) -> None:
    history = History(tmp_path / "a")
    history.add(ROWS[:5])
    done = subprocess.run([sys.executable, "-c", KILLED, str(history.path)], check=False)
    assert done.returncode == -signal.SIGKILL
    history.check()
    assert set(ROWS[:5]) <= set(history.reports())
    history.add(ROWS)
    assert history.reports() == tuple(ROWS)


def test_a_file_of_another_kind_is_refused(tmp_path: Path) -> None:
    path = tmp_path / "a"
    path.write_text("not a database, though long enough to be looked at" * 40)
    with pytest.raises(InputError, match="is no history of reports"):
        History(path).check()
    with pytest.raises(OutputError, match="could not be written"):
        History(path).add(ROWS)
    with closing(sqlite3.connect(tmp_path / "b")) as database:
        database.execute("CREATE TABLE other (x)")
    with pytest.raises(InputError, match="database of another kind"):
        History(tmp_path / "b").check()
