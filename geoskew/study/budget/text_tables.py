"""Aligned columns: two satellites side by side, and the lines of a budget for several policies."""

from __future__ import annotations

from collections.abc import Sequence
from textwrap import wrap
from typing import Any, Final

Row = tuple[str, Sequence[str]]

_NAME: Final = 27
_VALUE: Final = 10
_UNIT: Final = 6
# Digits after the point by unit; other units as short as they are.
_DIGITS: Final = {
    "dB": 2,
    "dBW": 2,
    "dBi": 2,
    "dBK": 2,
    "dB/K": 2,
    "dBHz": 2,
    "K": 1,
    "deg": 2,
    "km": 2,
    "mm/h": 1,
}


def facts_table(title: str, headings: Sequence[str], rows: Sequence[Row]) -> list[str]:
    """A title with headings, and a line a fact."""
    width = max(16, *(len(heading) + 2 for heading in headings))
    lines = [f"{title:<38}" + "".join(f"{heading:>{width}}" for heading in headings)]
    return lines + [
        f"  {name:<36}" + "".join(f"{value:>{width}}" for value in values) for name, values in rows
    ]


def policies_table(
    policies: Sequence[str], columns: Sequence[Sequence[dict[str, Any]]], width: int
) -> list[str]:
    """The same lines for several policies: name, a value each, unit, source."""
    room = width - _NAME - _VALUE * len(policies) - _UNIT - 1
    heading = "".join(f"{policy:>{_VALUE}}" for policy in policies)
    lines = [f"{'':<{_NAME}}{heading} {'':<{_UNIT}}source"]
    for row in zip(*columns, strict=True):
        if row[0]["key"] == "margin":
            lines.append("-" * width)
        values = "".join(f"{_value(line):>{_VALUE}}" for line in row)
        first, *more = wrap(_source(row, room), room, break_long_words=False, break_on_hyphens=False) or [""]
        lines.append(f"{_name(row[0]):<{_NAME}}{values} {row[0]['unit']:<{_UNIT}}{first}".rstrip())
        lines += [" " * (width - room) + text for text in more]
    return lines


def _name(line: dict[str, Any]) -> str:
    mark = {"term": "", "part": "  ", "sum": "= "}[line["role"]]
    return mark + str(line["name"])


def _value(line: dict[str, Any]) -> str:
    value = line["signed_db"] if line["role"] == "term" else line["value"]
    if value is None:
        return "–"
    digits = _DIGITS.get(line["unit"])
    # Rounded first, so that no "-0.00" is shown.
    return f"{value:g}" if digits is None else f"{round(value, digits) + 0.0:.{digits}f}"


def _source(row: Sequence[dict[str, Any]], room: int) -> str:
    """One source where all policies have the same, several joined where they fit, else that they differ."""
    sources = list(dict.fromkeys(line["source"] for line in row))
    text = " / ".join(source.replace("scenario: ", "").replace("ITU-R ", "") for source in sources)
    return text if len(sources) == 1 or len(text) <= room else "differs by policy"
