"""On which line of a TOML file a key stands: a small index, since the parser does not keep the place."""

from __future__ import annotations

import re
from typing import Final, TypeAlias

Loc: TypeAlias = tuple["str | int", ...]

_PART: Final = r"""(?:[A-Za-z0-9_-]+|"(?:[^"\\]|\\.)*"|'[^']*')"""
_KEY: Final = rf"{_PART}(?:[ \t]*\.[ \t]*{_PART})*"
_HEADER: Final = re.compile(rf"[ \t]*(\[\[?)[ \t]*({_KEY})[ \t]*\]")
_ASSIGNMENT: Final = re.compile(rf"[ \t]*({_KEY})[ \t]*=")


class LineIndex:
    r"""Lines of headers and keys of a TOML text; keys within inline tables count as their parent's line.

    Examples
    --------
    >>> LineIndex("[a]\nb = { c = 1 }").line(("a", "b", "c"))
    2
    """

    def __init__(self, text: str = "") -> None:
        self._lines: dict[Loc, int] = {}
        self._counts: dict[Loc, int] = {}
        table: Loc = ()
        state = _Open()
        for number, line in enumerate(text.splitlines(), start=1):
            if not state.inside:
                if header := _HEADER.match(line):
                    table = self._enter(_split(header[2]), several=header[1] == "[[")
                    self._note(table, number)
                    continue
                if assignment := _ASSIGNMENT.match(line):
                    self._note(table + _split(assignment[1]), number)
                    line = line[assignment.end() :]
            state.read(line)

    def line(self, loc: Loc) -> int | None:
        """Return the line of a key, else that of the nearest table around it, else None."""
        for end in range(len(loc), 0, -1):
            if loc[:end] in self._lines:
                return self._lines[loc[:end]]
        return None

    def _note(self, place: Loc, number: int) -> None:
        """Keep the line of a place, and of tables around it that have no header of their own."""
        self._lines[place] = number
        for end in range(1, len(place)):
            self._lines.setdefault(place[:end], number)

    def _enter(self, names: Loc, *, several: bool) -> Loc:
        """Return the place of a header's table, with the index within each array of tables on the way."""
        place: Loc = ()
        for name in names[:-1]:
            place = (*place, name)
            if place in self._counts:
                place = (*place, self._counts[place] - 1)
        place = (*place, names[-1])
        if several:
            self._counts[place] = self._counts.get(place, 0) + 1
            place = (*place, self._counts[place] - 1)
        return place


class _Open:
    """What is still open at the end of a line: brackets, or a text over several lines."""

    def __init__(self) -> None:
        self._depth = 0
        self._quotes = ""

    @property
    def inside(self) -> bool:
        """Whether the next line still belongs to the value before it."""
        return self._depth > 0 or bool(self._quotes)

    def read(self, line: str) -> None:
        """Follow one line."""
        position = 0
        while position < len(line):
            if self._quotes:
                position = self._leave_text(line, position)
                continue
            sign = line[position]
            if sign == "#":
                return
            if sign in "\"'":
                triple = line[position : position + 3] == sign * 3
                self._quotes = sign * 3 if triple else sign
                position += len(self._quotes)
                continue
            self._depth += (sign in "[{") - (sign in "]}")
            position += 1
        if len(self._quotes) == 1:
            self._quotes = ""

    def _leave_text(self, line: str, position: int) -> int:
        """Return the place behind the end of the open text, or the end of the line."""
        while position < len(line):
            if line[position] == "\\" and self._quotes[0] == '"':
                position += 2
            elif line.startswith(self._quotes, position):
                position += len(self._quotes)
                self._quotes = ""
                return position
            else:
                position += 1
        return position


def _split(key: str) -> Loc:
    """Return the parts of a dotted key without their quotes."""
    return tuple(part.strip("\"'") for part in re.findall(_PART, key))
