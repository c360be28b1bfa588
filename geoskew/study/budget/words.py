"""Turns, windows and outages in words. Whoever reads a turn is told where to stand."""

from __future__ import annotations

from typing import Final

from geoskew.situation.outage import LEAST_HOURS, MOST_HOURS
from geoskew.weather import HOURS_PER_YEAR

BEHIND: Final = "behind the dish looking towards the satellite"
IN_FRONT: Final = "in front of the dish looking into it"
# Where somebody may stand, and whether a positive turn is clockwise from there.
STANDING: Final = ((BEHIND, True), (IN_FRONT, False))
# Turns below this are none: a hundredth of a degree is beyond any feed's scale.
_SMALLEST_TURN_DEG: Final = 0.005


def outage(hours: float) -> str:
    """Hours a year as they are read: beyond the range of the rain method only on which side they lie.

    Examples
    --------
    >>> outage(12.345), outage(0.08766), outage(438.3), outage(8766.0)
    ('12.35', '< 0.09', '> 438', '8766')
    """
    tolerance = 1e-6
    if hours >= HOURS_PER_YEAR - tolerance:
        return f"{HOURS_PER_YEAR:.0f}"
    if hours <= LEAST_HOURS + tolerance:
        return f"< {LEAST_HOURS:.2f}"
    return f"> {MOST_HOURS:.0f}" if hours >= MOST_HOURS - tolerance else f"{hours:.2f}"


def _side(turn: float, *, behind: bool) -> str:
    return "clockwise" if (turn > 0.0) == behind else "counter-clockwise"


def turn(degrees: float | None) -> str:
    """A turn with both standing places.

    Examples
    --------
    >>> print(turn(-9.3))
    9.30° (behind the dish looking towards the satellite: counter-clockwise;
    in front of the dish looking into it: clockwise)
    """
    if degrees is None:
        return "no turn exists"
    if is_none(degrees):
        return "none: the feed is right as it is"
    behind, front = _side(degrees, behind=True), _side(degrees, behind=False)
    return f"{abs(degrees):.2f}° ({BEHIND}: {behind}; {IN_FRONT}: {front})"


def is_none(degrees: float) -> bool:
    """Whether a turn is too small to be made."""
    return abs(degrees) < _SMALLEST_TURN_DEG


def end(degrees: float, *, behind: bool) -> str:
    """A turn for somebody who stands at one place."""
    return "no turn" if is_none(degrees) else f"{abs(degrees):.2f}° {_side(degrees, behind=behind)}"


def window(low: float | None, high: float | None) -> str:
    """The window as turns from the present setting, with both standing places.

    Examples
    --------
    >>> print(window(-18.5, 2.0))
    behind the dish looking towards the satellite: 18.50° counter-clockwise to 2.00° clockwise;
    in front of the dish looking into it: 18.50° clockwise to 2.00° counter-clockwise
    >>> print(window(-90.0, 90.0))
    every setting is good
    """
    if low is None or high is None:
        return "none: no one setting keeps what both moments are held to"
    if low <= -90.0 and high >= 90.0:
        return "every setting is good"
    return "; ".join(
        f"{where}: {end(low, behind=behind)} to {end(high, behind=behind)}" for where, behind in STANDING
    )
