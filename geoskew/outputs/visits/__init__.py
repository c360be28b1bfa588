"""The plan of visits as files: day sheets, workbook, driving lines, calendar."""

from __future__ import annotations

from geoskew.outputs.visits.sheet import VisitSheets
from geoskew.outputs.visits.write import ENDINGS, require_known_ending, write_visits

__all__ = ["ENDINGS", "VisitSheets", "require_known_ending", "write_visits"]
