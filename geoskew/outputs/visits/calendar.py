"""The plan as a calendar file (iCalendar, RFC 5545): one all-day entry a crew and day."""

from __future__ import annotations

import hashlib
from datetime import date, timedelta
from pathlib import Path
from typing import Any

from geoskew.outputs.visits.sheet import VisitSheets, stops


def write_calendar(part: Path, sheets: VisitSheets) -> None:
    """Write the file; the same plan gives the same bytes.

    UID is a digest of title, crew and day, so that a new plan replaces the entries of an old one in the
    reader's calendar. DTSTAMP is the changeover: a plan holds no time of writing.
    """
    from icalendar import Calendar

    calendar = Calendar()
    calendar.add("prodid", "-//geoskew//plan of visits//EN")
    calendar.add("version", "2.0")
    calendar.add("x-wr-calname", _line(f"Visits: {sheets.title}"))
    calendar.add_component(_changeover(sheets))
    by_day = dict(list(stops(sheets).groupby(["crew", "day"], sort=False)))
    for load in sheets.days.to_dict("records"):
        calendar.add_component(_day(sheets, load, by_day.get((load["crew"], load["day"]))))
    part.write_bytes(calendar.to_ical())


def _uid(sheets: VisitSheets, *words: object) -> str:
    digest = hashlib.sha256("\x1f".join([sheets.title, *map(str, words)]).encode()).hexdigest()
    return f"{digest[:32]}@geoskew.invalid"  # RFC 2606 keeps this name from ever being a real host


def _changeover(sheets: VisitSheets) -> Any:
    from icalendar import Event

    event = Event()
    event.add("uid", _uid(sheets, "changeover"))
    event.add("dtstamp", sheets.changeover)
    event.add("dtstart", sheets.changeover)
    event.add("summary", _line(f"Changeover: {sheets.title}"))
    event.add("transp", "TRANSPARENT")
    return event


def _day(sheets: VisitSheets, load: dict[Any, Any], visits: Any) -> Any:
    from icalendar import Event

    day: date = load["day"]
    event = Event()
    event.add("uid", _uid(sheets, load["crew"], day))
    event.add("dtstamp", sheets.changeover)
    event.add("dtstart", day)
    event.add("dtend", day + timedelta(days=1))
    count = f"{load['visits']} visit{'s' if load['visits'] != 1 else ''}"
    event.add("summary", _line(f"{load['crew']}: {count}, {load['km']:.0f} km"))
    lines = [] if visits is None else [_stop(row) for row in visits.to_dict("records")]
    if load.get("night") == "road":
        lines.append(f"Night on the road near {load['end_lat']:.3f}, {load['end_lon']:.3f}.")
    event.add("description", "\n".join(lines))
    event.add("categories", [_line(str(load["crew"]))])
    event.add("geo", (float(load["base_lat"]), float(load["base_lon"])))
    return event


def _stop(row: dict[Any, Any]) -> str:
    name = row.get("name")
    named = f" {name}" if isinstance(name, str) and name else ""
    words = f"{row['order']}. {row['id']}{named}: {row['action']}"
    if row["from_behind"]:
        words += f"; from behind the dish {row['from_behind']}, from in front {row['from_front']}"
    remark = row.get("turn_remark")
    if isinstance(remark, str) and remark:
        words += f"; {remark}"
    return _line(f"{words} ({row['lat']:.5f}, {row['lon']:.5f})")


def _line(text: str) -> str:
    """One line without control characters, which the format forbids."""
    return "".join(character if character.isprintable() else " " for character in text)
