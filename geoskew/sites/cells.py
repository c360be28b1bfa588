"""From cells to numbers, yes/no and text, a whole column at a time."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING, Any, NamedTuple

import numpy as np
from numpy.typing import NDArray

from geoskew.errors import InputError, Problem
from geoskew.sites.table import RawTable

if TYPE_CHECKING:
    from pandas import Series

POINT = r"[+-]?(?:[0-9]+\.?[0-9]*|\.[0-9]+)(?:[eE][+-]?[0-9]+)?"
COMMA = POINT.replace(r"\.", ",")
YES = ("1", "yes", "true", "y")
NO = ("0", "no", "false", "n")


class Column(NamedTuple):
    """Cells as text without spaces around them (N,), their values (NaN: none), and which are wrong."""

    text: Any
    values: NDArray[np.float64]
    wrong: NDArray[np.bool_]

    @property
    def empty(self) -> NDArray[np.bool_]:
        """Cells with nothing in them."""
        return np.isnan(self.values) & ~self.wrong


def as_text(cells: Series) -> Series:
    """Cells as text without spaces around them; missing ones are empty, whole numbers have no decimals."""
    import pandas

    if pandas.api.types.is_bool_dtype(cells.dtype):
        return cells.map({True: "1", False: "0"}).astype("str").fillna("")
    if pandas.api.types.is_float_dtype(cells.dtype):
        values = cells.to_numpy(dtype=np.float64, na_value=np.nan)
        whole = np.isfinite(values) & (values == np.trunc(values)) & (np.abs(values) < 1e15)
        text = np.array(["" if np.isnan(value) else repr(value) for value in values.tolist()], dtype=object)
        text[whole] = [str(int(value)) for value in values[whole]]
        return pandas.Series(text, dtype="str")
    return cells.astype("str").fillna("").str.strip()


def decimal_sign(table: RawTable, *groups: Sequence[str]) -> str:
    """The sign before the decimals, by the first group of columns that shows any.

    Parameters
    ----------
    table : RawTable
        As read.
    *groups : sequence of str
        The file's names of columns of numbers; those of one group decide together.

    Raises
    ------
    InputError
        If both signs occur in the group that decides; names the line of either.
    """
    if not table.comma_may_be_decimal:
        return "."
    for group in groups:
        comma, point = _first_lines(table, group)
        if comma is not None and point is not None:
            message = (
                f"the decimal sign cannot be told: comma in {table.word} {comma}, "
                f"point in {table.word} {point}; write all numbers alike"
            )
            raise InputError(Problem(message, file=table.path, line=max(comma, point)))
        if comma is not None or point is not None:
            return "," if comma is not None else "."
    return "."


def numbers(table: RawTable, name: str, *, sign: str) -> Column:
    """A column of numbers, by the file's name of it; `sign` stands before the decimals."""
    import pandas

    cells = table.frame[name]
    if pandas.api.types.is_numeric_dtype(cells.dtype) and not pandas.api.types.is_bool_dtype(cells.dtype):
        values = cells.to_numpy(dtype=np.float64, na_value=np.nan)
        return Column(as_text(cells), np.where(np.isinf(values), np.nan, values), np.isinf(values))
    text = as_text(cells)
    plain = text.str.replace("−", "-", regex=False)
    good = plain.str.fullmatch(COMMA if sign == "," else POINT).to_numpy(dtype=np.bool_, copy=True)
    if sign == "," and name in table.typed:
        good |= table.typed[name] & plain.str.fullmatch(POINT).to_numpy(dtype=np.bool_)
    values = np.full(len(text), np.nan)
    # Python's own conversion is exact to the last digit, so that values are written as they came.
    values[good] = plain[good].str.replace(",", ".", regex=False).to_numpy(dtype=object).astype(np.float64)
    wrong = ~good & text.ne("").to_numpy(dtype=np.bool_)
    huge = np.isinf(values)
    values[huge] = np.nan
    return Column(text, values, wrong | huge)


def yes_no(table: RawTable, name: str) -> Column:
    """A column of yes and no, by the file's name of it; the values are 1 and 0."""
    text = as_text(table.frame[name])
    lower = text.str.lower()
    yes, no = (lower.isin(words).to_numpy(dtype=np.bool_) for words in (YES, NO))
    values = np.where(yes, 1.0, np.where(no, 0.0, np.nan))
    return Column(text, values, ~(yes | no) & text.ne("").to_numpy(dtype=np.bool_))


def _first_lines(table: RawTable, names: Sequence[str]) -> tuple[int | None, int | None]:
    """Lines of the first cell with a decimal comma and of the first with a decimal point."""
    import pandas

    lines: list[int | None] = []
    for pattern in (r"[+-]?[0-9]*,[0-9]+", r"[+-]?[0-9]*\.[0-9]+"):
        found = np.zeros(len(table.frame), dtype=np.bool_)
        for name in names:
            cells = table.frame[name]
            if pandas.api.types.is_numeric_dtype(cells.dtype):
                continue
            fits = as_text(cells).str.replace("−", "-", regex=False).str.fullmatch(pattern)
            found |= fits.to_numpy(dtype=np.bool_) & ~table.typed.get(name, np.False_)
        lines.append(int(table.lines[int(np.argmax(found))]) if found.any() else None)
    return lines[0], lines[1]
