"""On which days a crew can work ahead of the changeover, and on which at it.

A crew's working day is taken from 8 to 18 h of mean solar time at its base, so that a changeover in
the night falls between two days wherever on Earth the crew is (common practice, no source).
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from datetime import UTC, date, datetime, time, timedelta
from typing import Final, Protocol

_STARTS: Final = timedelta(hours=8)
_ENDS: Final = timedelta(hours=18)
# How long after the end of the window a crew's next working day still counts as the nearest one.
_NEAREST: Final = timedelta(days=3)
_WEEKDAYS: Final = ("mon", "tue", "wed", "thu", "fri", "sat", "sun")


class Base(Protocol):
    """Where a crew's days start and end, degrees."""

    @property
    def lon_deg(self) -> float:
        """Longitude, positive east."""
        ...

    @property
    def lat_deg(self) -> float:
        """Latitude, positive north."""
        ...


class Crew(Protocol):
    """What is asked of a crew: ``[[crew]]`` of a scenario, or anything alike."""

    @property
    def name(self) -> str:
        """Its name."""
        ...

    @property
    def base(self) -> Base:
        """Where its days start and end."""
        ...

    @property
    def visits_per_day(self) -> int:
        """The most visits on one day."""
        ...

    @property
    def km_per_day(self) -> float:
        """The most kilometres on one day."""
        ...

    @property
    def days(self) -> Sequence[str]:
        """Names of the weekdays it works on."""
        ...

    @property
    def off(self) -> Sequence[date]:
        """Calendar days it does not work."""
        ...


@dataclass(frozen=True, slots=True, order=True)
class CrewDay:
    """One working day of one crew, by the crew's number."""

    crew: int
    day: date


def _works(crew: Crew, day: date) -> bool:
    weekdays = {name.strip().lower()[:3] for name in crew.days}
    return _WEEKDAYS[day.weekday()] in weekdays and day not in set(crew.off)


def _hours(crew: Crew, day: date) -> tuple[datetime, datetime]:
    """Start and end of a working day in UTC."""
    midnight = datetime.combine(day, time(), tzinfo=UTC) - timedelta(hours=crew.base.lon_deg / 15.0)
    return midnight + _STARTS, midnight + _ENDS


def days_ahead(crew: Crew, number: int, *, first_day: date, changeover: datetime) -> Iterator[CrewDay]:
    """Working days from the first day that end before the changeover."""
    day = first_day
    while _hours(crew, day)[1] <= changeover:
        if _works(crew, day):
            yield CrewDay(number, day)
        day += timedelta(days=1)


def days_at(
    crew: Crew, number: int, *, first_day: date, changeover: datetime, overlap_hours: float
) -> Iterator[CrewDay]:
    """Working days that touch the hours in which both satellites work, else the nearest one after.

    The window runs from the changeover for ``overlap_hours``; a crew that works on no day of it takes
    its first working day after it, if that starts within three days.
    """
    ends = changeover + timedelta(hours=overlap_hours)
    day = max(first_day, changeover.date() - timedelta(days=1))
    found = False
    while True:
        start, end = _hours(crew, day)
        if start > ends and (found or start > ends + _NEAREST):
            return
        if end > changeover and _works(crew, day):
            found = True
            yield CrewDay(number, day)
        day += timedelta(days=1)
