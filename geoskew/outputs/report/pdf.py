"""The report as PDF for A4 paper, with text that can be searched."""

from __future__ import annotations

import struct
import warnings
from collections.abc import Sequence
from io import BytesIO
from pathlib import Path
from typing import Any, Final

from fpdf import FPDF
from fpdf.enums import MethodReturnValue, TableBordersLayout
from fpdf.fonts import FontFace

from geoskew.outputs.report.content import Bullets, Figures, Grid, Heading, Report, Words
from geoskew.outputs.report.figures import FULL, Drawn
from geoskew.outputs.report.glyphs import drawable, font_files, undrawable

_LEFT: Final = 15.0
_TOP: Final = 14.0
_BOTTOM: Final = 15.0
_GAP: Final = 4.0
_SIZE, _SMALL, _TABLE, _CAPTION = 9.0, 7.6, 7.8, 7.6
_LEADING: Final = 0.48
_MOST_REPORTED: Final = 20


class Page(FPDF):
    """An A4 document with a foot on every page."""

    def __init__(self, report: Report) -> None:
        super().__init__(format="A4")
        self._foot = drawable(report.foot)
        self.lost: list[str] = []
        regular, bold = font_files()
        self.add_font("body", "", regular)
        self.add_font("body", "B", bold)
        self.set_margins(_LEFT, _TOP, _LEFT)
        self.c_margin = 0.0  # text begins where rules and figures do
        self.set_auto_page_break(True, margin=_BOTTOM)
        self.set_title(drawable(report.title))
        self.set_creation_date(report.dated)  # the same input gives the same file
        self.set_creator("geoskew")
        self.set_lang("en")

    def footer(self) -> None:
        """Print edition and page number."""
        self.set_y(-10.0)
        self.set_font("body", "", 6.5)
        self.cell(FULL - 15.0, 3.5, self._foot)
        self.cell(15.0, 3.5, f"page {self.page_no()}", align="R")

    def say(
        self, text: str, size: float, *, bold: bool = False, indent: float = 0.0, width: float = 0.0
    ) -> None:
        """Print a paragraph that wraps."""
        self.lost += undrawable(text)
        self.set_font("body", "B" if bold else "", size)
        self.set_x(_LEFT + indent)
        self.multi_cell(
            width or FULL - indent, size * _LEADING, drawable(text), align="L", new_x="LMARGIN", new_y="NEXT"
        )

    def labelled(self, label: str, text: str, size: float, left: float, width: float) -> None:
        """Print a caption whose number is bold."""
        self.lost += undrawable(text)
        margins = self.l_margin, self.r_margin
        self.set_left_margin(left)
        self.set_right_margin(self.w - left - width)
        self.set_x(left)
        self.set_font("body", "B", size)
        self.write(size * _LEADING, f"{label} ")
        self.set_font("body", "", size)
        self.write(size * _LEADING, drawable(text))
        self.ln(size * _LEADING)
        self.set_left_margin(margins[0])
        self.set_right_margin(margins[1])

    def lines(self, text: str, size: float, width: float) -> int:
        """How many lines a text takes."""
        self.set_font("body", "", size)
        found: Any = self.multi_cell(width, text=drawable(text), dry_run=True, output=MethodReturnValue.LINES)
        return len(found)

    def need(self, height: float) -> None:
        """Begin a page where less than a height is left."""
        if self.get_y() + height > self.h - _BOTTOM:
            self.add_page()


def draw(path: Path, report: Report, rows: Sequence[Sequence[Drawn]]) -> list[str]:
    """Write the file; returns a remark on characters that the font lacks."""
    page = Page(report)
    with warnings.catch_warnings():
        warnings.simplefilter("error", UserWarning)
        page.add_page()
        page.say(report.title, 15.0, bold=True)
        page.ln(1.0)
        page.say(report.subtitle, _SIZE)
        _blocks(page, report, rows)
        page.output(str(path))
    lost = list(dict.fromkeys(page.lost))
    if not lost:
        return []
    more = f" and {len(lost) - _MOST_REPORTED} more" if len(lost) > _MOST_REPORTED else ""
    listed = ", ".join(lost[:_MOST_REPORTED])
    return [f"PDF report: the font lacks {listed}{more}; a box stands in the place of each"]


def _blocks(page: Page, report: Report, rows: Sequence[Sequence[Drawn]]) -> None:
    waiting = iter(rows)
    tables = 0
    figures = 0
    for number, block in enumerate(report.blocks):
        match block:
            case Heading():
                # A title does not stay behind alone when its figures go to the next page.
                follows = number + 1 < len(report.blocks) and isinstance(report.blocks[number + 1], Figures)
                _heading(page, block, _row_height(page, rows[figures]) if follows else 10.0)
            case Words():
                page.say(block.text, _SMALL if block.small else _SIZE)
                page.ln(1.0)
            case Bullets():
                _bullets(page, block)
            case Grid():
                tables += 1
                _table(page, block, tables)
            case Figures():
                figures += 1
                _figures(page, next(waiting))


def _heading(page: Page, block: Heading, below: float) -> None:
    if block.new_page and page.get_y() > _TOP + 1.0:
        page.add_page()
    page.need(12.0 + below)
    page.ln(2.5 if page.get_y() > _TOP + 1.0 else 0.0)
    page.say(block.text, 11.0, bold=True)
    page.set_line_width(0.4)
    page.line(_LEFT, page.get_y() + 0.4, _LEFT + FULL, page.get_y() + 0.4)
    page.ln(1.8)


def _bullets(page: Page, block: Bullets) -> None:
    size = _SMALL if block.small else _SIZE
    for item in block.items:
        page.need(size * _LEADING * 2.0)
        top = page.get_y()
        page.say("•", size, indent=1.0)
        page.set_y(top)
        page.say(item, size, indent=4.5)
        page.ln(0.5)
    page.ln(0.8)


def _table(page: Page, grid: Grid, number: int) -> None:
    page.need(18.0)
    page.ln(0.8)
    page.labelled(f"Table {number}.", grid.caption, _CAPTION, _LEFT, FULL)
    page.ln(0.6)
    page.lost += undrawable("".join(cell for row in grid.rows for cell in row))
    page.set_font("body", "", _TABLE)
    page.set_line_width(0.15)
    aligns = tuple("RIGHT" if side == "r" else "LEFT" for side in grid.align)
    with page.table(
        borders_layout=TableBordersLayout.HORIZONTAL_LINES,
        col_widths=grid.widths,
        width=FULL,
        align="LEFT",
        text_align=aligns,
        line_height=_TABLE * 0.46,
        padding=(0.4, 1.0, 0.4, 0.6),
        headings_style=FontFace(emphasis="BOLD"),
    ) as table:
        table.row([drawable(cell) for cell in grid.headings])
        for row in grid.rows:
            table.row([drawable(cell) for cell in row])
    page.ln(1.6)


def _figures(page: Page, row: Sequence[Drawn]) -> None:
    """Figures beside each other with their captions below, all on one page."""
    page.need(_row_height(page, row))
    top = page.get_y() + 1.0
    bottom = top
    for number, one in enumerate(row):
        height = one.width_mm * _tall_over_wide(one.png)
        left = _LEFT + number * (one.width_mm + _GAP)
        page.image(BytesIO(one.png), x=left, y=top, w=one.width_mm, h=height, alt_text=drawable(one.alt))
        page.set_y(top + height + 1.0)
        page.labelled(f"Figure {one.number}.", one.caption, _CAPTION, left, one.width_mm)
        bottom = max(bottom, page.get_y())
    page.set_y(bottom + 1.5)


def _row_height(page: Page, row: Sequence[Drawn]) -> float:
    heights = [one.width_mm * _tall_over_wide(one.png) for one in row]
    captions = [page.lines(f"Figure {one.number}. {one.caption}", _CAPTION, one.width_mm) for one in row]
    return max(heights) + (max(captions) + 1) * _CAPTION * _LEADING + 2.0


def _tall_over_wide(png: bytes) -> float:
    """Height over width, out of the PNG's own header (ISO/IEC 15948, 11.2.2)."""
    width, height = struct.unpack(">II", png[16:24])
    return float(height / width)
