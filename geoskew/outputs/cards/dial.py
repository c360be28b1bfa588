"""The dial of a feed as the person at work sees it, as lines and texts that any canvas can draw.

Coordinates have x to the right and y DOWN, the centre at (0, 0) and the scale's ring at radius 100.
Seen from behind (looking towards the satellite) a setting grows clockwise; seen from the front
(looking into the dish) the picture is mirrored.
"""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import dataclass
from typing import Final, Literal

from geoskew.outputs.cards.words import comes_to_the_same

Ink = Literal["ring", "tick", "plumb", "present", "target", "turn", "tolerance", "wrong", "stop"]

HALF_SIZE: Final = 140.0
_FORBIDDEN_SPAN: Final = 90.0


@dataclass(frozen=True, slots=True)
class Stroke:
    """A line through points; ``filled``: a closed area."""

    points: tuple[tuple[float, float], ...]
    ink: Ink
    filled: bool = False


@dataclass(frozen=True, slots=True)
class Label:
    """A short text centred on a point; ``height`` in the dial's units."""

    x: float
    y: float
    text: str
    ink: Ink
    height: float = 11.0


Mark = Stroke | Label


@dataclass(frozen=True, slots=True)
class Dial:
    """What one dial shows; settings and turns in degrees, not folded.

    ``tolerance``: settings that still do, or None. ``stops``: the feed's stops, NaN where unknown.
    """

    from_behind: bool
    present: float
    turn: float
    step: float
    tolerance: tuple[float, float] | None = None
    stops: tuple[float, float] = (math.nan, math.nan)

    @property
    def target(self) -> float:
        """Where the V mark is to stand."""
        return self.present + self.turn

    def at(self, setting: float, radius: float) -> tuple[float, float]:
        """The point on the drawing at a setting and a radius."""
        angle = math.radians(setting if self.from_behind else -setting)
        return radius * math.sin(angle), -radius * math.cos(angle)

    def arc(self, first: float, last: float, radius: float) -> tuple[tuple[float, float], ...]:
        """Points along the ring from one setting to another, at most 3° apart."""
        pieces = max(1, math.ceil(abs(last - first) / 3.0))
        return tuple(self.at(first + (last - first) * i / pieces, radius) for i in range(pieces + 1))

    def band(self, first: float, last: float, inner: float, outer: float) -> tuple[tuple[float, float], ...]:
        """The outline of a piece of ring."""
        return self.arc(first, last, outer) + self.arc(last, first, inner)


def ring(dial: Dial) -> Iterator[Mark]:
    """What does not depend on the site: the ring, its marks and figures, and the plumb line."""
    yield Stroke(_comb(dial), "ring")
    for setting in range(-150, 181, 30):
        x, y = dial.at(setting, 116.0)
        yield Label(x, y, f"{setting}".replace("-", "\N{MINUS SIGN}"), "tick", 9.0)
    yield Stroke(((0.0, -86.0), (0.0, 86.0)), "plumb")


def _comb(dial: Dial) -> tuple[tuple[float, float], ...]:
    """Ring and marks in one line, which goes inwards and back at each mark: small files, fast pages."""
    step = dial.step if dial.step >= 2.0 else 5.0
    marks = {float(setting): 89.0 for setting in range(-180, 181, 30)}
    for k in range(-math.floor(180.0 / step), math.floor(180.0 / step) + 1):
        marks.setdefault(k * step, 94.0)
    points: list[tuple[float, float]] = []
    last = -180.0
    for setting in sorted(marks):
        points += dial.arc(last, setting, 100.0)
        points += [dial.at(setting, marks[setting]), dial.at(setting, 100.0)]
        last = setting
    return tuple(points)


def hands(dial: Dial) -> Iterator[Mark]:
    """What belongs to the site: stops, wrong side, tolerance, present mark, turn and target mark."""
    yield from _stops(dial)
    yield from _wrong_side(dial)
    if dial.tolerance is not None:
        low, high = dial.tolerance
        yield Stroke(dial.band(low, high, 101.5, 108.5), "tolerance", filled=True)
    yield Stroke((dial.at(dial.present, 0.0), dial.at(dial.present, 93.0)), "present")
    yield from _turn(dial)
    yield Stroke((dial.at(dial.target, -24.0), dial.at(dial.target, 90.0)), "target")
    tip = (dial.at(dial.target, 100.0), dial.at(dial.target - 4.5, 84.0), dial.at(dial.target + 4.5, 84.0))
    yield Stroke(tip, "target", filled=True)
    x, y = dial.at(dial.target, 130.0)
    if abs(x) > HALF_SIZE - 28.0:  # at the side the word would leave the picture: it stands above the tip
        x, y = math.copysign(HALF_SIZE - 28.0, x), y - 15.0
    yield Label(x, y, "TARGET", "target", 11.0)


def _stops(dial: Dial) -> Iterator[Mark]:
    low, high = dial.stops
    if not (math.isfinite(low) and math.isfinite(high)) or high - low >= 360.0:
        return
    yield Stroke(dial.band(high, low + 360.0, 72.0, 93.0), "stop", filled=True)
    x, y = dial.at((high + low + 360.0) / 2.0, 52.0)
    yield Label(x, y - 5.0, "behind", "stop", 9.0)
    yield Label(x, y + 5.0, "the stops", "stop", 9.0)


def _wrong_side(dial: Dial) -> Iterator[Mark]:
    if abs(dial.turn) < 0.05 or comes_to_the_same(dial.turn):
        return
    away = -math.copysign(1.0, dial.turn)
    start, end = dial.present + away * 2.0, dial.present + away * _FORBIDDEN_SPAN
    yield Stroke(dial.band(start, end, 72.0, 93.0), "wrong", filled=True)
    # Hatching, so that the side is told without colour too.
    settings = (start + (end - start) * k / 14.0 for k in range(15))
    ends = (((-2.0, 72.0), (2.0, 93.0)), ((2.0, 93.0), (-2.0, 72.0)))
    slanted = (dial.at(s + aside, r) for k, s in enumerate(settings) for aside, r in ends[k % 2])
    yield Stroke(tuple(slanted), "wrong")
    x, y = dial.at(dial.present + away * 48.0, 50.0)
    yield Label(x, y - 5.0, "WRONG", "wrong", 10.0)
    yield Label(x, y + 6.0, "WAY", "wrong", 10.0)


def _turn(dial: Dial) -> Iterator[Mark]:
    """The arrow from the present mark to the target mark."""
    if abs(dial.turn) < 0.05:
        return
    way = math.copysign(1.0, dial.turn)
    head = min(9.0, abs(dial.turn))
    neck = dial.target - way * head
    yield Stroke(dial.arc(dial.present, neck, 64.0), "turn")
    yield Stroke((dial.at(dial.target, 64.0), dial.at(neck, 57.0), dial.at(neck, 71.0)), "turn", filled=True)
