"""Cards as one HTML file: no script, no request to any network, every given text inert."""

from __future__ import annotations

import base64
import hashlib
import html
from collections.abc import Iterable, Iterator
from typing import Final

from geoskew.outputs.cards import square
from geoskew.outputs.cards.dial import HALF_SIZE, Dial, Label, Mark, hands, ring
from geoskew.outputs.cards.facts import CardFacts
from geoskew.outputs.cards.sheet import NoteGroup, Sheet
from geoskew.outputs.cards.site import Card
from geoskew.outputs.cards.style import CSS
from geoskew.outputs.cards.words import Given, Line, Number, loud

_STYLE_HASH: Final = base64.b64encode(hashlib.sha256(CSS.encode()).digest()).decode()
# Nothing may be loaded and nothing may run; the one style sheet is known by its digest.
_POLICY: Final = f"default-src 'none'; style-src 'sha256-{_STYLE_HASH}'; base-uri 'none'; form-action 'none'"


def text(given: str) -> str:
    """Any text as inert HTML; control characters become visible boxes."""
    shown = "".join(char if char.isprintable() or char in "\n\t" else "\N{WHITE SQUARE}" for char in given)
    return html.escape(shown, quote=True)


def line(parts: Line) -> str:
    """A line with its numbers marked by column and unrounded value."""
    return "".join(_part(part) for part in parts)


def _part(part: str | Number | Given) -> str:
    if isinstance(part, Number):
        return f'<data data-field="{text(part.field)}" value="{part.value:.6f}">{text(part.text)}</data>'
    if isinstance(part, Given):
        return f"<bdi>{text(part.text)}</bdi>"
    return "".join(f"<b>{text(piece)}</b>" if bold else text(piece) for piece, bold in loud(part))


def pages(sheet: Sheet, facts: CardFacts) -> Iterator[str]:
    """The pieces of the file in their order, so that a long list never stands in memory twice."""
    yield (
        f'<!DOCTYPE html>\n<html lang="en">\n<head>\n<meta charset="utf-8">\n'
        f'<meta http-equiv="Content-Security-Policy" content="{_POLICY}">\n'
        '<meta name="viewport" content="width=device-width, initial-scale=1">\n'
        f'<meta name="referrer" content="no-referrer">\n<title>Job cards: {text(facts.title)}</title>\n'
        f"<style>{CSS}</style>\n</head>\n<body>\n"
    )
    steps = sorted({dial.step for card in sheet.cards for dial in card.dials})
    yield from _shared_rings(steps)
    yield from _contents(sheet, facts)
    yield "<main>\n"
    for number, card in enumerate(sheet.cards, start=1):
        yield _card(number, card, facts)
    yield from _others(sheet.others)
    yield "</main>\n</body>\n</html>\n"


def _contents(sheet: Sheet, facts: CardFacts) -> Iterator[str]:
    yield f"<header class='front'>\n<h1>Job cards</h1>\n<p><bdi>{text(facts.title)}</bdi></p>\n"
    yield f"<p>Changeover {facts.changeover:%d %b %Y %H:%M} UTC, from <bdi>{text(facts.outgoing)}</bdi> "
    yield f"to <bdi>{text(facts.incoming)}</bdi>. Margins judged {facts.judged}.</p>\n"
    without = sum(len(group.notes) for group in sheet.others)
    yield f"<nav aria-label='Cards'><p>{len(sheet.cards)} cards, {without} sites without one.</p><ol>\n"
    for number, card in enumerate(sheet.cards, start=1):
        visit = f" <span>{line(card.visit)}</span>" if card.visit else ""
        who = f"<bdi>{text(card.site)}</bdi> <bdi>{text(card.name)}</bdi>"
        yield f"<li><a href='#card-{number}'>{who}</a>{visit}</li>\n"
    yield "</ol></nav>\n</header>\n"


def _card(number: int, card: Card, facts: CardFacts) -> str:
    visit = f"<p class='visit'>{line(card.visit)}</p>" if card.visit else ""
    marks = "".join(f"<li>{line(step)}</li>\n" for step in card.steps)
    dials = "".join(_dial(dial) for dial in card.dials)
    legend = "<p>dashed: now · solid: target · hatched: the wrong way</p>" if card.dials else ""
    notes = "".join(f"<p class='note'>{line(note)}</p>" for note in card.signal_notes)
    cautions = "".join(f"<li>{line((words,))}</li>" for words in card.cautions)
    blanks = "".join(f"<li>{text(words)}</li>" for words in card.write_back)
    who = f"<bdi class='id'>{text(card.site)}</bdi> <bdi>{text(card.name)}</bdi>"
    facts_of_site = _facts("Where", card.where) + _facts("What is mounted", card.mounted)
    foot = f"<bdi>{text(facts.title)}</bdi> · margins judged {facts.judged} · {text(facts.edition)}"
    return (
        f"<article id='card-{number}' data-site='{text(card.site)}' data-action='{text(card.action)}'>\n"
        f"<header><div class='who'><h2>{who}</h2>"
        f"<p class='action'>{text(card.action)}</p>{visit}</div>{_code(card.code)}</header>\n"
        f"<section class='facts'>{facts_of_site}</section>\n"
        f"<section class='do'><h3>What to do</h3><ol>{marks}</ol></section>\n"
        f"<section class='dials'>{dials}{legend}</section>\n"
        f"<section class='signals'><h3>Signal to expect</h3>{_signals(card, facts)}{notes}</section>\n"
        f"<section class='back'><h3>Write back</h3><ul>{blanks}</ul></section>\n"
        f"<section class='care'><h3>Care</h3><ul>{cautions}</ul></section>\n"
        f"<footer>{foot}</footer>\n"
        "</article>\n"
    )


def _facts(title: str, rows: tuple[tuple[str, Line], ...]) -> str:
    body = "".join(f"<dt>{text(label)}</dt><dd>{line(words)}</dd>" for label, words in rows)
    return f"<div><h3>{title}</h3><dl>{body}</dl></div>"


def _signals(card: Card, facts: CardFacts) -> str:
    if not card.signals:
        return "<p>The table holds no margins for this site.</p>"
    rain = any(row.rain for row in card.signals)
    meter = any(row.meter for row in card.signals)
    heads = ["", "Margin, clear sky"] + ["Meter, Es/N0"] * meter + [f"Margin {_in_rain(facts)}"] * rain
    body = ""
    for row in card.signals:
        cells = [row.margin] + [row.meter] * meter + [row.rain] * rain
        bad = " class='bad'" if row.bad else ""
        body += f"<tr{bad}><th scope='row'>{text(row.label)}</th>"
        body += "".join(f"<td>{line(cell)}</td>" for cell in cells) + "</tr>"
    head = "".join(f"<th scope='col'>{text(words)}</th>" for words in heads)
    return f"<table><thead><tr>{head}</tr></thead><tbody>{body}</tbody></table>"


def _in_rain(facts: CardFacts) -> str:
    return "in rain" if facts.availability_percent is None else f"in rain ({facts.availability_percent:g} %)"


def _code(code: str) -> str:
    if not code:
        return ""
    return f"<div class='square'>{square.svg(code, label='Site and target as a square code')}</div>"


def _shared_rings(steps: Iterable[float]) -> Iterator[str]:
    """Rings are the same on every card with one scale: drawn once, used by name."""
    yield "<svg class='shared' width='0' height='0' aria-hidden='true'><defs>\n"
    for step in steps:
        for behind in (True, False):
            marks = "".join(_mark(mark) for mark in ring(Dial(behind, 0.0, 0.0, step)))
            yield f"<g id='{_ring_name(step, behind)}'>{marks}</g>\n"
    yield "</defs></svg>\n"


def _ring_name(step: float, behind: bool) -> str:
    return f"ring-{f'{step:g}'.replace('.', '_')}-{'behind' if behind else 'front'}"


def _dial(dial: Dial) -> str:
    marks = "".join(_mark(mark) for mark in hands(dial))
    place = "behind" if dial.from_behind else "in front"
    caption = (
        "<b>BEHIND the dish</b>, looking towards the satellite"
        if dial.from_behind
        else "<b>IN FRONT of the dish</b>, looking into it (mirrored)"
    )
    size = f"{-HALF_SIZE:g} {-HALF_SIZE:g} {2 * HALF_SIZE:g} {2 * HALF_SIZE:g}"
    label = f"Dial seen from {place}: from {dial.present:.1f} to {dial.target:.1f} degrees"
    return (
        f"<figure data-view='{place}'><svg viewBox='{size}' role='img' aria-label='{label}'>"
        f"<use href='#{_ring_name(dial.step, dial.from_behind)}'/>{marks}</svg>"
        f"<figcaption>{caption}</figcaption></figure>"
    )


def _mark(mark: Mark) -> str:
    if isinstance(mark, Label):
        place = f"x='{mark.x:.1f}' y='{mark.y:.1f}' font-size='{mark.height:g}'"
        return f"<text class='{mark.ink}' {place}>{text(mark.text)}</text>"
    points = " ".join(f"{x:.1f},{y:.1f}" for x, y in mark.points)
    shape = "polygon" if mark.filled else "polyline"
    return f"<{shape} class='{mark.ink}' points='{points}'/>"


def _others(groups: tuple[NoteGroup, ...]) -> Iterator[str]:
    """The list of sites that get no card, under the reason they share."""
    if not groups:
        return
    yield "<section class='others'><h2>Sites without a card</h2>\n"
    yield "<p>In dB: the margin after the changeover when nothing is touched, in clear sky.</p>\n"
    for group in groups:
        yield f"<h3>{text(group.action or 'no action')}: {len(group.notes)}</h3>"
        yield f"<p>{text(group.why)}</p><ul>\n"
        for note in group.notes:
            yield f"<li data-site='{text(note.site)}'><span><bdi>{text(note.site)}</bdi> "
            yield f"<bdi>{text(note.name)}</bdi></span> {line(note.margin)}</li>\n"
        yield "</ul>\n"
    yield "</section>\n"
