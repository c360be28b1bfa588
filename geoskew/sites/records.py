"""Cutting delimited text into records, each with its true lines."""

from __future__ import annotations

import csv
from collections.abc import Iterator, Sequence
from itertools import islice
from typing import TYPE_CHECKING, NamedTuple

from geoskew.sites.listing import Rejected

if TYPE_CHECKING:
    from pandas import DataFrame

# Lines that are turned into compact columns at once: cells as separate objects take ten times the room.
CHUNK = 50_000

_FAULTS = {
    "unexpected end of data": "a quote opens here and is never closed; close or double it",
    "field larger": "a quote opens here and is never closed; close or double it",
    "expected after": "text follows a closing quote; double quotes within a quoted cell",
}


class Record(NamedTuple):
    """Lines ``begin`` to ``end`` (counted from 0, the end left out) and their cells, or what is wrong."""

    begin: int
    end: int
    cells: list[str]
    fault: str | None


def records(lines: Sequence[str], first: int, separator: str) -> Iterator[Record]:
    """Cut lines into records, cells over several lines included.

    A stray quote would swallow every row up to the next one: a line at which a record does not come
    out clean is handed out as faulty on its own, and reading goes on with the line after it.
    """
    begin = first
    while begin < len(lines):
        offset = begin
        reader = csv.reader(islice(lines, offset, None), delimiter=separator, strict=True)
        try:
            for cells in reader:
                end = offset + reader.line_num
                yield Record(begin, end, cells, None)
                begin = end
            return
        except csv.Error as error:
            told = next((text for key, text in _FAULTS.items() if key in str(error)), str(error))
            yield Record(begin, begin + 1, [], told)
            begin += 1


class Rows:
    """Rows of a text whose header has a certain number of cells.

    Attributes
    ----------
    begins, ends : list of int
        Lines of each row, counted from 0, the end left out.
    rejected : list of Rejected
        Records that are no row.
    """

    def __init__(self, lines: Sequence[str], width: int, separator: str) -> None:
        self.lines, self.width, self.separator = lines, width, separator
        self.begins: list[int] = []
        self.ends: list[int] = []
        self.rejected: list[Rejected] = []
        self._frames = [_frame([], width)]

    def read(self, first: int) -> None:
        """Read all lines from `first` on."""
        at = first
        while at < len(self.lines):
            plain = self._plain(at)
            if plain is None:
                at = self._one_by_one(at)
            else:
                self.begins.extend(range(at, at + len(plain)))
                self.ends.extend(range(at + 1, at + len(plain) + 1))
                self._frames.append(_frame(plain, self.width))
                at += len(plain)

    def frame(self) -> DataFrame:
        """All rows as columns of text, named by their position."""
        import pandas

        return pandas.concat(self._frames, ignore_index=True)

    def text(self, begin: int, end: int) -> str:
        """Lines as they stand, without the end of the last."""
        return "".join(self.lines[begin:end]).rstrip("\r\n")

    def _plain(self, at: int) -> list[list[str]] | None:
        """Cells of the next lines where each is a row of its own, as nearly always; else None."""
        chunk = self.lines[at : at + CHUNK]
        try:
            rows = list(csv.reader(chunk, delimiter=self.separator, strict=True))
        except csv.Error:
            return None
        return rows if len(rows) == len(chunk) and {*map(len, rows)} == {self.width} else None

    def _one_by_one(self, at: int) -> int:
        """Read about as many lines record by record; returns where the next record begins."""
        rows: list[list[str]] = []
        stop = at + CHUNK
        for record in records(self.lines, at, self.separator):
            at = record.end
            fault = record.fault or self._wrong_width(record.cells)
            if fault is not None:
                text = self.text(record.begin, record.end)
                self.rejected.append(Rejected(record.begin + 1, "", fault, text))
            elif record.cells:  # a line without a character is no row
                rows.append(record.cells)
                self.begins.append(record.begin)
                self.ends.append(record.end)
            if at >= stop:
                break
        self._frames.append(_frame(rows, self.width))
        return at

    def _wrong_width(self, cells: list[str]) -> str | None:
        if not cells or len(cells) == self.width:
            return None
        if not any(cell.strip() for cell in cells):
            return "the row is empty"
        return f"{len(cells)} cells where the header has {self.width}; quote cells that hold the separator"


def _frame(rows: list[list[str]], width: int) -> DataFrame:
    import pandas

    columns = list(zip(*rows, strict=True)) if rows else [()] * width
    return pandas.DataFrame(
        {position: pandas.array(cells, dtype="str") for position, cells in enumerate(columns)}
    )
