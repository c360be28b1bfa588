"""Writing a report: each file appears whole under its final name, or not at all."""

from __future__ import annotations

from pathlib import Path
from typing import Final

from geoskew.errors import InputError
from geoskew.outputs.files import writing
from geoskew.outputs.report import html
from geoskew.outputs.report.content import Report
from geoskew.outputs.report.figures import drawn_figures

ENDINGS: Final = (".html", ".pdf")


def require_known_ending(path: Path) -> None:
    """Check, before the work, that a report can be written under a name.

    Raises
    ------
    InputError
        The ending is neither .html nor .pdf.
    """
    if path.suffix.lower() not in ENDINGS:
        raise InputError(
            f"{path}: a report is written as .html or .pdf; give a name with one of these endings"
        )


def write_report(report: Report, *paths: Path) -> list[str]:
    """Write a report under one or several names, by their endings; its figures are drawn once.

    Returns
    -------
    list of str
        What the reader should know: characters that the font of the PDF lacks.

    Raises
    ------
    InputError
        An ending is neither .html nor .pdf.
    OutputError
        A file could not be written.
    """
    for path in paths:
        require_known_ending(path)
    rows = drawn_figures(report)
    remarks: list[str] = []
    for path in paths:
        if path.suffix.lower() == ".html":
            with writing(path) as part, part.open("w", encoding="utf-8", newline="\n") as stream:
                stream.writelines(html.pages(report, rows))
        else:
            from geoskew.outputs.report import pdf

            with writing(path) as part:
                remarks += pdf.draw(part, report, rows)
    return remarks
