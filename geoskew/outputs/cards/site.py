"""One site's row of the assessed table, made into what a card says."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any, Final

from geoskew.outputs.cards.dial import Dial
from geoskew.outputs.cards.facts import CardFacts
from geoskew.outputs.cards.signals import Signal, signals
from geoskew.outputs.cards.words import Given, Line, Number, Row, degrees, fold
from geoskew.turning import Feed, Scale, Turning, plan_turning, sense_of_scale

# Actions that send a crew to turn a feed.
CARD_ACTIONS: Final = ("preset", "turn-at-changeover", "re-aim")
_EVERY_SETTING: Final = 89.995


@dataclass(frozen=True, slots=True)
class Job:
    """The figures that one site's card is written from; settings and turns in degrees.

    ``wanted`` is the turn of the assessed table, in the column ``turn_field``; ``goal`` is the setting
    it leads to, folded, in the column ``goal_field``; ``window``: turns that still do, or None.
    """

    row: Row
    action: str
    present: float
    wanted: float
    turn_field: str
    goal: float
    goal_field: str
    window: tuple[float, float] | None
    turning: Turning
    scale: Scale
    feed: Feed

    @property
    def every_setting_does(self) -> bool:
        """Whether the window is the whole half-turn."""
        return self.window is not None and self.window[1] - self.window[0] >= 2 * _EVERY_SETTING


@dataclass(frozen=True, slots=True)
class Card:
    """One card, ready to be drawn: lines, dials and signal figures."""

    site: str
    name: str
    action: str
    visit: Line
    where: tuple[tuple[str, Line], ...]
    mounted: tuple[tuple[str, Line], ...]
    steps: tuple[Line, ...]
    dials: tuple[Dial, ...]
    signals: tuple[Signal, ...]
    signal_notes: tuple[Line, ...]
    cautions: tuple[str, ...]
    write_back: tuple[str, ...]
    code: str


def job_of(values: Mapping[str, Any], facts: CardFacts) -> Job:
    """Read the figures of one site out of its row of the table."""
    row = Row(values, facts.terminal)
    action = row.text("action")
    turn_field = "turn_shared" if action == "preset" else "turn_realigned"
    goal_field = "setting_shared" if action == "preset" else "setting_realigned"
    present = row.number("setting_deg") if row.has("setting_deg") else row.number("skew_before")
    wanted = row.number(turn_field)
    window = None
    if action == "preset" and row.has("window_low") and row.has("window_high"):
        window = (row.number("window_low"), row.number("window_high"))
    feed = Feed(
        row.number("feed_low_deg"), row.number("feed_high_deg"), row.yes("feed_fixed"), row.whole("ports", 1)
    )
    turning = Turning(None)
    if math.isfinite(wanted) and math.isfinite(present):
        turning = plan_turning(present, wanted, feed, slack=window or (wanted, wanted))
    # With one port and a carrier of the other polarisation the turn holds a quarter that the setting's
    # column does not: what is printed is then the sum and no column.
    goal = fold(present + wanted)
    return Job(
        row=row,
        action=action,
        present=present,
        wanted=wanted,
        turn_field=turn_field,
        goal=goal,
        goal_field=goal_field if abs(fold(row.number(goal_field) - goal)) < 0.005 else "target_to_reach",
        window=window,
        turning=turning,
        scale=_scale(row),
        feed=feed,
    )


def _scale(row: Row) -> Scale:
    step = row.number("scale_step_deg")
    sense = sense_of_scale(row.text("scale_sense"))
    # A sense that cannot be read makes every reading a guess: the scale then counts as unknown.
    zero = row.number("scale_zero_deg") if sense is not None else math.nan
    return Scale(step if step > 0 else 5.0, zero, sense or 1)


def dials_of(job: Job) -> tuple[Dial, ...]:
    """The dial from behind and the mirrored one from the front; none where no way is open."""
    way = job.turning.way
    if way is None:
        return ()
    tolerance = None
    if job.window is not None and job.turning.keeps_side:
        tolerance = (way.present + job.window[0], way.present + job.window[1])
    stops = (job.feed.low, job.feed.high)
    return tuple(
        Dial(behind, way.present, way.turn, job.scale.step, tolerance, stops) for behind in (True, False)
    )


def where(job: Job, facts: CardFacts) -> tuple[tuple[str, Line], ...]:
    """Where the site is and how to know its dish again."""
    row = job.row
    lat, lon = row.number("lat"), row.number("lon")
    lines: list[tuple[str, Line]] = [
        ("Position", (Number("lat", lat, f"{lat:.5f}"), ", ", Number("lon", lon, f"{lon:.5f}"), " (WGS 84)"))
    ]
    lines += [
        (label, (Given(row.text(column)),))
        for label, column in (("District", "district"), ("Access", "access"), ("Last visit", "last_visit"))
        if row.text(column)
    ]
    lines.append(("Dish looks to", _towards(row, "before", facts.outgoing)))
    if not facts.same_slot:
        lines.append(("New satellite", _towards(row, "after", facts.incoming)))
    return tuple(lines)


def _towards(row: Row, moment: str, satellite: str) -> Line:
    azimuth, elevation = f"azimuth_{moment}", f"elevation_{moment}"
    if not row.has(azimuth):
        return (Given(satellite),)
    return (
        "azimuth ",
        degrees(azimuth, row.number(azimuth)),
        " from true north, elevation ",
        degrees(elevation, row.number(elevation)),
        " (",
        Given(satellite),
        ")",
    )


def mounted(job: Job, facts: CardFacts) -> tuple[tuple[str, Line], ...]:
    """What is mounted at the site and what it receives."""
    row = job.row
    ports = row.whole("ports", 1)
    dish: list[Any] = [Number("dish_m", row.number("dish_m"), f"{row.number('dish_m'):g} m")]
    dish.append(f", {ports} port{'s' if ports != 1 else ''}, scale of {job.scale.step:g}° a mark")
    source = row.text("setting_source")
    measured = row.has("setting_deg")
    setting: list[Any] = [degrees("setting_deg" if measured else "skew_before", job.present, signed=True)]
    setting.append(" (measured" if measured else " (taken as well set for the old satellite; not measured")
    setting += [": ", Given(source), ")"] if measured and source else [")"]
    lines: list[tuple[str, Line]] = [("Dish and feed", tuple(dish)), ("Setting now", tuple(setting))]
    if math.isfinite(job.feed.low) and math.isfinite(job.feed.high):
        low, high = (f"{stop:+.0f}°".replace("-", "\N{MINUS SIGN}") for stop in (job.feed.low, job.feed.high))
        lines.append(("Feed's stops", (f"{low} to {high}",)))
    before = tuple(carrier.polarisation for carrier in facts.carriers_before)
    after = tuple(carrier.polarisation for carrier in facts.carriers_after)
    lines.append(("Received now", _carriers(facts.carriers_before)))
    if facts.carriers_after != facts.carriers_before:
        changed = " The polarisation changes." if before != after else ""
        lines.append(("Afterwards", (*_carriers(facts.carriers_after), changed)))
    return tuple(lines)


def _carriers(carriers: tuple[Any, ...]) -> Line:
    parts: list[Any] = []
    for carrier in carriers[:4]:
        rate = f"{carrier.symbol_rate_mbaud:g} Mbaud"
        parts += ["; " if parts else "", f"{carrier.frequency_ghz:g} GHz {carrier.polarisation}, {rate}, "]
        parts.append(Given(carrier.waveform))
    if len(carriers) > 4:
        parts.append(f"; and {len(carriers) - 4} more")
    return tuple(parts)


def code_text(job: Job, site: str) -> str:
    """Plain text for the square code: the site and its target."""
    way = job.turning.way
    if way is None:
        return f"SITE {site}\nTARGET none: {job.turning.obstacle}"
    side = "clockwise" if way.turn > 0 else "counter-clockwise"
    swap = "\nEXCHANGE THE TWO PORTS" if way.swap else ""
    return (
        f"SITE {site}\nTARGET {fold(way.target):+.2f} deg from upright, clockwise from behind\n"
        f"TURN {abs(way.turn):.2f} deg {side} from behind{swap}"
    )


def signal_rows(job: Job, facts: CardFacts) -> tuple[tuple[Signal, ...], tuple[Line, ...]]:
    """The signal figures to expect, and the remarks beneath them."""
    rows, notes = signals(job.row, job.action, facts, turn=job.wanted, direct=job.turning.is_direct)
    way = job.turning.way
    if way is not None and way.short > 0.0:
        aside = degrees("short_of_target", way.short)
        notes = (
            ("The figures after your turn are for the full target, ", aside, " beyond the stop."),
            *notes,
        )
    return rows, notes
