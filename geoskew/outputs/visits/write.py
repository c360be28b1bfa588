"""Writing the plan of visits; the form follows the file's ending."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path
from typing import Final

from geoskew.errors import InputError
from geoskew.outputs.files import writing
from geoskew.outputs.visits.calendar import write_calendar
from geoskew.outputs.visits.lines import write_lines
from geoskew.outputs.visits.sheet import VisitSheets, everyone
from geoskew.outputs.visits.workbook import write_workbook


def _write_csv(part: Path, sheets: VisitSheets) -> None:
    everyone(sheets).to_csv(part, index=False, encoding="utf-8", lineterminator="\n")


ENDINGS: Final[dict[str, Callable[[Path, VisitSheets], None]]] = {
    ".csv": _write_csv,
    ".gpkg": write_lines,
    ".ics": write_calendar,
    ".xlsx": write_workbook,
}


def require_known_ending(path: Path) -> None:
    """Check before the work that the ending names a form.

    Raises
    ------
    InputError
        It does not.
    """
    if path.suffix.lower() not in ENDINGS:
        raise InputError(
            f"{path}: the ending {path.suffix or '(none)'} names no form of a plan of visits; "
            f"give one of {', '.join(ENDINGS)}"
        )


def write_visits(path: Path, sheets: VisitSheets) -> None:
    """Write the plan: day sheets (.csv, .xlsx), driving lines and stops (.gpkg), or a calendar (.ics).

    Raises
    ------
    InputError
        The ending names no form.
    OutputError
        The file could not be written; nothing half-written stays.
    """
    require_known_ending(path)
    with writing(path) as part:
        ENDINGS[path.suffix.lower()](part, sheets)
