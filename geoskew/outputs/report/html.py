"""The report as one HTML file: no script, no request to any network, every given text inert."""

from __future__ import annotations

import base64
import hashlib
import html
from collections.abc import Iterator, Sequence
from typing import Final

from geoskew.outputs.report.content import Bullets, Figures, Grid, Heading, Report, Words
from geoskew.outputs.report.figures import HALF, Drawn
from geoskew.outputs.report.glyphs import BOX
from geoskew.outputs.report.style import CSS

# On paper a figure keeps its size: one rule a width, since the policy forbids styles within elements.
_STYLE: Final = CSS + f"@media print{{figure.half{{width:{HALF:g}mm}}figure.full{{width:100%}}}}\n"
_HASH: Final = base64.b64encode(hashlib.sha256(_STYLE.encode()).digest()).decode()
_POLICY: Final = (
    f"default-src 'none'; img-src data:; style-src 'sha256-{_HASH}'; base-uri 'none'; form-action 'none'"
)


def text(given: str) -> str:
    """Any text as inert HTML; control characters become visible boxes."""
    shown = "".join(char if char.isprintable() or char in "\n\t" else BOX for char in given)
    return html.escape(shown, quote=True)


def pages(report: Report, rows: Sequence[Sequence[Drawn]]) -> Iterator[str]:
    """The pieces of the file in their order."""
    yield (
        '<!DOCTYPE html>\n<html lang="en">\n<head>\n<meta charset="utf-8">\n'
        f'<meta http-equiv="Content-Security-Policy" content="{_POLICY}">\n'
        '<meta name="viewport" content="width=device-width, initial-scale=1">\n'
        f'<meta name="referrer" content="no-referrer">\n<title>{text(report.title)}</title>\n'
        f"<style>{_STYLE}</style>\n</head>\n<body>\n<main>\n"
        f'<h1><bdi>{text(report.title)}</bdi></h1>\n<p class="sub">{text(report.subtitle)}</p>\n'
    )
    waiting = iter(rows)
    tables = 0
    for block in report.blocks:
        match block:
            case Heading():
                yield f"<h2{_class('page', block.new_page)}>{text(block.text)}</h2>\n"
            case Words():
                yield f"<p{_class('small', block.small)}>{text(block.text)}</p>\n"
            case Bullets():
                items = "".join(f"<li>{text(item)}</li>" for item in block.items)
                yield f"<ul{_class('small', block.small)}>{items}</ul>\n"
            case Grid():
                tables += 1
                yield _table(block, tables)
            case Figures():
                yield '<div class="row">' + "".join(_figure(one) for one in next(waiting)) + "</div>\n"
    yield f"</main>\n<footer><bdi>{text(report.foot)}</bdi></footer>\n</body>\n</html>\n"


def _class(name: str, given: bool) -> str:
    return f' class="{name}"' if given else ""


def _table(grid: Grid, number: int) -> str:
    def cells(row: Sequence[str], tag: str, scope: str = "") -> str:
        return "".join(
            f"<{tag}{scope}{_class('r', side == 'r')}>{text(cell)}</{tag}>"
            for cell, side in zip(row, grid.align, strict=True)
        )

    head = cells(grid.headings, "th", ' scope="col"')
    body = "\n".join(f"<tr>{cells(row, 'td')}</tr>" for row in grid.rows)
    return (
        f'<div class="wide"><table><caption><b>Table {number}.</b> {text(grid.caption)}</caption>\n'
        f"<thead><tr>{head}</tr></thead>\n<tbody>\n{body}\n</tbody></table></div>\n"
    )


def _figure(one: Drawn) -> str:
    data = base64.b64encode(one.png).decode("ascii")
    kind = "half" if one.width_mm == HALF else "full"
    return (
        f'<figure class="{kind}"><img src="data:image/png;base64,{data}" alt="{text(one.alt)}">\n'
        f"<figcaption><b>Figure {one.number}.</b> {text(one.caption)}</figcaption></figure>\n"
    )
