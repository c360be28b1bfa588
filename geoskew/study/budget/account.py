"""The lines of one carrier's budget, and their running sum."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Any, Literal

import numpy as np

Role = Literal["term", "part", "sum"]


def number(value: Any) -> float:
    """The only value of an array of one place, or of a number that holds everywhere."""
    return float(np.asarray(value, dtype=np.float64).reshape(-1)[0])


def finite(value: Any) -> float | None:
    """The same; None where there is no value, or none that is finite."""
    plain = number(value)
    return plain if np.isfinite(plain) else None


@dataclass(frozen=True)
class Line:
    """One line.

    ``term``: counts, with ``signed_db`` in the sum. ``part``: explains the term that stands above it.
    ``sum``: what an engineer looks for on the way, such as C/N.
    """

    key: str
    name: str
    value: float | None
    unit: str
    source: str
    role: Role
    signed_db: float | None = None

    def as_data(self) -> dict[str, Any]:
        """The line as JSON carries it, values unrounded."""
        return {
            "key": self.key,
            "name": self.name,
            "value": self.value,
            "unit": self.unit,
            "source": self.source,
            "role": self.role,
            "signed_db": self.signed_db,
        }


@dataclass
class Account:
    """Lines in the order of reading; ``total`` is the sum of the signed ones so far, dB."""

    lines: list[Line] = field(default_factory=list)
    total: float = 0.0

    def gain(self, key: str, name: str, value: Any, *, unit: str, source: str) -> None:
        """Add a term that counts as it is."""
        self._term(Line(key, name, finite(value), unit, source, "term", finite(value)), number(value))

    def loss(self, key: str, name: str, value: Any, *, unit: str, source: str) -> None:
        """Add a term that is taken off."""
        self._term(
            Line(key, name, finite(value), unit, source, "term", finite(0.0 - number(value))), -number(value)
        )

    def part(self, key: str, name: str, value: Any, *, unit: str, source: str) -> None:
        """Add a line that explains the term above it."""
        self.lines.append(Line(key, name, finite(value), unit, source, "part"))

    def sum(self, key: str, name: str, value: Any = None, *, unit: str, source: str) -> None:
        """Add an intermediate result: the sum so far unless a value is given."""
        result = self.total if value is None else value
        self.lines.append(Line(key, name, finite(result), unit, source, "sum"))

    def _term(self, line: Line, signed: float) -> None:
        self.lines.append(line)
        self.total += signed
