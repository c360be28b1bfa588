"""How one feed comes to its target: the direct turn, another way round, or the other port.

Settings are degrees from the upright V port, positive clockwise for a person behind the dish. An
axis of polarisation closes on itself after 180°, and the two ports are 90° apart: these are the
other ways to the same target. The feed's stops and a feed that is fixed rule ways out.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Final

# Slack at a stop, degrees: scales and stops are not known better.
_STOP_SLACK: Final = 0.5
# An exchange of ports is offered once it saves at least this much of the turn, degrees.
_WORTH_SAYING: Final = 1.0


@dataclass(frozen=True, slots=True)
class Feed:
    """What is known of a feed's mechanics: stops as settings (NaN: none known), and its ports."""

    low: float = math.nan
    high: float = math.nan
    fixed: bool = False
    ports: int = 1

    def reaches(self, setting: float) -> bool:
        """Whether the stops let the feed stand at this setting (not folded)."""
        above = not math.isfinite(self.low) or setting >= self.low - _STOP_SLACK
        below = not math.isfinite(self.high) or setting <= self.high + _STOP_SLACK
        return above and below


@dataclass(frozen=True, slots=True)
class Way:
    """One way to the target: the turn the crew makes, degrees, and whether leads change ports.

    ``short``: how far from the target a stop ends the turn, degrees.
    """

    present: float
    turn: float
    swap: bool = False
    short: float = 0.0

    @property
    def target(self) -> float:
        """Where the feed's V mark then stands: present + turn, not folded."""
        return self.present + self.turn


@dataclass(frozen=True, slots=True)
class Turning:
    """The way to take, a shorter one that exchanges the ports, and what stands against the direct one.

    ``way`` is None where no way is open; ``obstacle`` says why, or why the way is not the direct one.
    """

    way: Way | None
    shorter: Way | None = None
    obstacle: str = ""

    @property
    def is_direct(self) -> bool:
        """Whether the way's turn is the one of the assessed table."""
        return self.way is not None and not self.obstacle

    @property
    def keeps_side(self) -> bool:
        """Whether the feed is turned straight to the target, or to the stop before it."""
        return self.is_direct or (self.way is not None and self.way.short > 0.0)


def plan_turning(present: float, turn: float, feed: Feed, *, slack: tuple[float, float]) -> Turning:
    """Choose the way to ``present + turn``.

    Parameters
    ----------
    present, turn : float
        Degrees: the present setting, and the turn of the assessed table.
    feed : Feed
        Its stops and ports.
    slack : tuple of float
        The turns from the present setting that still do (the window), degrees: a turn that a stop ends
        inside is good enough, and a feed that cannot be turned may stay where an exchange of ports alone
        lands inside.

    Returns
    -------
    Turning
        Smallest open turn first; the direct one wins whenever it is open.
    """
    start = _within_stops(present, feed)
    if feed.fixed:
        return _fixed(start, feed, slack)
    ways = [Way(start, turn)] + [Way(start, turn + half) for half in (-180.0, 180.0)]
    swaps = [Way(start, turn + quarter, swap=True) for quarter in (-90.0, 90.0)] if feed.ports > 1 else []
    direct, *around = ways
    open_swaps = sorted((way for way in swaps if feed.reaches(way.target)), key=lambda way: abs(way.turn))
    if feed.reaches(direct.target):
        best = open_swaps[0] if open_swaps else None
        saves = best is not None and abs(best.turn) <= abs(turn) - _WORTH_SAYING
        return Turning(direct, best if saves else None)
    to_stop = _to_the_stop(start, turn, feed, slack)
    if to_stop is not None:
        return Turning(
            to_stop, obstacle="The feed's stop ends the turn short of the target, within what does."
        )
    others = open_swaps + [way for way in around if feed.reaches(way.target)]
    beyond = "The direct turn would run into the feed's stop."
    if not others:
        return Turning(None, obstacle="The feed's stops do not let it reach the target.")
    return Turning(min(others, key=lambda way: (abs(way.turn), way.swap)), obstacle=beyond)


def _to_the_stop(present: float, turn: float, feed: Feed, slack: tuple[float, float]) -> Way | None:
    """The direct turn as far as the stop, where that is inside the window."""
    target = present + turn
    stop = feed.low if target < feed.low else feed.high
    low, high = slack
    if not (math.isfinite(stop) and low <= stop - present <= high) or not feed.reaches(present):
        return None
    return Way(present, stop - present, short=abs(target - stop))


def _within_stops(present: float, feed: Feed) -> float:
    """The present setting on the half-turn that lies between the stops."""
    for setting in (present, present - 180.0, present + 180.0):
        if feed.reaches(setting):
            return setting
    return present


def _fixed(present: float, feed: Feed, slack: tuple[float, float]) -> Turning:
    """A feed that cannot be turned: only an exchange of ports may help."""
    low, high = slack
    fixed = "The feed is fixed in its holder and cannot be turned."
    if feed.ports > 1 and any(low <= quarter <= high for quarter in (-90.0, 90.0)):
        return Turning(Way(present, 0.0, swap=True), obstacle=fixed)
    return Turning(None, obstacle=fixed)


@dataclass(frozen=True, slots=True)
class Scale:
    """A feed's scale: degrees a mark, the setting at its zero, and which way its numbers grow.

    ``zero`` is NaN where it was not given; ``sense`` is +1 where the numbers grow clockwise seen from
    behind, −1 where they grow the other way.
    """

    step: float
    zero: float = math.nan
    sense: int = 1

    @property
    def is_known(self) -> bool:
        """Whether readings of this scale can be foretold."""
        return math.isfinite(self.zero)

    def reading(self, setting: float) -> float:
        """What the scale shows at a setting, degrees."""
        return self.sense * (setting - (self.zero if self.is_known else 0.0))

    def nearest_mark(self, setting: float, present: float) -> float:
        """The setting at the whole mark nearest to a setting, degrees.

        Where the scale's zero is not known, whole marks are counted from the present setting, as the
        margins of the assessed table are.
        """
        zero = self.zero if self.is_known else present
        return zero + round((setting - zero) / self.step) * self.step


_SENSES: Final = {
    **dict.fromkeys(("", "clockwise", "cw", "1", "+1", "1.0"), 1),
    **dict.fromkeys(("counter-clockwise", "counterclockwise", "anticlockwise", "ccw", "-1", "-1.0"), -1),
}


def sense_of_scale(text: str) -> int | None:
    """+1 or −1 for the words and signs of the column ``scale_sense``; None where they say neither."""
    return _SENSES.get(text.strip().lower().replace("\N{MINUS SIGN}", "-"))
