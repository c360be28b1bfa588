"""What a day sheet says of one stop, in words that name where to stand and which way to turn."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass, field
from datetime import datetime
from typing import TYPE_CHECKING, Any, Final

if TYPE_CHECKING:
    import pandas

# Columns of a day sheet: name, unit, meaning.
MEANINGS: Final = {
    "crew": "The crew that drives",
    "day": "Calendar day at the crew's base",
    "order": "Place in the order of driving, from 1",
    "id": "Identifier of the site",
    "name": "Name of the site, as given",
    "district": "District, as given",
    "access": "Access, as given",
    "action": "What is done there",
    "turn": "Turn of the feed from its present setting (deg), positive clockwise seen from behind the dish",
    "from_behind": "The turn for a person behind the dish who looks towards the satellite",
    "from_front": "The same turn for a person in front of the dish who looks into it",
    "turn_remark": "What goes with the turn: leads to exchange, a stop, or why there is no turn",
    "km_leg": "Road from the stop before or from the base, a night on the way included (km)",
    "lon": "Longitude, WGS 84 (deg)",
    "lat": "Latitude, WGS 84 (deg)",
    "weight": "How much the site counts, as given",
    "fail_probability": "Chance that the untouched site fails after the changeover (percent)",
    "reason": "Why the site is not reached in time",
}
# Columns of the table of days.
DAY_MEANINGS: Final = {
    "crew": MEANINGS["crew"],
    "day": MEANINGS["day"],
    "visits": "Stops of the day",
    "km": "Road of the day with the way out and home (km)",
    "base_lon": "Longitude of the base (deg)",
    "base_lat": "Latitude of the base (deg)",
    "start_lon": "Longitude where the day starts (deg)",
    "start_lat": "Latitude where the day starts (deg)",
    "end_lon": "Longitude where the day ends (deg)",
    "end_lat": "Latitude where the day ends (deg)",
    "night": "Where the night is spent: base or road",
}
_ORDER: Final = tuple(MEANINGS)

# Stands for the action on a day of a round without a visit.
DRIVE: Final = "drive"
DECIMALS: Final = 6


@dataclass(frozen=True)
class VisitSheets:
    """The tables of a plan of visits, and what all files of it say.

    ``visits``: crew, day (date), order, id, action, turn (degrees, NaN: none), km_leg, lon, lat and more;
    ``days``: crew, day, visits, km, base_*, start_*, end_* (lon, lat), night;
    ``unreached``: id, action, reason, lon, lat;
    ``changeover``: aware.
    """

    title: str
    changeover: datetime
    visits: pandas.DataFrame
    days: pandas.DataFrame
    unreached: pandas.DataFrame
    missing_crew_days: int = 0
    notes: Sequence[str] = field(default_factory=tuple)


def turn_words(turn: Any, *, from_behind: bool) -> str:
    """A turn in words for one standing place; empty where there is none.

    Examples
    --------
    >>> turn_words(10.5, from_behind=True), turn_words(10.5, from_behind=False)
    ('10.5° clockwise', '10.5° counter-clockwise')
    """
    if turn is None or not math.isfinite(turn):
        return ""
    if abs(turn) < 0.05:
        return "no turn"
    clockwise = (turn > 0) == from_behind
    return f"{abs(turn):.1f}° {'clockwise' if clockwise else 'counter-clockwise'}"


def stops(sheets: VisitSheets) -> pandas.DataFrame:
    """The visits with the turn in words, columns in the order of a day sheet."""
    table = sheets.visits.copy()
    turns = [float(turn) if turn is not None else math.nan for turn in table["turn"]]
    table["from_behind"] = [turn_words(turn, from_behind=True) for turn in turns]
    table["from_front"] = [turn_words(turn, from_behind=False) for turn in turns]
    return table[[name for name in _ORDER if name in table]]


def _with_driving_days(visits: pandas.DataFrame, days: pandas.DataFrame) -> pandas.DataFrame:
    import pandas

    idle = days[days["visits"] == 0]
    if idle.empty:
        return visits
    rows = pandas.DataFrame({"crew": idle["crew"], "day": idle["day"], "order": 0, "action": DRIVE})
    joined = pandas.concat([visits, rows], ignore_index=True)
    return joined.sort_values(["crew", "day", "order"], kind="stable", ignore_index=True)


def everyone(sheets: VisitSheets) -> pandas.DataFrame:
    """The visits in order of crew, day and driving, and behind them the sites that are not reached.

    A day spent driving alone has a row without a site.
    """
    import pandas

    table = _with_driving_days(stops(sheets), sheets.days).round(DECIMALS).astype(object)
    columns = [name for name in _ORDER if name in table or name == "reason"]
    lost = sheets.unreached.astype(object).reindex(columns=columns)
    return pandas.concat([table.reindex(columns=columns), lost], ignore_index=True)
