"""All cards of a network in the order in which they are handed out, and the sites without one."""

from __future__ import annotations

from collections.abc import Hashable
from dataclasses import dataclass
from datetime import date
from typing import TYPE_CHECKING, Any, Final

from geoskew.outputs.cards.facts import CardFacts
from geoskew.outputs.cards.site import (
    CARD_ACTIONS,
    Card,
    Job,
    code_text,
    dials_of,
    job_of,
    mounted,
    signal_rows,
    where,
)
from geoskew.outputs.cards.steps import CAUTIONS, TRANSMITS, WRITE_BACK, steps
from geoskew.outputs.cards.words import Given, Line, Row, decibels

if TYPE_CHECKING:
    import pandas

# A square code of this many bytes is still read by a phone from paper at 25 mm.
CODE_BYTES: Final = 230

_WHY: Final = {
    "leave": "An untouched feed keeps the reserve after the changeover.",
    "upgrade": "Even perfectly set, the reserve is not kept: more dish, a better feed or another carrier.",
    "no-sight": "The new satellite is too low, or terrain is in the way.",
}
_NO_ACTION: Final = "The site could not be judged: no usable signal is known for it."


@dataclass(frozen=True, slots=True)
class SiteNote:
    """A site that gets no card, with its margin after the changeover when nothing is touched."""

    site: str
    name: str
    margin: Line


@dataclass(frozen=True, slots=True)
class NoteGroup:
    """Sites without a card that share an action, and why they get none."""

    action: str
    why: str
    notes: tuple[SiteNote, ...]


@dataclass(frozen=True, slots=True)
class Sheet:
    """Cards in order, sites without one, and what the writer has to say about them."""

    cards: tuple[Card, ...]
    others: tuple[NoteGroup, ...]
    warnings: tuple[str, ...]


def sheet_of(table: pandas.DataFrame, facts: CardFacts, order: pandas.DataFrame | None) -> Sheet:
    """Make all cards out of the assessed table, sorted by crew and day where a plan is given."""
    stops = _stops(order)
    cards: list[tuple[tuple[Any, ...], Card]] = []
    others: dict[str, list[SiteNote]] = {}
    warnings: list[str] = []
    for index, values in enumerate(table.to_dict("records")):
        job = job_of({str(name): value for name, value in values.items()}, facts)
        site = job.row.text("id")
        if job.action in CARD_ACTIONS:
            stop = stops.get(site)
            card = _card(job, site, facts, stop, warnings)
            # Sites that the plan does not reach stand behind all others, in the table's order.
            key = (0, *stop) if stop is not None else (1, "", "", 0)
            cards.append(((*key, index), card))
        else:
            others.setdefault(job.action, []).append(_note(job.row, site))
    cards.sort(key=lambda entry: entry[0])
    groups = tuple(
        NoteGroup(action, _WHY.get(action, _NO_ACTION), tuple(notes))
        for action, notes in sorted(others.items())
    )
    return Sheet(tuple(card for _, card in cards), groups, tuple(warnings))


def _stops(order: pandas.DataFrame | None) -> dict[Hashable, tuple[str, str, int]]:
    """Crew, day and place in the day of each visited site."""
    if order is None:
        return {}
    rows = zip(order["id"], order["crew"], order["day"], order["order"], strict=True)
    return {str(site): (str(crew), str(day)[:10], int(place)) for site, crew, day, place in rows}


def _card(
    job: Job, site: str, facts: CardFacts, stop: tuple[str, str, int] | None, warnings: list[str]
) -> Card:
    code = code_text(job, site)
    if len(code.encode()) > CODE_BYTES:
        warnings.append(f"site {site[:40]}…: the id is too long for a square code; its card carries none")
        code = ""
    if job.turning.way is None:
        why = job.turning.obstacle or "the table holds no turn"
        warnings.append(f"site {site[:40]}: {why}")
    visit: Line = ()
    if stop is not None:
        visit = ("Crew ", Given(stop[0]), f" · {date.fromisoformat(stop[1]):%a %d %b %Y} · stop {stop[2]}")
    rows, notes = signal_rows(job, facts)
    return Card(
        site=site,
        name=job.row.text("name"),
        action=job.action,
        visit=visit,
        where=where(job, facts),
        mounted=mounted(job, facts),
        steps=steps(job, facts),
        dials=dials_of(job),
        signals=rows,
        signal_notes=notes,
        cautions=((TRANSMITS,) if job.row.yes("transmits") else ()) + CAUTIONS,
        write_back=WRITE_BACK,
        code=code,
    )


def _note(row: Row, site: str) -> SiteNote:
    margin: Line = ()
    if row.has("margin_untouched"):
        margin = (decibels("margin_untouched", row.number("margin_untouched")),)
    return SiteNote(site, row.text("name"), margin)
