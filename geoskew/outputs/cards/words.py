"""Lines of a card: plain words, numbers that can be read back, and text that the user gave.

A line is a tuple of parts, so that one text serves HTML (where each number carries its field and
its unrounded value) and PDF (where it is printed).
"""

from __future__ import annotations

import math
import re
from collections.abc import Callable, Mapping
from dataclasses import dataclass
from typing import Any, Final


@dataclass(frozen=True, slots=True)
class Number:
    """A number from the assessed table: its column, its value, and how it is printed."""

    field: str
    value: float
    text: str


@dataclass(frozen=True, slots=True)
class Given:
    """Text that came from a file of the user; nothing in it is ever taken as markup."""

    text: str


Part = str | Number | Given
Line = tuple[Part, ...]

CLOCKWISE: Final = "CLOCKWISE"
COUNTER_CLOCKWISE: Final = "COUNTER-CLOCKWISE"

# Settings closer than this, degrees, are not told apart on a feed: common practice, no source.
_TOLD_APART: Final = 5.0

_FRACTIONS: Final = (
    (0.0, ""),
    (0.1, "a tenth"),
    (0.2, "a fifth"),
    (0.25, "a quarter"),
    (1 / 3, "a third"),
    (0.4, "two fifths"),
    (0.5, "half"),
    (0.6, "three fifths"),
    (2 / 3, "two thirds"),
    (0.75, "three quarters"),
    (0.8, "four fifths"),
    (0.9, "nine tenths"),
    (1.0, ""),
)


_LOUD: Final = re.compile(r"\b(?!UTC\b|WGS\b)[A-Z]{2,}(?:[ -][A-Z]{2,})*\b")


def loud(words: str) -> list[tuple[str, bool]]:
    """Our own words cut into pieces, with whether a piece is written in capitals and to be set bold."""
    pieces: list[tuple[str, bool]] = []
    end = 0
    for match in _LOUD.finditer(words):
        pieces += [(words[end : match.start()], False), (match.group(), True)]
        end = match.end()
    pieces.append((words[end:], False))
    return [(piece, bold) for piece, bold in pieces if piece]


def plain(line: Line) -> str:
    """A line as plain text."""
    return "".join(part if isinstance(part, str) else part.text for part in line)


def minus(text: str) -> str:
    """The same figure with a true minus sign."""
    return text.replace("-", "\N{MINUS SIGN}")


def degrees(field: str, value: float, *, signed: bool = False, digits: int = 1) -> Number:
    """An angle in degrees."""
    return Number(field, value, minus(f"{_unsigned_zero(value, digits):{'+' if signed else ''}.{digits}f}°"))


def size(field: str, value: float, *, digits: int = 1) -> Number:
    """The size of an angle whose sign is said in words; the value keeps its sign."""
    return Number(field, value, f"{abs(value):.{digits}f}°")


def decibels(field: str, value: float) -> Number:
    """A margin or a ratio in dB, with its sign."""
    return Number(field, value, minus(f"{_unsigned_zero(value, 1):+.1f} dB"))


def _unsigned_zero(value: float, digits: int) -> float:
    return 0.0 if round(value, digits) == 0 else value


def fold(angle: float) -> float:
    """An angle between polarisations, degrees, brought into (−90, 90]; NaN stays NaN."""
    return 90.0 - (90.0 - angle) % 180.0


def comes_to_the_same(turn: float) -> bool:
    """Whether a turn is so near a quarter that the opposite one ends within `_TOLD_APART` of it."""
    return abs(turn) > 45.0 and abs(fold(2.0 * turn)) < _TOLD_APART


def sense_from_behind(turn: float) -> str:
    """Which way a turn goes for a person behind the dish who looks towards the satellite."""
    return CLOCKWISE if turn > 0 else COUNTER_CLOCKWISE


def sense_from_front(turn: float) -> str:
    """The same turn for a person in front of the dish who looks into it: mirrored."""
    return COUNTER_CLOCKWISE if turn > 0 else CLOCKWISE


def lean(setting: float, *, from_behind: bool) -> str:
    """To which side the top of the V axis leans: a setting grows clockwise seen from behind."""
    if abs(setting) < 0.05:
        return "upright"
    right = (setting > 0) == from_behind
    return "to the RIGHT of upright" if right else "to the LEFT of upright"


def marks_in_words(marks: float) -> str:
    """A number of scale marks as a crew says it.

    Examples
    --------
    >>> marks_in_words(2.48)
    '2 whole marks and about half a mark'
    >>> marks_in_words(0.26)
    'about a quarter of a mark'
    """
    marks = abs(marks)
    whole = math.floor(marks)
    nearest, word = min(_FRACTIONS, key=lambda entry: abs(entry[0] - (marks - whole)))
    if nearest == 1.0:
        whole += 1
    of_mark = "" if not word else f"about {word} {'a mark' if word == 'half' else 'of a mark'}"
    if whole == 0:
        return of_mark or "less than a tenth of a mark"
    text = f"{whole} whole mark{'s' if whole > 1 else ''}"
    return f"{text} and {of_mark}" if of_mark else text


class Row:
    """One site's row of the assessed table, read as numbers, as words or as yes and no."""

    def __init__(self, values: Mapping[str, Any], defaults: Mapping[str, Any]) -> None:
        self._values = values
        self._defaults = defaults

    def text(self, name: str) -> str:
        """The words of a column, empty where there are none."""
        value = self._read(name)
        return "" if value is None else str(value)

    def number(self, name: str) -> float:
        """The number of a column, NaN where there is none."""
        return as_number(self._read(name))

    def whole(self, name: str, otherwise: int) -> int:
        """The count of a column."""
        value = self.number(name)
        return otherwise if math.isnan(value) else round(value)

    def yes(self, name: str) -> bool:
        """Whether a yes/no column says yes."""
        value = self._read(name)
        return str(value).strip().lower() in ("1", "1.0", "true", "yes", "y")

    def has(self, name: str) -> bool:
        """Whether the column holds a number here."""
        return math.isfinite(self.number(name))

    def _read(self, name: str) -> Any:
        for source in (self._values, self._defaults):
            value = source.get(name)
            if value is not None and not _is_missing(value):
                return value
        return None


def as_number(value: Any) -> float:
    """A cell as a number; text may have a decimal comma; NaN where it is none."""
    if value is None:
        return math.nan
    try:
        return float(value)
    except (TypeError, ValueError):
        try:
            return float(str(value).strip().replace(",", "."))
        except ValueError:
            return math.nan


def _is_missing(value: Any) -> bool:
    if isinstance(value, str):
        return not value.strip()
    is_missing: Callable[[Any], bool] = lambda v: v != v  # noqa: E731  NaN and NaT differ from themselves
    try:
        return bool(is_missing(value))
    except TypeError:  # pandas.NA refuses to be a truth value
        return True
