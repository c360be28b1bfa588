"""The font of the PDF, and what it lacks: a missing glyph is shown as a box and reported."""

from __future__ import annotations

import unicodedata
from pathlib import Path
from typing import Final

from fpdf import FPDF

from geoskew.errors import OutputError

_BOX: Final = "\N{WHITE SQUARE}"
_MOST_REPORTED: Final = 20


class Glyphs:
    """DejaVu Sans out of matplotlib's package data, with its table of characters.

    Raises
    ------
    OutputError
        The installed matplotlib carries no such font.
    """

    def __init__(self) -> None:
        import matplotlib
        from fontTools.ttLib import TTFont  # type: ignore[import-untyped]

        folder = Path(matplotlib.get_data_path()) / "fonts" / "ttf"
        self.regular = folder / "DejaVuSans.ttf"
        self.bold = folder / "DejaVuSans-Bold.ttf"
        for path in (self.regular, self.bold):
            if not path.is_file():
                raise OutputError(f"{path}: the font of the cards is not there; install matplotlib again")
        with TTFont(self.regular) as regular, TTFont(self.bold) as bold:
            self._characters = frozenset(regular.getBestCmap()) & frozenset(bold.getBestCmap())
        self._missing: dict[str, None] = {}
        self._right_to_left = False

    def known(self, text: str) -> str:
        """The text with a box for each character that cannot be drawn; newlines become spaces."""
        return "".join(self._one(character) for character in text.replace("\r", " ").replace("\n", " "))

    def _one(self, character: str) -> str:
        self._right_to_left |= unicodedata.bidirectional(character) in ("R", "AL")
        if character.isprintable() and ord(character) in self._characters:
            return character
        self._missing.setdefault(character)
        return _BOX

    def fitting(self, page: FPDF, text: str, width: float) -> str:
        """The text cut to a width in millimetres at the page's present font."""
        if page.get_string_width(text[:400]) <= width and len(text) <= 400:
            return text
        cut = text[:400]
        while cut and page.get_string_width(cut + "…") > width:
            cut = cut[:-1] if len(cut) < 60 else cut[: len(cut) * 3 // 4]
        return cut + "…"

    def report(self) -> list[str]:
        """Warnings: the characters that became boxes, and scripts that are not set as they should be."""
        warnings = []
        if self._missing:
            names = [f"U+{ord(character):04X}" for character in self._missing]
            more = f" and {len(names) - _MOST_REPORTED} more" if len(names) > _MOST_REPORTED else ""
            listed = ", ".join(names[:_MOST_REPORTED]) + more
            warnings.append(f"PDF cards: the font lacks {listed}; a box stands in the place of each")
        if self._right_to_left:
            warnings.append(
                "PDF cards: text that runs from right to left stands letter by letter from the left; "
                "print the HTML cards for it"
            )
        return warnings
