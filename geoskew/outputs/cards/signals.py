"""The signal figures a crew is to expect, and why they do not tell the right way from the wrong one."""

from __future__ import annotations

import math
from dataclasses import dataclass

from geoskew.outputs.cards.facts import CardFacts, CarrierLine
from geoskew.outputs.cards.words import Line, Number, Row, comes_to_the_same, decibels, fold, minus


@dataclass(frozen=True, slots=True)
class Signal:
    """One row of the table of figures: when, margin in clear sky, meter's Es/N0, margin in rain.

    Empty lines where there is no figure. ``bad`` marks what must not be found.
    """

    label: str
    margin: Line
    meter: Line
    rain: Line
    bad: bool = False


def signals(
    row: Row, action: str, facts: CardFacts, *, turn: float, direct: bool
) -> tuple[tuple[Signal, ...], tuple[Line, ...]]:
    """Rows and remarks for one site.

    Parameters
    ----------
    row : Row
        The site's row.
    action : str
        Name of the action.
    facts : CardFacts
        Carriers, for the meter's figure.
    turn : float
        The turn of the assessed table, degrees.
    direct : bool
        Whether the crew makes exactly this turn; else the figures of a wrong-way turn do not apply.
    """
    before, after = facts.carriers_before, facts.carriers_after
    wrong_way_shows = direct and not comes_to_the_same(turn)
    rows = [_signal(row, "Now, nothing touched", "margin_before", before)]
    if action == "preset":
        rows += [
            _signal(row, "After your turn, before the changeover", "margin_shared_before", before),
            _signal(row, "After your turn, after the changeover", "margin_shared_after", after),
        ]
        if wrong_way_shows:
            wrong = "WRONG WAY, after the changeover"
            rows.append(_signal(row, wrong, "margin_reversed", after, bad=True))
        rows.append(_signal(row, "Not visited, after the changeover", "margin_untouched", after))
    else:
        rows += [
            _signal(row, "After the changeover, before your turn", "margin_untouched", after),
            _signal(row, "After the changeover and your turn", "margin_realigned", after),
        ]
        if wrong_way_shows:
            rows.append(_signal(row, "WRONG WAY, after the changeover", "margin_wrong_way", after, bad=True))
    notes = _notes(row, action, turn) if wrong_way_shows and abs(turn) >= 0.05 else []
    return tuple(entry for entry in rows if entry.margin), tuple(notes)


def _signal(
    row: Row, label: str, column: str, carriers: tuple[CarrierLine, ...], *, bad: bool = False
) -> Signal:
    margin: Line = ()
    meter: Line = ()
    if row.has(column):
        value = row.number(column)
        margin = (decibels(column, value),)
        needed = {carrier.needed_db for carrier in carriers}
        if len(needed) == 1:  # else the table does not say which carrier has the least margin
            expected = value + needed.pop()
            meter = (Number(f"{column}:es_n0", expected, minus(f"{expected:.1f} dB")),)
    in_rain = f"{column}_rain"
    rain: Line = (decibels(in_rain, row.number(in_rain)),) if row.has(in_rain) else ()
    return Signal(label, margin, meter, rain, bad)


def _notes(row: Row, action: str, turn: float) -> list[Line]:
    """Remarks on wrong-way turns; one and a half times, and twice: common practice, no source."""
    alike = (
        "Before the changeover the right and the wrong way look nearly alike on the meter: "
        "trust scale and inclinometer, not the signal. "
    )
    if action != "preset":
        return [
            (
                alike,
                "A turn the wrong way leaves the feed ",
                Number("wrong_way_error", abs(fold(2.0 * turn)), f"{abs(fold(2.0 * turn)):.0f}°"),
                " off, twice as far as one that was not turned." if abs(turn) <= 45.0 else " off.",
            )
        ]
    needed = row.number("turn_realigned") + _between_the_two_angles(row)
    if not math.isfinite(needed):
        return [(alike,)]
    untouched, wrong = abs(fold(needed)), abs(fold(needed + turn))
    about = ": one and a half times as far" if 1.45 <= wrong / max(untouched, 1e-9) <= 1.55 else ""
    return [
        (
            alike,
            "After the changeover a feed turned the wrong way is ",
            Number("reversed_error", wrong, f"{wrong:.0f}°"),
            " off, an untouched one ",
            Number("untouched_error", untouched, f"{untouched:.0f}°"),
            f"{about}.",
        )
    ]


def _between_the_two_angles(row: Row) -> float:
    """What the new angle differs by for a dish that stays on the old slot, degrees."""
    return fold(row.number("seen_after") - row.number("skew_after"))
