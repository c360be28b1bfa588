"""Writing the cards: each file appears whole under its final name, or not at all."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING

from geoskew.outputs.cards import html
from geoskew.outputs.cards.facts import CardFacts
from geoskew.outputs.cards.sheet import sheet_of
from geoskew.outputs.files import writing

if TYPE_CHECKING:
    import pandas


def write_cards(
    html_path: Path | None,
    pdf_path: Path | None,
    table: pandas.DataFrame,
    facts: CardFacts,
    *,
    order: pandas.DataFrame | None = None,
) -> list[str]:
    """Write a card for every site whose feed or dish is to be turned, and a list of the others.

    Parameters
    ----------
    html_path, pdf_path : Path or None
        Where to write; None: not in this form.
    table : DataFrame
        The assessed table: ``id``, ``lat``, ``lon``, reserved columns, layers by name (degrees, dB),
        ``action`` as name. Sites below the lowest elevation have no turn and get no card.
    facts : CardFacts
        What all cards share.
    order : DataFrame, optional
        The plan of visits (``crew``, ``day``, ``order``, ``id``); cards then follow crew and day.

    Returns
    -------
    list of str
        What the reader should know: feeds that cannot reach their target, ids too long for a square
        code, glyphs that the font of the PDF lacks.

    Raises
    ------
    OutputError
        A file could not be written.
    """
    sheet = sheet_of(table, facts, order)
    warnings = list(sheet.warnings)
    if html_path is not None:
        with writing(html_path) as part, part.open("w", encoding="utf-8", newline="\n") as stream:
            stream.writelines(html.pages(sheet, facts))
    if pdf_path is not None:
        from geoskew.outputs.cards import pdf

        with writing(pdf_path) as part:
            warnings += pdf.draw(part, sheet, facts)
    return warnings
