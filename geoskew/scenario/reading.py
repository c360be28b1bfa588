"""Reading a scenario file: every problem at once, each with its line."""

from __future__ import annotations

import re
import tomllib
from collections.abc import Mapping
from pathlib import Path
from typing import Any, Final

from pydantic import ValidationError

from geoskew.errors import InputError, Problem
from geoskew.scenario.checks import all_faults
from geoskew.scenario.document import Prepared, prepare
from geoskew.scenario.lines import LineIndex
from geoskew.scenario.model import Scenario
from geoskew.scenario.problems import collect

_MOMENTS: Final = ("carriers_before", "carriers_after")
_LARGEST_BYTES: Final = 10_000_000

# What often stands behind a line that is not TOML.
_HINTS: Final[tuple[tuple[re.Pattern[str], str], ...]] = (
    (re.compile(r"=\s*[-+]?\d+,\d+\s*(#.*)?$"), "numbers take a decimal point, not a comma"),
    (re.compile(r'=\s*"[^"]*\\'), "in a path write / instead of \\, or put it in single quotes"),
    (re.compile(r"=\s*[-+]?[\d.]+\s*[^\d\s.,:TZ#\]}-]"), "numbers stand without a unit"),
    (re.compile(r"=\s*\d{4}-\d{1,2}-\d{1,2}"), "dates are written like 2027-05-18T03:00:00Z"),
    (re.compile(r"=\s*[A-Za-z][^\"']*$"), "text needs quotes; yes and no are true and false"),
    (re.compile(r"=\s*(#.*)?$"), "a value is missing behind ="),
    (re.compile(r"^\s*\[[^\]]*$"), "a header ends with ]"),
    (re.compile(r"^\s*[^=\[#]+$"), "a line is a [header], key = value or a # comment"),
)


def load(path: str | Path, *, sites_may_be_missing: bool = False) -> Scenario:
    """Read and validate a scenario file.

    Parameters
    ----------
    path : str or Path
        A TOML file; paths in it are relative to its folder.
    sites_may_be_missing : bool
        Accept a site list's file that is not there, for work that looks at no site.

    Raises
    ------
    InputError
        Carries every problem found, with file, line, key, value, rule and remedy.
    """
    file = Path(path).expanduser().absolute()
    content = _text(file)
    try:
        document = tomllib.loads(content)
    except RecursionError as error:
        raise InputError(Problem("is nested too deeply to be a scenario", file=file)) from error
    except ValueError as error:
        raise InputError(_syntax_problem(error, content, file)) from error
    if not document:
        raise InputError(
            Problem(
                "is empty: a scenario needs at least two satellites, a carrier, and a region or sites", file
            )
        )
    return _scenario(document, file, LineIndex(content), sites_may_be_missing=sites_may_be_missing)


def from_dict(
    document: Mapping[str, Any], *, path: str | Path = "scenario.toml", sites_may_be_missing: bool = False
) -> Scenario:
    """Validate a scenario given as a mapping of the file's keys, as if it had stood in the file ``path``.

    Raises
    ------
    InputError
        Carries every problem found; lines are not known.
    """
    return _scenario(
        dict(document), Path(path).absolute(), LineIndex(), sites_may_be_missing=sites_may_be_missing
    )


def _scenario(
    document: dict[str, Any], path: Path, lines: LineIndex, *, sites_may_be_missing: bool
) -> Scenario:
    """Return the scenario of a parsed document, or raise with all its problems."""
    prepared = prepare(document)
    prepared.values.setdefault("title", path.stem)
    prepared.values["path"] = path
    carriers = {
        moment: value for moment in _MOMENTS if isinstance(value := prepared.values.get(moment), list)
    }
    faults = [*prepared.faults, *all_faults(document, carriers)]
    context = {"folder": path.parent, "sites_may_be_missing": sites_may_be_missing}
    try:
        scenario = Scenario.model_validate(prepared.values, context=context)
    except ValidationError as error:
        raise InputError(_all(faults, error, prepared, path, lines)) from None
    if faults:
        raise InputError(_all(faults, None, prepared, path, lines))
    return scenario


def _all(
    faults: list[Any], error: ValidationError | None, prepared: Prepared, path: Path, lines: LineIndex
) -> list[Problem]:
    """Return every problem of both kinds."""
    return collect(faults, error.errors() if error else (), prepared, path=path, lines=lines)


def _text(path: Path) -> str:
    """Return the text of a scenario file, a byte order mark left out."""
    try:
        if path.is_dir():
            raise InputError(Problem("is a folder: give the scenario file in it", file=path))
        if path.stat().st_size > _LARGEST_BYTES:
            raise InputError(Problem("is larger than 10 MB: give a scenario, a TOML text file", file=path))
        content = path.read_bytes()
    except FileNotFoundError as error:
        remedy = "mend the path, or write one to start from with: geoskew new FILE"
        raise InputError(Problem(f"there is no such scenario file: {remedy}", file=path)) from error
    except (OSError, ValueError) as error:
        reason = getattr(error, "strerror", None) or str(error)
        raise InputError(
            Problem(f"cannot be read: {reason}; check the path and its permissions", file=path)
        ) from error
    try:
        return content.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        line = content[: error.start].count(b"\n") + 1
        message = f"byte 0x{content[error.start]:02x} is not UTF-8: save the scenario as a text file in UTF-8"
        raise InputError(Problem(message, file=path, line=line)) from error


def _syntax_problem(error: ValueError, content: str, path: Path) -> Problem:
    """Return the problem of a file that is not TOML, with its place and a hint from the line's looks."""
    found = re.search(r"^(.*?) \(at line (\d+), column (\d+)\)$", str(error), re.DOTALL)
    lines = content.splitlines()
    if found:
        reason, line = found[1], int(found[2])
        place = f" in column {found[3]}"
    else:
        reason, line, place = str(error).removesuffix(" (at end of document)"), len(lines) or 1, ""
    written = lines[line - 1] if line <= len(lines) else ""
    hint = next((hint for pattern, hint in _HINTS if pattern.search(written)), "mend the line")
    return Problem(f"is not TOML{place}: {reason}; {hint}", file=path, line=line)
