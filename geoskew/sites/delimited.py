"""Site lists as delimited text: which bytes are text, and which sign parts the cells."""

from __future__ import annotations

import io
import re
from collections.abc import Sequence
from pathlib import Path

import numpy as np

from geoskew.errors import InputError, Problem
from geoskew.sites.headers import refuse_repeated, unique_names
from geoskew.sites.records import Record, Rows, records
from geoskew.sites.table import RawTable

SEPARATORS = {",": "comma", ";": "semicolon", "\t": "tab"}


def read_delimited(path: Path, *, required: Sequence[str], known: Sequence[str]) -> RawTable:
    """Read comma, semicolon or tab separated text in UTF-8.

    Parameters
    ----------
    path : Path
        The file.
    required : sequence of str
        Names that the header should hold: the separator is the one that finds them.
    known : sequence of str
        Names that must not stand twice.

    Raises
    ------
    InputError
        If the file is empty, encoding or separator cannot be told, or a known column stands twice;
        names the line.
    """
    lines = list(io.StringIO(decoded(path), newline=""))
    first = next((index for index, line in enumerate(lines) if line.strip()), None)
    if first is None:
        raise InputError(
            Problem("is empty; a site list has a header with id, lat, lon and one row a site", path)
        )
    hint = re.fullmatch(r'"?sep=([,;\t])"?\s*', lines[first])  # a spreadsheet's own line above the header
    if hint is not None and first + 1 < len(lines):
        separator, first = hint[1], first + 1
    else:
        separator = _separator(lines, first, required, path)
    header = _header(lines, first, separator)
    if header is None:
        raise InputError(
            Problem("the header has a quote that is never closed; close or double it", path, first + 1)
        )
    refuse_repeated(header.cells, known, file=path, line=first + 1)
    return _table(path, lines, header, separator)


def decoded(path: Path) -> str:
    """Text of a UTF-8 file, its byte order mark left out.

    Raises
    ------
    InputError
        If the file cannot be opened or is not UTF-8; names the first line that is not.
    """
    try:
        data = path.read_bytes()
    except OSError as error:
        raise InputError(Problem(f"cannot be read: {error.strerror}", file=path)) from error
    if data.startswith((b"\xff\xfe", b"\xfe\xff")):
        raise InputError(Problem("is UTF-16, not UTF-8; save it as CSV UTF-8", path, 1))
    try:
        text = data.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        raise InputError(_not_utf8(path, data, error.start)) from error
    if "\0" in text:
        line = _line_at(data, data.index(b"\0"))
        raise InputError(
            Problem("holds a NUL byte: this is not a text file; save it as CSV UTF-8", path, line)
        )
    return text


def _not_utf8(path: Path, data: bytes, at: int) -> Problem:
    line = _line_at(data, at)
    # What the bytes would say in the encoding that spreadsheets most often leave behind.
    start, stop = max(data.rfind(b"\n", 0, at) + 1, at - 12), at + 12
    guess = data[start:stop].decode("latin-1").strip()
    message = (
        f"is not UTF-8 (byte 0x{data[at]:02X}; in Latin-1 it would read “{guess}”); "
        "save it as CSV UTF-8, since other encodings cannot be told apart"
    )
    return Problem(message, path, line)


def _line_at(data: bytes, at: int) -> int:
    before = data[:at]
    return before.count(b"\n") + before.replace(b"\r\n", b"").count(b"\r") + 1


def _header(lines: Sequence[str], first: int, separator: str) -> Record | None:
    record = next(records(lines, first, separator))
    return None if record.fault else record


def _separator(lines: Sequence[str], first: int, required: Sequence[str], path: Path) -> str:
    """The separator that finds the required names in the header, else the one that parts it most."""
    cells = {}
    for separator in SEPARATORS:
        header = _header(lines, first, separator)
        if header is not None:
            cells[separator] = [cell.strip() for cell in header.cells]
    fitting = [sign for sign, names in cells.items() if all(name in names for name in required)]
    if len(fitting) == 1:
        return fitting[0]
    most = max((len(names) for names in cells.values()), default=0)
    parting = [sign for sign, names in cells.items() if len(names) == most]
    if most < 2 or len(parting) > 1:
        shown = lines[first].strip()[:60]
        message = (
            f"the separator cannot be told from the header “{shown}”; "
            f"part the columns by comma, semicolon or tab, among them {', '.join(required)}"
        )
        raise InputError(Problem(message, path, first + 1))
    return parting[0]


def _table(path: Path, lines: Sequence[str], header: Record, separator: str) -> RawTable:
    rows = Rows(lines, len(header.cells), separator)
    rows.read(header.end)
    frame = rows.frame()
    columns, warnings = unique_names(header.cells, frame)
    frame = frame.iloc[:, [position for position, name in enumerate(columns) if name is not None]]
    frame.columns = [name for name in columns if name is not None]
    return RawTable(
        path=path,
        frame=frame,
        lines=np.asarray(rows.begins, dtype=np.int64) + 1,
        row_text=lambda row: rows.text(rows.begins[row], rows.ends[row]),
        comma_may_be_decimal=separator != ",",
        rejected=rows.rejected,
        warnings=warnings,
    )
