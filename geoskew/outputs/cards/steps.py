"""The numbered steps of a card, its cautions, and what the crew writes back.

Every step that turns something names where to stand and which way to turn.
"""

from __future__ import annotations

import math
from datetime import timedelta
from typing import Final

from geoskew.outputs.cards.facts import CardFacts
from geoskew.outputs.cards.site import Job
from geoskew.outputs.cards.words import (
    Line,
    Number,
    Part,
    comes_to_the_same,
    decibels,
    degrees,
    fold,
    lean,
    marks_in_words,
    sense_from_behind,
    sense_from_front,
    size,
)
from geoskew.turning import Way

# Common practice, no source: the usual cautions of work on fixed dishes.
CAUTIONS: Final = (
    "Height: work from a secured ladder or platform, with a second person; wear fall protection on roofs.",
    "Look for overhead lines before you raise a ladder; keep well clear of them.",
    "No work in strong wind, rain, frost or when thunder can be heard: a dish on a mast draws lightning.",
    "Never stand in front of a transmitting dish. Power the transmitter off, lock it off, and check.",
    "Local codes, the owner's rules and the judgement of licensed people go before this card.",
)
TRANSMITS: Final = (
    "THIS DISH TRANSMITS. Power off and lock off before anyone goes in front of it; agree the "
    "polarisation with the satellite's operations desk before power returns."
)

WRITE_BACK: Final = (
    "Date and time",
    "Setting found (scale / inclinometer)",
    "Setting left (scale / inclinometer)",
    "Signal before, dB",
    "Signal after, dB",
    "Port used",
    "Remarks",
    "Name",
)


def steps(job: Job, facts: CardFacts) -> tuple[Line, ...]:
    """All steps of one card in their order."""
    way = job.turning.way
    if way is None:
        why = job.turning.obstacle or "The table holds no turn for this site."
        return ((why, " Do not force it. Leave everything as it is and report to the planner."),)
    lines: list[Line] = [_before_touching(job), _when(job, facts)]
    if job.turning.obstacle:
        lines.append((f"{job.turning.obstacle} Do this:",))
    lines += _turn(job, way)
    lines += _check(job, way, facts)
    if job.action == "re-aim" or (job.action == "turn-at-changeover" and not facts.same_slot):
        lines.append(_move_dish(job, facts))
    else:
        lines.append(("Tighten the clamp. The dish stays where it is: do not move azimuth or elevation.",))
    lines.append(
        ("Compare the signal with the figures below; write back (inclinometer: + is RIGHT from BEHIND).",)
    )
    return tuple(lines)


def _before_touching(job: Job) -> Line:
    parts: list[Part] = ["Before touching anything write down the scale reading and the signal. "]
    where = "Seen from BEHIND the dish (looking towards the satellite) the feed's V mark should now stand "
    parts += [where, *_leaning(job.present, "present", from_behind=True)]
    if job.turning.way is not None:
        parts.append(_marked_end(job.turning.way.present))
    parts.append(".")
    if job.scale.is_known and job.turning.way is not None:
        reading = job.scale.reading(job.turning.way.present)
        parts += [" Scale: ", degrees("scale_now", reading, signed=True), "."]
    parts.append(" If it does not, measure it, turn to the TARGET and not by the turn, and report it.")
    return tuple(parts)


def _when(job: Job, facts: CardFacts) -> Line:
    moment = f"{facts.changeover:%d %b %Y %H:%M} UTC"
    if job.action == "preset":
        return (f"Do this AHEAD of the changeover ({moment}); one visit serves both satellites.",)
    if facts.overlap_hours > 0:
        end = facts.changeover + timedelta(hours=facts.overlap_hours)
        return (f"Do this AT the changeover ({moment}); both satellites work until {end:%d %b %H:%M} UTC.",)
    return (f"Do this AT the changeover ({moment}), once the new satellite carries the traffic, not before.",)


def _turn(job: Job, way: Way) -> list[Line]:
    lines: list[Line] = []
    if way.swap:
        lines.append(("Exchange the two leads: what was on the V port goes to the H port, and back.",))
    if abs(way.turn) < 0.05:
        where = "at the target" if way.short == 0.0 else "at its stop, near enough to the target"
        lines.append((f"The feed is not turned: it already stands {where}.",))
        return lines
    field = job.turn_field if job.turning.is_direct else "turn_to_make"
    lines.append(
        (
            "Stand BEHIND the dish, looking towards the satellite. Loosen the feed's clamp and turn it ",
            size(field, way.turn),
            f" {sense_from_behind(way.turn)}: ",
            Number("marks", abs(way.turn) / job.scale.step, marks_in_words(way.turn / job.scale.step)),
            f" of the scale ({job.scale.step:g}° a mark). "
            "Standing IN FRONT of the dish, looking into it, the same turn goes ",
            f"{sense_from_front(way.turn)}.",
        )
    )
    shorter = job.turning.shorter
    if shorter is not None:
        lines.append(
            (
                "Or, shorter: exchange the leads of the two ports and, from BEHIND, turn only ",
                size("turn_with_swap", shorter.turn),
                f" {sense_from_behind(shorter.turn)} (from IN FRONT: {sense_from_front(shorter.turn)}). "
                "Then the V mark stands ",
                *_leaning(fold(shorter.target), "target_with_swap", from_behind=True),
                f" seen from behind{_marked_end(shorter.target)}. One of the two, never both.",
            )
        )
    return lines


def _check(job: Job, way: Way, facts: CardFacts) -> list[Line]:
    goal = fold(way.target)
    field = job.goal_field if job.turning.is_direct else "target_to_reach"
    parts: list[Part] = [
        "Inclinometer in the plane of the feed's face, against the vertical: the V mark must stand ",
        *_leaning(goal, field, from_behind=True),
        " seen from BEHIND, ",
        lean(goal, from_behind=False),
        f" seen from IN FRONT{_marked_end(way.target)}.",
    ]
    if comes_to_the_same(way.turn):
        aside = size("other_way_round", fold(2.0 * way.turn))
        parts += [" Near a quarter turn the other way round ends ", aside, " from this: go by this angle."]
    elif abs(way.turn) >= 0.05:
        wrong = fold(way.present - way.turn)
        parts += [
            " If it stands ",
            *_leaning(wrong, "wrong_way_setting", from_behind=True),
            " seen from behind, it was turned the WRONG WAY: go back by twice the turn.",
        ]
    lines: list[Line] = [tuple(parts)]
    if job.scale.is_known:
        reading = degrees("scale_target", job.scale.reading(way.target), signed=True)
        lines.append(("The scale then shows ", reading, "."))
    if job.window is not None and job.turning.keeps_side:
        lines.append(_tolerance(job, way, facts))
    return lines


def _tolerance(job: Job, way: Way, facts: CardFacts) -> Line:
    assert job.window is not None
    low, high = job.window
    parts: list[Part] = []
    if job.every_setting_does:
        parts.append("Every setting keeps what is asked; the target is the best one.")
    else:
        from_to = ("Any turn from ", degrees("window_low", low, signed=True), " to ")
        parts += [*from_to, degrees("window_high", high, signed=True)]
        aim = "aim for the target" if way.short == 0.0 else "the stop is as near to the target as it gets"
        parts.append(f" keeps what is asked (plus is CLOCKWISE from BEHIND); {aim}.")
    before, after = "margin_marked_before", "margin_marked_after"
    mark = job.scale.nearest_mark(way.target, way.present)
    # Between stops that shift the feed by half a turn the margins of the table may be of another mark.
    of_table = abs(fold(mark - job.scale.nearest_mark(job.present + job.wanted, job.present))) < 1e-6
    known = job.row.has(before) and job.row.has(after) and of_table
    if known and way.short == 0.0 and job.feed.reaches(mark):
        shown = job.scale.reading(mark) if job.scale.is_known else fold(mark)
        what = "scale " if job.scale.is_known else "a setting of "
        parts += [f" On the nearest whole mark ({what}", degrees("nearest_mark", shown, signed=True), ") "]
        sky = "in rain" if facts.judged_in == "rain" else "in clear sky"
        parts += ["the margin is ", decibels(before, job.row.number(before)), " before and "]
        parts += [decibels(after, job.row.number(after)), f" after, {sky}."]
    return tuple(parts)


def _move_dish(job: Job, facts: CardFacts) -> Line:
    row = job.row
    parts: list[Part] = ["Move the DISH to the new satellite"]
    if row.has("azimuth_after") and row.has("azimuth_before"):
        turn = (row.number("azimuth_after") - row.number("azimuth_before") + 180.0) % 360.0 - 180.0
        lift = row.number("elevation_after") - row.number("elevation_before")
        side = "RIGHT" if turn > 0 else "LEFT"
        parts += [
            ": standing BEHIND it, swing it ",
            size("azimuth_move", turn),
            f" to the {side} ({'LEFT' if turn > 0 else 'RIGHT'} when IN FRONT) to azimuth ",
            degrees("azimuth_after", row.number("azimuth_after")),
            f" from true north, and {'raise' if lift > 0 else 'lower'} it ",
            size("elevation_move", lift),
            " to elevation ",
            degrees("elevation_after", row.number("elevation_after")),
        ]
    parts.append(". Peak it on the signal, check the feed's setting once more, and tighten everything.")
    return tuple(parts)


def _marked_end(setting: float) -> str:
    """That a mark past level points down: an angle from upright is then its other end's. Else empty."""
    return " (marked end DOWN)" if math.cos(math.radians(setting)) < -1e-3 else ""


def _leaning(setting: float, field: str, *, from_behind: bool) -> tuple[Part, ...]:
    """A setting against the vertical, in words."""
    folded = fold(setting)
    side = lean(folded, from_behind=from_behind)
    if side == "upright" or not math.isfinite(folded):
        return (Number(field, folded, side),)
    return (size(field, folded), f" {side}")
