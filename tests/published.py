"""Tables of published values in tests/reference: comments with the source, a header, one case a row."""

from __future__ import annotations

import csv
from pathlib import Path

FOLDER = Path(__file__).parent / "reference"


def cases(name: str) -> list[dict[str, str | float | None]]:
    """Rows of a table: numbers as floats, empty cells as None, anything else as text."""
    lines = (FOLDER / name).read_text(encoding="utf-8").splitlines()
    rows = csv.DictReader(line for line in lines if not line.startswith("#"))
    return [{key: _value(text) for key, text in row.items()} for row in rows]


def _value(text: str) -> str | float | None:
    if not text:
        return None
    try:
        return float(text)
    except ValueError:
        return text


def by_case(row: dict[str, str | float | None]) -> str:
    """Identify a parametrised test by its case."""
    return str(row["case"])
