"""Vector drawing on a PDF page: dials and square codes."""

from __future__ import annotations

from typing import Final

from fpdf import FPDF

from geoskew.outputs.cards import square
from geoskew.outputs.cards.dial import HALF_SIZE, Dial, Label, Mark, hands, ring

# Ink: line colour, line width in the dial's units, fill colour, dash in units (0: none).
_Colour = tuple[int, int, int]
_INKS: Final[dict[str, tuple[_Colour, float, _Colour, float]]] = {
    "ring": ((30, 30, 30), 1.5, (255, 255, 255), 0.0),
    "tick": ((60, 60, 60), 1.0, (60, 60, 60), 0.0),
    "plumb": ((150, 150, 150), 0.8, (150, 150, 150), 3.0),
    "present": ((30, 30, 30), 3.0, (30, 30, 30), 7.0),
    "target": ((0, 0, 0), 5.0, (0, 0, 0), 0.0),
    "turn": ((11, 79, 138), 3.5, (11, 79, 138), 0.0),
    "tolerance": ((27, 127, 59), 0.5, (27, 127, 59), 0.0),
    "wrong": ((179, 38, 30), 1.2, (251, 227, 224), 0.0),
    "stop": ((120, 120, 120), 0.5, (150, 150, 150), 0.0),
}
_BOLD: Final = ("target", "wrong")
_POINTS_A_MM: Final = 72.0 / 25.4


def draw_dial(page: FPDF, dial: Dial, *, x: float, y: float, side: float) -> None:
    """Draw a dial into a square; all in millimetres."""
    scale = side / (2 * HALF_SIZE)
    centre = (x + side / 2.0, y + side / 2.0)
    for mark in (*ring(dial), *hands(dial)):
        _draw(page, mark, centre, scale)
    page.set_dash_pattern()
    page.set_draw_color(0)
    page.set_text_color(0)
    page.set_line_width(0.2)


def _draw(page: FPDF, mark: Mark, centre: tuple[float, float], scale: float) -> None:
    line, width, fill, dash = _INKS[mark.ink]
    if isinstance(mark, Label):
        page.set_text_color(*((143, 29, 20) if mark.ink == "wrong" else (20, 20, 20)))
        height = mark.height * scale
        page.set_font("body", "B" if mark.ink in _BOLD else "", height * _POINTS_A_MM)
        half = page.get_string_width(mark.text) / 2.0
        page.text(centre[0] + mark.x * scale - half, centre[1] + mark.y * scale + height * 0.36, mark.text)
        return
    points = [(centre[0] + px * scale, centre[1] + py * scale) for px, py in mark.points]
    page.set_draw_color(*line)
    page.set_line_width(width * scale)
    page.set_dash_pattern(dash * scale, dash * scale * 0.75) if dash else page.set_dash_pattern()
    if mark.filled:
        page.set_fill_color(*fill)
        page.polygon(points, style="F")
    else:
        page.polyline(points)


def draw_code(page: FPDF, text: str, *, x: float, y: float, side: float) -> None:
    """Draw a text as a square code with its quiet zone; all in millimetres."""
    rows = square.modules(text)
    module = side / (len(rows) + 2 * square.QUIET_ZONE)
    page.set_fill_color(0)
    for column, row, length in square.runs(rows):
        page.rect(x + column * module, y + row * module, length * module, module, style="F")
