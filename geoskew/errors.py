"""Errors of the package: one tree, so that one handler turns any of them into one clear message.

GeoskewError            exit status 1: the work could not be finished
├── InputError          exit status 2: something the user gave is wrong (also a ValueError)
│   └── MissingPartError    the command needs a part that the scenario does not have
└── OutputError         exit status 1: a result could not be written (also an OSError)
    └── ExistingFileError   exit status 2: a file under a final name is not ours to replace
"""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass
from pathlib import Path


@dataclass(frozen=True, slots=True)
class Problem:
    """One thing that is wrong with an input: where it stands, and value, rule and remedy in words."""

    message: str
    file: Path | None = None
    line: int | None = None
    key: str | None = None

    def __str__(self) -> str:
        place = "" if self.file is None else str(self.file)
        if self.line is not None:
            place += f":{self.line}"
        parts = [part for part in (place, self.key, self.message) if part]
        return ": ".join(parts)


class GeoskewError(Exception):
    """Root of every error that the package raises on purpose."""

    exit_status = 1


class InputError(GeoskewError, ValueError):
    """Something that the user gave is wrong; carries every problem found, not only the first."""

    exit_status = 2

    def __init__(self, problems: str | Problem | Iterable[Problem]) -> None:
        if isinstance(problems, str):
            problems = Problem(problems)
        if isinstance(problems, Problem):
            problems = (problems,)
        self.problems: tuple[Problem, ...] = tuple(problems)
        super().__init__("\n".join(str(problem) for problem in self.problems))


class MissingPartError(InputError):
    """The command needs a part that the scenario does not have."""


class OutputError(GeoskewError, OSError):
    """A result could not be written; nothing half-written stands under its final name."""


class ExistingFileError(OutputError):
    """A file under a final name is not ours to replace."""

    exit_status = 2
