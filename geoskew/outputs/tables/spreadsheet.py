"""Tables as XLSX workbooks: text stays text, numbers are numbers, nothing is a formula."""

from __future__ import annotations

import re
from collections.abc import Sequence
from pathlib import Path
from typing import Any, Final

from geoskew.errors import InputError
from geoskew.outputs import workbooks
from geoskew.outputs.tables.columns import ColumnInfo
from geoskew.outputs.tables.text import Position, times_as_text

# Limits of the format (ECMA-376; a sheet of a current spreadsheet program).
_MOST_ROWS: Final = 1_048_575
_MOST_COLUMNS: Final = 16_384
_MOST_CHARACTERS: Final = 32_767
_FORBIDDEN: Final = re.compile(r"[\x00-\x08\x0b\x0c\x0e-\x1f]")


def write_xlsx(part: Path, content: Any, position: Position, columns: Sequence[ColumnInfo]) -> None:
    """A sheet ``sites`` with the table and a sheet ``columns`` with unit and meaning.

    Raises
    ------
    InputError
        More rows, columns or characters in a cell than the format holds, or control characters.
    """
    from openpyxl import Workbook

    content = times_as_text(content)
    _require_fits(content, part.name)
    book = Workbook(write_only=True)
    sheet = book.create_sheet("sites")
    sheet.freeze_panes = "B2"
    names = list(content.column_names)
    sheet.append([_cell(sheet, name) for name in names])
    for batch in content.to_batches(max_chunksize=10_000):
        for row in batch.to_pylist():
            sheet.append([_cell(sheet, row[name]) for name in names])
    meanings = book.create_sheet("columns")
    for words in (("name", "unit", "meaning"), *((one.name, one.unit, one.meaning) for one in columns)):
        meanings.append([_cell(meanings, word) for word in words])
    workbooks.save(book, part)


def _require_fits(content: Any, name: str) -> None:
    """Refuse, before anything is written, what a workbook cannot hold."""
    import pyarrow as pa

    if content.num_rows > _MOST_ROWS or content.num_columns > _MOST_COLUMNS:
        raise InputError(
            f"{name}: {content.num_rows} rows and {content.num_columns} columns are more than a workbook "
            f"holds ({_MOST_ROWS} and {_MOST_COLUMNS}); write .csv, .gpkg or .parquet"
        )
    for column, field in zip(content.columns, content.schema, strict=True):
        if not pa.types.is_string(field.type):
            continue
        for text in column.to_pylist():
            if text is None or (len(text) <= _MOST_CHARACTERS and not _FORBIDDEN.search(text)):
                continue
            what = "control characters" if len(text) <= _MOST_CHARACTERS else f"{len(text)} characters"
            raise InputError(
                f"{name}: column {field.name} has a cell with {what}, which a workbook cannot hold "
                f"({text[:40]!r}); write .csv, .gpkg or .parquet"
            )


def _cell(sheet: Any, value: Any) -> Any:
    """A cell whose text is text, whatever it begins with."""
    from openpyxl.cell import WriteOnlyCell

    if not isinstance(value, str):
        return value
    cell = WriteOnlyCell(sheet, value=value)
    cell.data_type = "s"
    cell.number_format = "@"
    return cell
