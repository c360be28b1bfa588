"""Which column of a file is which: the scenario's mapping, our names, and names that come close."""

from __future__ import annotations

from collections import Counter
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING

from geoskew.errors import InputError, Problem
from geoskew.scenario.values import nearest
from geoskew.sites.meanings import RESERVED

if TYPE_CHECKING:
    from pandas import DataFrame

# How much alike two names must be (0 to 1) before a column is suspected to be misspelt.
ALIKE = 0.85


@dataclass(frozen=True)
class Headers:
    """Columns of a file by what they mean.

    Attributes
    ----------
    source : mapping of str to str
        From our name to the file's, for every column with a meaning.
    names : tuple of str
        The name under which each column is known from here on, in the file's order.
    warnings : list of str
        Columns that were renamed, or whose name is nearly ours.
    """

    source: Mapping[str, str]
    names: tuple[str, ...]
    warnings: list[str]


def unique_names(names: Sequence[str], frame: DataFrame) -> tuple[list[str | None], list[str]]:
    """Names of columns without spaces around them, all different; None for a column that is left out.

    A column without a name is left out where all its cells are empty. A repeated name gets a number;
    whether it may be repeated at all is for `match` to say, which looks for it.
    """
    result: list[str | None] = []
    warnings = []
    used = {name.strip() for name in names}
    seen: set[str] = set()
    for position, given in enumerate(names):
        name = given.strip()
        if not name:
            if not frame.iloc[:, position].str.strip().ne("").any():
                result.append(None)
                continue
            name = f"column_{position + 1}"
            warnings.append(f"column {position + 1} has no name; it is passed through as {name}")
        if name in seen:
            number = next(count for count in range(2, len(names) + 2) if f"{name}_{count}" not in used)
            warnings.append(
                f"column {name!r} stands twice; the later one is passed through as {name}_{number}"
            )
            name = f"{name}_{number}"
            used.add(name)
        seen.add(name)
        result.append(name)
    return result, warnings


def match(
    columns: Sequence[str],
    given: Mapping[str, str],
    *,
    required: Sequence[str],
    file: Path,
    scenario_path: Path,
    unused: Sequence[str] = (),
) -> Headers:
    """Find the columns with a meaning.

    Parameters
    ----------
    columns : sequence of str
        Names of the file's columns.
    given : mapping of str to str
        The scenario's ``[sites] columns``: our name to the file's.
    required : sequence of str
        Our names that must be found.
    file, scenario_path : Path
        For messages.
    unused : sequence of str
        Our names whose columns are not to be used.

    Raises
    ------
    InputError
        Every column that is missing, with the nearest one that is there.
    """
    problems = [
        Problem(
            f"{theirs!r} is no column of {file.name}{_hint(theirs, columns)}",
            file=scenario_path,
            key=f"sites.columns.{ours}",
        )
        for ours, theirs in given.items()
        if theirs not in columns
    ]
    taken = {theirs for theirs in given.values() if theirs in columns}
    source = {ours: theirs for ours, theirs in given.items() if theirs in columns}
    source |= {
        name: name
        for name in columns
        if name in RESERVED and name not in given and name not in taken and name not in unused
    }
    problems += [
        Problem(f"has no column {name!r}{_hint(name, columns, mapping=name)}", file=file, line=1)
        for name in required
        if name not in source and name not in given
    ]
    if problems:
        raise InputError(problems)
    ours_by_theirs = {theirs: ours for ours, theirs in source.items()}
    warnings: list[str] = []
    names = [ours_by_theirs.get(name) or _passed_through(name, columns, source, warnings) for name in columns]
    return Headers(source, tuple(names), warnings)


def refuse_repeated(names: Sequence[str], needed: Sequence[str], *, file: Path, line: int) -> None:
    """Refuse a header in which a column with a meaning stands twice.

    Raises
    ------
    InputError
        Names every such column.
    """
    count = Counter(name.strip() for name in names)
    problems = [
        Problem(
            f"column {name!r} stands {count[name]} times; which one is meant? Rename the others", file, line
        )
        for name in dict.fromkeys(needed)
        if count[name] > 1
    ]
    if problems:
        raise InputError(problems)


def _passed_through(name: str, columns: Sequence[str], source: Mapping[str, str], warnings: list[str]) -> str:
    if name in RESERVED:
        renamed = f"{name}_given"
        while renamed in columns:
            renamed += "_given"
        warnings.append(f"column {name!r} is not used as {name}; it is passed through as {renamed!r}")
        return renamed
    near = nearest(name, [known for known in RESERVED if known not in source], cutoff=ALIKE)
    if near is not None:
        warnings.append(f"column {name!r} is passed through without a meaning; is {near!r} meant?")
    return name


def _hint(name: str, columns: Sequence[str], *, mapping: str | None = None) -> str:
    near = nearest(name, columns, cutoff=0.5) or next(
        (column for column in columns if name.lower() in column.lower()), None
    )
    if near is None:
        return f"; it has {', '.join(columns[:12])}"
    if mapping is None:
        return f"; did you mean {near!r}?"
    return f'; is {near!r} meant? Then give [sites] columns = {{ {mapping} = "{near}" }}'
