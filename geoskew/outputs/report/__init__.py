"""The planner's report: a few pages of text, tables and figures, as HTML and as PDF."""

from __future__ import annotations

from geoskew.outputs.report.content import (
    Base,
    Block,
    Bullets,
    Field,
    Figures,
    Grid,
    Heading,
    Isoline,
    LoadFigure,
    MapFigure,
    Marks,
    Report,
    Words,
)
from geoskew.outputs.report.write import require_known_ending, write_report

__all__ = [
    "Base",
    "Block",
    "Bullets",
    "Field",
    "Figures",
    "Grid",
    "Heading",
    "Isoline",
    "LoadFigure",
    "MapFigure",
    "Marks",
    "Report",
    "Words",
    "require_known_ending",
    "write_report",
]
