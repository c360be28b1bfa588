"""Short lists beside the tables: rows that could not be used, and what every column means."""

from __future__ import annotations

import csv
from collections.abc import Iterable, Sequence
from pathlib import Path
from typing import Final, Protocol

from geoskew.outputs import files
from geoskew.outputs.tables.columns import ColumnInfo

REJECTED_HEADER: Final = ("line", "id", "reason", "row")


class RejectedRow(Protocol):
    """A row of a site list that could not be used."""

    @property
    def line(self) -> int:
        """Line of the file where the row begins."""

    @property
    def id(self) -> str:
        """Identifier, as far as it could be read."""

    @property
    def reason(self) -> str:
        """Every fault of the row."""

    @property
    def row(self) -> str:
        """The row as it stands in the file."""


def write_rejected(path: Path, rejected: Iterable[RejectedRow]) -> None:
    """Write ``line,id,reason,row``, one record a rejected row; the header alone where there is none.

    Raises
    ------
    OutputError
        The file could not be written.
    """
    _write(path, REJECTED_HEADER, ((one.line, one.id, one.reason, one.row) for one in rejected))


def is_rejected_list(path: Path) -> bool:
    """Whether a file is a list of rejected rows, told by its header."""
    if not path.is_file():
        return False
    with path.open("rb") as file:
        return file.readline(100).rstrip(b"\r\n") == ",".join(REJECTED_HEADER).encode()


def write_dictionary(path: Path, columns: Sequence[ColumnInfo]) -> None:
    """Write ``name,unit,meaning`` of every column and layer.

    Raises
    ------
    OutputError
        The file could not be written.
    """
    _write(path, ("name", "unit", "meaning"), ((one.name, one.unit, one.meaning) for one in columns))


def _write(path: Path, header: Sequence[str], rows: Iterable[Sequence[object]]) -> None:
    with files.writing(path) as part, part.open("w", encoding="utf-8", newline="") as file:
        writer = csv.writer(file, lineterminator="\n")
        writer.writerow(header)
        writer.writerows(rows)
