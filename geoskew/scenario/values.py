"""Kinds of values that a scenario holds: each check says the value, the rule and the remedy."""

from __future__ import annotations

import difflib
import math
import os
from collections.abc import Callable, Iterable
from datetime import UTC, date, datetime
from pathlib import Path
from typing import Any, TypeAlias

from pydantic import BeforeValidator, ValidationInfo
from pydantic_core import PydanticCustomError

Guess: TypeAlias = Callable[[float], "str | None"]

_YEARS = range(1970, 2201)
_LONGEST_SHOWN = 60


def refuse(message: str) -> PydanticCustomError:
    """Return the error of one value, with a message that stands as it is."""
    return PydanticCustomError("geoskew", "{message}", {"message": message})


def shown(value: object) -> str:
    """Return a value the way the scenario file writes it, cut where it is long."""
    if isinstance(value, bool):
        return "true" if value else "false"
    if isinstance(value, str):
        text = '"' + value.encode("unicode_escape").decode().replace('"', '\\"') + '"'
        text = text if value.isascii() else f'"{value}"'
    elif isinstance(value, dict):
        return "a table"
    elif isinstance(value, list):
        text = "[" + ", ".join(shown(item) for item in value[:8]) + (", …]" if len(value) > 8 else "]")
    else:
        text = _plain_number(value)
    return text if len(text) <= _LONGEST_SHOWN else text[: _LONGEST_SHOWN - 1] + "…"


def nearest(word: str, known: Iterable[str], *, cutoff: float = 0.6) -> str | None:
    """Return the known word that looks most like ``word``, or None."""
    by_lower = {name.lower(): name for name in known}
    found = difflib.get_close_matches(word.lower(), by_lower, n=1, cutoff=cutoff)
    return by_lower[found[0]] if found else None


def number(
    what: str, *, low: float, high: float, above: bool = False, guess: Guess | None = None
) -> BeforeValidator:
    """A finite number from ``low`` (not included with ``above``) to ``high``; ``guess`` explains misfits."""
    rule = f"{'more than' if above else 'from'} {low:g} {'and at most' if above else 'to'} {high:g}"

    def check(value: object) -> float:
        if isinstance(value, bool) or not isinstance(value, int | float):
            raise refuse(f"{shown(value)} is not a number: give {what}, {rule}{_unquoted(value)}")
        if abs(value) > 1e300 or not math.isfinite(value):
            raise refuse(f"{shown(value)} is not a usable number: give {what}, {rule}")
        if low < value <= high or (value == low and not above):
            return float(value)
        hint = guess(value) if guess else None
        raise refuse(f"{shown(value)} is out of range: give {what}, {rule}" + (f"; {hint}" if hint else ""))

    return BeforeValidator(check)


def whole(what: str, *, low: int, high: int) -> BeforeValidator:
    """A whole number from ``low`` to ``high``."""
    rule = f"{low} or {high}" if high == low + 1 else f"from {low} to {high}"

    def check(value: object) -> int:
        is_whole = isinstance(value, int) or (isinstance(value, float) and value.is_integer())
        if isinstance(value, bool) or not is_whole:
            raise refuse(f"{shown(value)} is not a whole number: give {what}, {rule}{_unquoted(value)}")
        assert isinstance(value, int | float)
        if not low <= value <= high:
            raise refuse(f"{shown(value)} is out of range: give {what}, {rule}")
        return int(value)

    return BeforeValidator(check)


def text(what: str, *, without: str = "") -> BeforeValidator:
    """One line of text that is not empty and holds none of the characters ``without``."""

    def check(value: object) -> str:
        line = _one_line(value, what)
        for sign in without:
            if sign in line:
                raise refuse(
                    f'{shown(line)} holds "{sign}", which parts entries in a site list: leave it out'
                )
        return line

    return BeforeValidator(check)


def choice(what: str, *allowed: str, refused: dict[str, str] | None = None) -> BeforeValidator:
    """One of the words ``allowed``; ``refused`` explains words that may be expected but do not serve."""
    listed = ", ".join(f'"{word}"' for word in allowed)

    def check(value: object) -> str:
        if isinstance(value, str) and value in allowed:
            return value
        if isinstance(value, str) and refused and value in refused:
            raise refuse(f"{shown(value)}: {refused[value]}")
        near = nearest(value, allowed) if isinstance(value, str) else None
        hint = f'; did you mean "{near}"?' if near and len(allowed) > 1 else ""
        raise refuse(
            f"{shown(value)} is not a known {what}: give {'one of ' * (len(allowed) > 1)}{listed}{hint}"
        )

    return BeforeValidator(check)


def yes_no(what: str) -> BeforeValidator:
    """``true`` or ``false``."""

    def check(value: object) -> bool:
        if not isinstance(value, bool):
            raise refuse(f"{shown(value)} is neither true nor false: say whether {what}, without quotes")
        return value

    return BeforeValidator(check)


def existing(what: str, *, folder_too: bool = False, optional_when: str | None = None) -> BeforeValidator:
    """A path to a file that exists, relative to the scenario file; made absolute.

    With the validation context's entry ``optional_when`` set, the file may be missing.
    """

    def check(value: object, info: ValidationInfo) -> Path:
        context: dict[str, Any] = info.context or {}
        given = _one_line(value, f"the path of {what}")
        path = _absolute(given, context.get("folder", Path()))
        if optional_when is not None and context.get(optional_when):
            return path
        try:
            _check_readable(path, given, what, folder_too=folder_too)
        except OSError as error:
            raise refuse(
                f"{shown(given)} cannot be reached ({what}): {error.strerror}; mend the path"
            ) from error
        return path

    return BeforeValidator(check)


def moment(value: object) -> datetime:
    """A date and time with its offset from UTC; returned in UTC."""
    example = "write for example 2027-05-18T03:00:00Z, without quotes"
    if isinstance(value, str):
        raise refuse(f"{shown(value)} is text, not a date and time: {example}")
    if isinstance(value, date) and not isinstance(value, datetime):
        raise refuse(
            f"{value.isoformat()} has no time of day: {value.isoformat()}T03:00:00Z is 03:00 UTC on it"
        )
    if not isinstance(value, datetime):
        raise refuse(f"{shown(value)} is not a date and time: {example}")
    if value.year not in _YEARS:
        raise refuse(f"{value.isoformat()} is out of range: give a year from {_YEARS[0]} to {_YEARS[-1]}")
    if value.tzinfo is None:
        written = value.isoformat()
        raise refuse(
            f"{written} does not say which clock: add Z for UTC ({written}Z) or the offset ({written}-03:00)"
        )
    return value.astimezone(UTC)


def day(value: object) -> date:
    """A calendar day."""
    if isinstance(value, datetime) or not isinstance(value, date):
        raise refuse(f"{shown(value)} is not a day: write for example 2027-05-03, without quotes and time")
    if value.year not in _YEARS:
        raise refuse(f"{value.isoformat()} is out of range: give a year from {_YEARS[0]} to {_YEARS[-1]}")
    return value


def _plain_number(value: object) -> str:
    """Return a number or date as text; integers of thousands of digits are only named."""
    if isinstance(value, int) and value.bit_length() > 256:
        return "an integer of more than 77 digits"
    if isinstance(value, float):
        return f"{value:g}" if float(f"{value:g}") == value else repr(value)
    return str(value)


def _unquoted(value: object) -> str:
    """Return a remedy for a number that was written as text, or nothing."""
    if not isinstance(value, str):
        return ""
    plain = value.strip().replace(",", ".")
    try:
        float(plain)
    except ValueError:
        return ""
    return f"; write {plain} without quotes" + (" and with a decimal point" if "," in value else "")


def _one_line(value: object, what: str) -> str:
    """Return a text that is not empty and stands on one line."""
    if not isinstance(value, str):
        raise refuse(f"{shown(value)} is not text: give {what} in quotes")
    if not value.strip():
        raise refuse(f"{shown(value)} is empty: give {what}, or leave the key out")
    if any(ord(sign) < 32 or ord(sign) == 127 for sign in value):
        raise refuse(f"{shown(value)} holds a control character: give {what} on one line")
    return value


def _check_readable(path: Path, given: str, what: str, *, folder_too: bool) -> None:
    """Refuse a path that does not exist, is of the wrong kind or may not be read."""
    if path.is_dir():
        if not folder_too:
            raise refuse(f"{shown(given)} is a folder: give {what}, a file")
        if not any(path.iterdir()):
            raise refuse(f"{shown(given)} is an empty folder: give {what}")
    elif not path.exists():
        raise refuse(f"{shown(given)} does not exist ({what}): {_where(path)}")
    if not (path.is_file() or path.is_dir()) or not os.access(path, os.R_OK):
        raise refuse(f"{shown(given)} cannot be read ({what}): check its permissions")


def _absolute(given: str, folder: Path) -> Path:
    """Return a given path as absolute, ``~`` expanded, relative ones against ``folder``."""
    try:
        path = Path(given).expanduser()
    except RuntimeError as error:
        raise refuse(
            f"{shown(given)}: the home folder in it is not known here; write the path in full"
        ) from error
    return Path(os.path.normpath(folder / path))


def _where(path: Path) -> str:
    """Say what was looked for, and which file nearby has a similar name."""
    if not path.parent.is_dir():
        return f"there is no folder {path.parent}"
    near = nearest(path.name, (entry.name for entry in path.parent.iterdir()), cutoff=0.8)
    return f"looked in {path.parent}" + (f'; did you mean "{near}"?' if near else "; mend the path")
