"""The plan as a workbook (XLSX): a sheet a crew, and one of those who are not reached."""

from __future__ import annotations

import re
from collections.abc import Iterable
from pathlib import Path
from typing import Any, Final

from geoskew.outputs import workbooks
from geoskew.outputs.visits.sheet import VisitSheets, stops

# What a sheet's title and a cell's text cannot hold (ECMA-376).
_NOT_IN_TITLE: Final = re.compile(r"[\x00-\x1f\[\]:*?/\\']")
_NOT_IN_CELL: Final = re.compile(r"[\x00-\x08\x0b\x0c\x0e-\x1f\ud800-\udfff\ufffe\uffff]")
_LONGEST_TITLE: Final = 31
_LONGEST_CELL: Final = 32_767


def write_workbook(part: Path, sheets: VisitSheets) -> None:
    """Write the file; text stays text, whatever it begins with."""
    from openpyxl import Workbook

    book = Workbook(write_only=True)
    table = stops(sheets)
    taken: set[str] = set()
    for crew, visits in table.groupby("crew", sort=False):
        _sheet(book, _title(str(crew), taken), visits.columns, visits.itertuples(index=False))
    _sheet(book, _title("days", taken), sheets.days.columns, sheets.days.itertuples(index=False))
    lost = sheets.unreached
    _sheet(book, _title("not reached", taken), lost.columns, lost.itertuples(index=False))
    missing = ("Crew days missing", sheets.missing_crew_days)
    notes = [("Title", sheets.title), missing, *(("Note", note) for note in sheets.notes)]
    _sheet(book, _title("notes", taken), ("what", "value"), notes)
    book.properties.creator = "geoskew"
    workbooks.save(book, part)


def _title(name: str, taken: set[str]) -> str:
    """A title that the format allows and no other sheet has."""
    plain = _NOT_IN_TITLE.sub(" ", name).strip()[:_LONGEST_TITLE] or "crew"
    title, number = plain, 2
    while title.lower() in taken:
        tail = f" {number}"
        title, number = plain[: _LONGEST_TITLE - len(tail)] + tail, number + 1
    taken.add(title.lower())
    return title


def _sheet(book: Any, title: str, names: Iterable[Any], rows: Iterable[Iterable[Any]]) -> None:
    sheet = book.create_sheet(title)
    sheet.freeze_panes = "A2"
    sheet.append([_cell(sheet, str(name)) for name in names])
    for row in rows:
        sheet.append([_cell(sheet, value) for value in row])


def _cell(sheet: Any, value: Any) -> Any:
    from openpyxl.cell import WriteOnlyCell

    if not isinstance(value, str):
        return None if value != value else value  # NaN is an empty cell
    cell = WriteOnlyCell(sheet, value=_NOT_IN_CELL.sub("\N{WHITE SQUARE}", value)[:_LONGEST_CELL])
    cell.data_type = "s"
    return cell
