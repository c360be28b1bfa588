"""Cards as PDF for A4 paper, one page a site, with vector dials and text that can be searched."""

from __future__ import annotations

import re
import warnings as python_warnings
from collections.abc import Callable, Iterator, Sequence
from itertools import groupby
from operator import itemgetter
from pathlib import Path
from typing import Final

from fpdf import FPDF

from geoskew.outputs.cards.canvas import draw_code, draw_dial
from geoskew.outputs.cards.facts import CardFacts
from geoskew.outputs.cards.glyphs import Glyphs
from geoskew.outputs.cards.sheet import NoteGroup, Sheet
from geoskew.outputs.cards.site import Card
from geoskew.outputs.cards.words import Given, Line, Number, loud, plain

_LEFT: Final = 14.0
_TOP: Final = 11.0
_WIDTH: Final = 210.0 - 2 * _LEFT
_DIAL: Final = 62.0
_SMALLEST_DIAL: Final = 34.0
_FIGURE: Final = 36.0
# Longest text of one given cell on paper; the HTML cards show all of it.
_LONGEST: Final = 110


class Page(FPDF):
    """An A4 document with the cards' two fonts and one way to print a line."""

    def __init__(self, glyphs: Glyphs) -> None:
        super().__init__(format="A4")
        self.glyphs = glyphs
        self._widths: dict[tuple[str, bool, float], float] = {}
        self.set_margins(_LEFT, _TOP, _LEFT)
        self.set_auto_page_break(True, margin=9.0)
        self.add_font("body", "", glyphs.regular)
        self.add_font("body", "B", glyphs.bold)

    def say(
        self, words: Line, size: float, *, bold: bool = False, width: float = 0.0, indent: float = 0.0
    ) -> None:
        """Print a line that wraps; figures and words in capitals are bold, with ``bold`` all of it."""
        pieces: list[tuple[str, bool]] = []
        for part in words:
            pieces += loud(part) if isinstance(part, str) else [(_cut(part).text, isinstance(part, Number))]
        known = [(self.glyphs.known(piece), bold or strong) for piece, strong in pieces]
        left = _LEFT + indent
        for row in wrapped(known, width or self.w - self.r_margin - left, self._width(size)):
            self.set_x(left)
            for strong, run in groupby(row, key=itemgetter(1)):
                texts = [word for word, _ in run]
                self.set_font("body", "B" if strong else "", size)
                wide = sum(self._widths[word, strong, size] for word in texts)
                self.cell(wide, size * 0.43, "".join(texts))
            self.ln(size * 0.43)

    def _width(self, size: float) -> Callable[[str, bool], float]:
        def width(word: str, bold: bool) -> float:
            key = (word, bold, size)
            if key not in self._widths:  # the same words stand on every card
                self.set_font("body", "B" if bold else "", size)
                self._widths[key] = float(self.get_string_width(word))
            return self._widths[key]

        return width

    def heading(self, words: str) -> None:
        """Print a section's title."""
        self.ln(1.3)
        self.say((words.upper(),), 7.5, bold=True)


def wrapped(
    pieces: Sequence[tuple[str, bool]], room: float, width: Callable[[str, bool], float]
) -> Iterator[list[tuple[str, bool]]]:
    """Rows of (text, bold) no wider than the room; a break falls between words, whatever their font."""
    row: list[tuple[str, bool]] = []
    used = 0.0
    for word in _words(pieces, room, width):
        wide = sum(width(text, bold) for text, bold in word)
        if row and used + wide > room:
            yield row
            row, used = [], 0.0
        row += word
        used += wide
    if row:
        yield row


def _words(
    pieces: Sequence[tuple[str, bool]], room: float, width: Callable[[str, bool], float]
) -> Iterator[list[tuple[str, bool]]]:
    """Words with the space behind them; a word may change its font in the middle; overlong ones are cut."""
    word: list[tuple[str, bool]] = []
    for text, bold in pieces:
        for chunk in re.findall(r"[^ ]* |[^ ]+$", text):
            while len(chunk) > 8 and width(chunk, bold) > room:
                cut = max(8, int(len(chunk) * 0.9 * room / width(chunk, bold)))
                yield [*word, (chunk[:cut], bold)]
                word, chunk = [], chunk[cut:]
            word.append((chunk, bold))
            if chunk.endswith(" "):
                yield word
                word = []
    if word:
        yield word


def paper(words: Line) -> str:
    """A line as it stands on paper: given texts are cut where they would fill the page."""
    return plain(tuple(part if isinstance(part, str) else _cut(part) for part in words))


def _cut(part: Given | Number) -> Given | Number:
    if isinstance(part, Given) and len(part.text) > _LONGEST:
        return Given(part.text[: _LONGEST - 1] + "…")
    return part


def draw(path: Path, sheet: Sheet, facts: CardFacts) -> list[str]:
    """Write the file; returns warnings on glyphs that the font lacks and on texts that were cut."""
    glyphs = Glyphs()
    page = Page(glyphs)
    page.set_title(glyphs.known(paper((Given(f"Job cards: {facts.title}"),))))
    page.set_creation_date(facts.changeover)  # the same input gives the same file
    page.set_creator("geoskew")
    with python_warnings.catch_warnings():
        python_warnings.simplefilter("error", UserWarning)
        for card in sheet.cards:
            page.add_page()
            _card(page, card, facts)
        _others(page, sheet.others)
    page.output(str(path))
    return glyphs.report()


def _card(page: Page, card: Card, facts: CardFacts) -> None:
    top = page.get_y()
    if card.code:
        draw_code(page, card.code, x=210.0 - _LEFT - 27.0, y=top, side=27.0)
    beside = _WIDTH - 30.0
    page.say((Given(card.site), "  ", Given(card.name)), 13, bold=True, width=beside)
    page.say((card.action, *(("   ·   ", *card.visit) if card.visit else ())), 9.5, bold=True, width=beside)
    page.heading("Where")
    _facts(page, card.where, beside)
    page.set_y(max(page.get_y(), top + 27.0) if page.get_y() > top + 22.0 else page.get_y())
    page.heading("What is mounted")
    _facts(page, card.mounted, beside if page.get_y() < top + 27.0 else _WIDTH)
    page.heading("What to do")
    for number, step in enumerate(card.steps, start=1):
        y = page.get_y()
        page.say((f"{number}.",), 8.6, bold=True)
        page.set_y(y)
        page.say(step, 8.6, indent=6.0)
        page.ln(0.6)
    _dials(page, card)
    page.heading("Signal to expect")
    _signals(page, card, facts)
    for note in card.signal_notes:
        page.say(note, 7.8)
    page.heading("Write back")
    _write_back(page, card.write_back)
    page.heading("Care")
    for caution in card.cautions:
        page.say((f"• {caution}",), 7.6)
    page.ln(1.0)
    page.say((Given(facts.title), f" · margins judged {facts.judged} · ", Given(facts.edition)), 6.5)


def _facts(page: Page, rows: tuple[tuple[str, Line], ...], width: float) -> None:
    for label, words in rows:
        y = page.get_y()
        page.say((label,), 8.2)
        page.set_y(y)
        page.say(words, 8.2, indent=26.0, width=width - 26.0)


def _dials(page: Page, card: Card) -> None:
    """Both dials, as large as what follows on the page allows."""
    if not card.dials:
        return
    top = page.get_y() + 1.0
    below = 59.0 + 4.1 * len(card.signals) + 3.7 * (len(card.cautions) + 2 * len(card.signal_notes))
    side = min(_DIAL, max(_SMALLEST_DIAL, page.h - page.b_margin - top - below))
    half = _WIDTH / 2.0
    captions = (
        "BEHIND the dish, looking towards the satellite",
        "IN FRONT of the dish, looking into it (mirrored)",
    )
    for place, (dial, caption) in enumerate(zip(card.dials, captions, strict=True)):
        left = _LEFT + place * half
        draw_dial(page, dial, x=left + (half - side) / 2.0, y=top, side=side)
        page.set_font("body", "B", 7.8)
        page.set_xy(left, top + side)
        page.cell(half, 3.6, caption, align="C")
    page.set_y(top + side + 3.4)
    page.set_font("body", "", 7.2)
    page.cell(0, 3.4, "dashed: now  ·  solid: target  ·  hatched: the wrong way", align="C")
    page.ln(3.6)


def _signals(page: Page, card: Card, facts: CardFacts) -> None:
    if not card.signals:
        page.say(("The table holds no margins for this site.",), 8.2)
        return
    share = facts.availability_percent
    rain = "margin in rain" if share is None else f"margin in rain {share:g} %"
    columns = [
        ("margin, clear sky", [row.margin for row in card.signals]),
        ("meter, Es/N0", [row.meter for row in card.signals]),
        (rain, [row.rain for row in card.signals]),
    ]
    columns = [(head, cells) for head, cells in columns if any(cells)]
    widths = [_WIDTH - _FIGURE * len(columns), *[_FIGURE] * len(columns)]
    lines = [(["", *(head for head, _ in columns)], False)]
    for k, row in enumerate(card.signals):
        label = f"\N{BALLOT X} {row.label}" if row.bad else row.label
        lines.append(([label, *(plain(cells[k]) for _, cells in columns)], row.bad))
    for index, (cells, bad) in enumerate(lines):
        page.set_font("body", "B" if bad or index == 0 else "", 8.2)
        page.set_x(_LEFT)
        for width, cell in zip(widths, cells, strict=True):
            page.cell(width, 4.1, cell, border="B")
        page.ln(4.1)


def _write_back(page: Page, blanks: tuple[str, ...]) -> None:
    page.set_font("body", "", 7.4)
    half = _WIDTH / 2.0
    for index, words in enumerate(blanks):
        page.set_x(_LEFT + (index % 2) * half)
        page.cell(half - 4.0, 6.6, words, border="B", align="L")
        if index % 2:
            page.ln(6.6)


def _others(page: Page, groups: tuple[NoteGroup, ...]) -> None:
    """The sites without a card, three beside each other, under the reason they share."""
    if not groups:
        return
    page.add_page()
    page.say(("Sites without a card",), 13, bold=True)
    page.say(("In dB: the margin after the changeover when nothing is touched, in clear sky.",), 8.0)
    third = _WIDTH / 3.0
    for group in groups:
        page.ln(2.0)
        page.say((f"{group.action or 'no action'}: {len(group.notes)}",), 10.0, bold=True)
        page.say((group.why,), 8.0)
        page.ln(0.8)
        for index, note in enumerate(group.notes):
            page.set_font("body", "", 6.8)
            page.set_x(_LEFT + (index % 3) * third)
            words = page.glyphs.known(paper((Given(note.site), "  ", Given(note.name))))
            page.cell(third - 19.0, 3.9, page.glyphs.fitting(page, words, third - 21.0), border="B")
            page.cell(16.0, 3.9, plain(note.margin), border="B", align="R")
            if index % 3 == 2 or index == len(group.notes) - 1:
                page.ln(3.9)
