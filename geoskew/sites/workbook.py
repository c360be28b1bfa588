"""Site lists as XLSX: every cell becomes the text that the sheet's owner would type."""

from __future__ import annotations

import csv
import io
import zipfile
from collections.abc import Sequence
from datetime import date, datetime, time
from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np

from geoskew.errors import InputError, Problem
from geoskew.sites.headers import refuse_repeated, unique_names
from geoskew.sites.table import RawTable

if TYPE_CHECKING:
    from pandas import DataFrame


def read_workbook(path: Path, *, known: Sequence[str], sheet: str | None = None) -> RawTable:
    """Read one sheet of an XLSX file.

    Parameters
    ----------
    path : Path
        The file.
    known : sequence of str
        Names of columns that must not stand twice.
    sheet : str, optional
        Name of the sheet; the first one when absent.

    Raises
    ------
    InputError
        If the file cannot be read, has no such sheet, is empty, or a known column stands twice.
    """
    rows, warnings = _rows(path, sheet)
    filled = [(number, cells) for number, cells in rows if any(cell not in (None, "") for cell in cells)]
    if not filled:
        raise InputError(
            Problem("is empty; a site list has a header with id, lat, lon and one row a site", path)
        )
    (line, header), *body = filled
    width = max(len(cells) for _, cells in filled)
    names = [cell_text(cell) for cell in header] + [""] * (width - len(header))
    refuse_repeated(names, known, file=path, line=line)
    cells = [[*row, *[None] * (width - len(row))] for _, row in body]
    frame = _frame(cells, width)
    columns, renamed = unique_names(names, frame)
    kept = [position for position, name in enumerate(columns) if name is not None]
    typed = {
        str(columns[position]): np.array([_is_number(row[position]) for row in cells], dtype=np.bool_)
        for position in kept
    }
    frame = frame.iloc[:, kept]
    frame.columns = [columns[position] for position in kept]
    return RawTable(
        path=path,
        frame=frame,
        lines=np.array([number for number, _ in body], dtype=np.int64),
        row_text=lambda row: joined([cell_text(cell) for cell in cells[row]]),
        word="row",
        typed=typed,
        warnings=[*warnings, *renamed],
    )


def cell_text(cell: Any) -> str:
    """A cell as text: whole numbers without decimals, dates as ISO 8601, yes/no as 1 and 0."""
    if cell is None:
        return ""
    if isinstance(cell, bool):
        return str(int(cell))
    if isinstance(cell, float) and cell.is_integer() and abs(cell) < 1e15:
        return str(int(cell))
    if isinstance(cell, datetime):
        return cell.date().isoformat() if cell.time() == time(0) else cell.isoformat(sep=" ")
    if isinstance(cell, date | time):
        return cell.isoformat()
    return str(cell)


def joined(cells: Sequence[str]) -> str:
    """Cells as one line of comma separated text, quoted where they need it."""
    text = io.StringIO()
    csv.writer(text, lineterminator="").writerow(cells)
    return text.getvalue()


def _is_number(cell: Any) -> bool:
    return isinstance(cell, int | float) and not isinstance(cell, bool)


def _frame(cells: list[list[Any]], width: int) -> DataFrame:
    import pandas

    return pandas.DataFrame(
        {
            position: pandas.array([cell_text(row[position]) for row in cells], dtype="str")
            for position in range(width)
        }
    )


def _rows(path: Path, sheet: str | None) -> tuple[list[tuple[int, list[Any]]], list[str]]:
    """Rows of the sheet with their numbers, and a warning where a sheet was chosen among several."""
    import openpyxl
    from openpyxl.utils.exceptions import InvalidFileException

    try:
        # Values as the sheet last showed them: a formula without one is an empty cell.
        book = openpyxl.load_workbook(path, read_only=True, data_only=True)
    except (InvalidFileException, zipfile.BadZipFile, KeyError, OSError, ValueError) as error:
        raise InputError(Problem(f"cannot be read as XLSX: {error}", file=path)) from error
    try:
        names = [found.title for found in book.worksheets]
        if sheet is not None and sheet not in names:
            raise InputError(Problem(f"has no sheet {sheet!r}; it has {', '.join(names)}", file=path))
        chosen = sheet or names[0]
        rows = [
            (number, list(cells)) for number, cells in enumerate(book[chosen].iter_rows(values_only=True), 1)
        ]
    finally:
        book.close()
    several = sheet is None and len(names) > 1
    warnings = [f"the first of {len(names)} sheets is read: {chosen!r}; name another with [sites] layer"]
    return rows, warnings if several else []
