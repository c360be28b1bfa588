"""Reading a file of reports: rows that can be used, and rows that cannot with the reason why."""

from __future__ import annotations

from collections.abc import Collection, Sequence
from dataclasses import dataclass
from datetime import date, datetime, time
from difflib import get_close_matches
from pathlib import Path
from typing import Final

import numpy as np

from geoskew.errors import InputError, Problem
from geoskew.fieldwork.reports.rows import COLUMNS, NUMBERS, OPTIONAL, Report
from geoskew.sites.cells import Column, as_text, decimal_sign, numbers
from geoskew.sites.delimited import decoded, read_delimited
from geoskew.sites.faults import Faults
from geoskew.sites.listing import Rejected
from geoskew.sites.table import RawTable
from geoskew.sites.workbook import read_workbook

ENDINGS: Final = (".csv", ".tsv", ".txt", ".xlsx")
# What a reading can be at all. Meters show −20 to 60 dB at the very most (common practice, no source).
POSSIBLE: Final = {
    "setting_scale": (-360.0, 360.0, "°"),
    "setting_inclinometer": (-180.0, 180.0, "°"),
    "quality_before": (-20.0, 60.0, " dB"),
    "quality_after": (-20.0, 60.0, " dB"),
}
# Reports further from the changeover than this belong to another one, or are misdated.
YEARS: Final = 5


@dataclass(frozen=True)
class Read:
    """Usable rows with their lines, and rejected rows, both in the file's order."""

    path: Path
    reports: tuple[Report, ...]
    lines: tuple[int, ...]
    rejected: tuple[Rejected, ...]
    warnings: tuple[str, ...]


def read_reports(
    path: Path, *, sites: Collection[str], carriers: Sequence[str], changeover: datetime
) -> Read:
    """Read reports out of a CSV file (comma, semicolon or tab) or a workbook.

    Parameters
    ----------
    path : Path
        The file. Columns ``site``, ``date``, and what there is of ``setting_scale``,
        ``setting_inclinometer``, ``quality_before``, ``quality_after``, ``note``, ``moment``, ``carrier``.
    sites : collection of str
        Identifiers of the site list.
    carriers : sequence of str
        Names of the scenario's carriers.
    changeover : datetime
        For what is a possible date.

    Raises
    ------
    InputError
        The file cannot be read, or its encoding, separator or decimal sign cannot be told, or ``site`` or
        ``date`` is no column of it.
    """
    table = _open(path)
    names = list(table.frame.columns)
    missing = [name for name in ("site", "date") if name not in names]
    if missing:
        told = f"has no column {' and no column '.join(map(repr, missing))}; it has {', '.join(names)}"
        raise InputError(Problem(f"{told}. A report file has {', '.join(COLUMNS)}", file=path, line=1))
    faults = Faults(len(table.frame))
    texts = {
        name: as_text(table.frame[name]).to_list() if name in names else [""] * len(table.frame)
        for name in ("site", "date", "note", *OPTIONAL)
    }
    values = _numbers(table, faults)
    dates = _check_texts(texts, faults, frozenset(sites), tuple(carriers), changeover)
    reports, lines = [], []
    for row in np.flatnonzero(~faults.bad).tolist():
        cells = {
            name: None if np.isnan(column[row]) else float(column[row]) for name, column in values.items()
        }
        words = {name: texts[name][row] for name in ("site", "note", "moment", "carrier")}
        words["moment"] = words["moment"].lower()
        reports.append(Report(date=dates[row], **words, **cells))  # type: ignore[arg-type]  # cells are numbers
        lines.append(int(table.lines[row]))
    rejected = table.rejected + [
        Rejected(int(table.lines[row]), texts["site"][row], "; ".join(reasons), table.row_text(row))
        for row, reasons in faults.reasons.items()
    ]
    unknown = [name for name in names if name not in (*COLUMNS, *OPTIONAL)]
    warnings = [
        f"column {name!r} of {path.name} has no meaning in a report and is not read" for name in unknown
    ]
    return Read(
        path,
        tuple(reports),
        tuple(lines),
        tuple(sorted(rejected, key=lambda one: one.line)),
        (*table.warnings, *warnings),
    )


def _open(path: Path) -> RawTable:
    ending = path.suffix.lower()
    if ending not in ENDINGS:
        raise InputError(
            Problem(
                f"the ending {ending!r} is not read: a report file ends in {', '.join(ENDINGS)}", file=path
            )
        )
    if not path.is_file():
        raise InputError(Problem("no such file; give the report file that a crew sent", file=path))
    known = (*COLUMNS, *OPTIONAL)
    if ending == ".xlsx":
        return read_workbook(path, known=known)
    if not decoded(path).strip():
        raise InputError(Problem(f"is empty; a report file has a header {','.join(COLUMNS)}", file=path))
    return read_delimited(path, required=("site", "date"), known=known)


def _numbers(table: RawTable, faults: Faults) -> dict[str, np.ndarray]:
    given = [name for name in NUMBERS if name in table.frame.columns]
    sign = decimal_sign(table, given)
    values = {name: np.full(len(table.frame), np.nan) for name in NUMBERS}
    for name in given:
        column = numbers(table, name, sign=sign)
        _check_possible(name, column, faults)
        values[name] = column.values
    return values


def _check_possible(name: str, column: Column, faults: Faults) -> None:
    low, high, unit = POSSIBLE[name]
    faults.add(
        column.wrong,
        lambda row: (
            f"{name} {column.text.iloc[row]!r} is not a number; leave it empty where nothing was read"
        ),
    )
    far = (column.values < low) | (column.values > high)
    faults.add(
        far, lambda row: f"{name} {column.text.iloc[row]} is impossible: give {low:g} to {high:g}{unit}"
    )


def _check_texts(
    texts: dict[str, list[str]],
    faults: Faults,
    sites: frozenset[str],
    carriers: tuple[str, ...],
    changeover: datetime,
) -> list[str]:
    """Check what is no number, row by row; returns the dates in one spelling, empty where wrong."""
    dates = []
    for row, site in enumerate(texts["site"]):
        reasons = [_wrong_site(site, sites)]
        written, wrong = _date(texts["date"][row], changeover)
        dates.append(written)
        moment, carrier = texts["moment"][row], texts["carrier"][row]
        reasons.append(wrong)
        if moment.lower() not in ("", "before", "after"):
            reasons.append(
                f"moment {moment!r} is neither 'before' nor 'after'; leave it empty to go by the date"
            )
        if carrier and carrier not in carriers:
            reasons.append(f"carrier {carrier!r} is none of the scenario's: {', '.join(carriers)}")
        for reason in filter(None, reasons):
            mask = np.zeros(faults.bad.size, dtype=np.bool_)
            mask[row] = True
            faults.add(mask, lambda _, reason=reason: reason)  # type: ignore[misc]  # bound at once
    return dates


def _wrong_site(site: str, sites: frozenset[str]) -> str:
    if not site:
        return "site is empty"
    if site in sites:
        return ""
    close = get_close_matches(site, sites, n=1)
    return f"site {site!r} is not in the site list" + (f"; is {close[0]!r} meant?" if close else "")


def _date(text: str, changeover: datetime) -> tuple[str, str]:
    """A date in one spelling, and what is wrong with it."""
    if not text:
        return "", "date is empty; write it as 2027-05-18"
    try:
        found = datetime.fromisoformat(text)
    except ValueError:
        return "", f"date {text!r} is not a date; write it as 2027-05-18"
    if abs(found.year - changeover.year) > YEARS:
        return (
            "",
            f"date {text} is impossible: more than {YEARS} years from the changeover {changeover:%Y-%m-%d}",
        )
    plain = found.time() == time(0) and found.tzinfo is None
    return (date.isoformat(found) if plain else found.isoformat()), ""
