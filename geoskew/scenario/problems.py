"""From faults to problems: each with the file, its line, the key and a message that says what to do."""

from __future__ import annotations

from collections.abc import Iterable
from pathlib import Path
from types import UnionType
from typing import Any, Union, get_args, get_origin

from pydantic import BaseModel
from pydantic_core import ErrorDetails

from geoskew.errors import Problem
from geoskew.scenario.document import KNOWN, Prepared
from geoskew.scenario.lines import LineIndex, Loc
from geoskew.scenario.model import Scenario
from geoskew.scenario.values import shown


def collect(
    faults: Iterable[tuple[Loc, str]],
    details: Iterable[ErrorDetails],
    prepared: Prepared,
    *,
    path: Path,
    lines: LineIndex,
) -> list[Problem]:
    """Return all problems in the order of the file, each once.

    Parameters
    ----------
    faults : iterable of (place, message)
        Broken rules; places are those of the file or of merged carriers.
    details : iterable of pydantic's error details
        What the model found.
    """
    found = [(prepared.place(loc) if loc else loc, message) for loc, message in faults]
    for detail in details:
        place = prepared.place(detail["loc"])
        if detail["type"] == "missing" and (len(place) == 1 and place in KNOWN):
            place, message = (
                place,
                f"the table is missing: add {_header(place[0])} with {_description(detail['loc'])}",
            )
        else:
            message = _message(detail)
        found.append((place, message))
    problems = {
        Problem(message, path, lines.line(place), written(place) or None): None for place, message in found
    }
    return sorted(problems, key=lambda problem: problem.line or 0)


def written(place: Loc) -> str:
    """Return a key as a person would say it; tables of an array are counted from 1."""
    name = ""
    for part in place:
        name += f"[{part + 1}]" if isinstance(part, int) else f".{part}" if name else part
    return name


def _message(detail: ErrorDetails) -> str:
    """Put one of pydantic's findings into words; those of our own checks stand as they are."""
    kind = detail["type"]
    if kind == "missing":
        description = _description(detail["loc"])
        return "is missing" + (f": give {description}" if description else "; it is required")
    if kind in ("model_type", "model_attributes_type", "dict_type"):
        return f"{shown(detail['input'])} is not a table: give its keys, in a table or in {{ ... }}"
    if kind in ("tuple_type", "list_type"):
        return f"{shown(detail['input'])} is not a list of tables: write [[...]] above each"
    return detail["msg"]


def _header(name: str | int) -> str:
    """Return how a table's header is written."""
    return f"[[{name}]]" if name in ("neighbour", "crew") else f"[{name}]"


def _description(loc: Loc) -> str:
    """Return what the model says of a field, by its place."""
    model: Any = Scenario
    description = ""
    for part in loc:
        if isinstance(part, int) or model is None:
            continue
        field = model.model_fields.get(part)
        if field is None:
            return ""
        description = field.description or ""
        model = _model_within(field.annotation)
    return description


def _model_within(annotation: Any) -> type[BaseModel] | None:
    """Return the table model in an annotation such as ``Beam``, ``LonLat | None`` or ``tuple[Crew, ...]``."""
    if get_origin(annotation) in (tuple, Union, UnionType):
        return next((found for part in get_args(annotation) if (found := _model_within(part))), None)
    return annotation if isinstance(annotation, type) and issubclass(annotation, BaseModel) else None
