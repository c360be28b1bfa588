"""Every figure of a report drawn once, for HTML and PDF alike."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final

from geoskew.outputs.report import load, maps
from geoskew.outputs.report.content import Figures, LoadFigure, MapFigure, Report

# Width of the text on A4, and of one of two figures beside each other, millimetres.
FULL: Final = 180.0
HALF: Final = 88.0


@dataclass(frozen=True)
class Drawn:
    """A finished figure: number, PNG, width in millimetres, caption, and text for those who cannot see it."""

    number: int
    png: bytes
    width_mm: float
    caption: str
    alt: str


def drawn_figures(report: Report) -> list[list[Drawn]]:
    """The figures of each row of figures, in the report's order, numbered from 1."""
    rows: list[list[Drawn]] = []
    number = 0
    for block in report.blocks:
        if not isinstance(block, Figures):
            continue
        row = []
        for item in block.items:
            number += 1
            row.append(_drawn(item, number, FULL if isinstance(item, LoadFigure) else HALF))
        rows.append(row)
    return rows


def _drawn(item: MapFigure | LoadFigure, number: int, width: float) -> Drawn:
    png = maps.draw(item, width) if isinstance(item, MapFigure) else load.draw(item, width)
    return Drawn(number, png, width, item.caption, item.alt)
