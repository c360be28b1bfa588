"""Who goes out and when, and the database that sites may come from."""

from __future__ import annotations

import re
from datetime import date
from pathlib import Path
from typing import Annotated

from pydantic import BeforeValidator, Field

from geoskew.scenario.parts import LonLat, Table
from geoskew.scenario.values import day, existing, nearest, number, refuse, shown, text, whole

WEEKDAYS = ("monday", "tuesday", "wednesday", "thursday", "friday", "saturday", "sunday")


def _weekdays(value: object) -> tuple[str, ...]:
    """Accept weekday names, whole or their first three letters; returned in the week's order."""
    rule = 'give weekday names such as ["monday", "tuesday"]'
    if not isinstance(value, list | tuple) or not value:
        raise refuse(f"{shown(value)} is not a list of weekdays: {rule}")
    found = []
    for word in value:
        lower = word.lower() if isinstance(word, str) else ""
        whole_name = next((name for name in WEEKDAYS if lower in (name, name[:3])), None)
        if whole_name is None:
            near = nearest(lower, WEEKDAYS)
            raise refuse(
                f"{shown(word)} is not a weekday: {rule}" + (f'; did you mean "{near}"?' if near else "")
            )
        found.append(whole_name)
    return tuple(name for name in WEEKDAYS if name in found)


def _days_off(value: object) -> tuple[date, ...]:
    """Accept a list of calendar days."""
    if not isinstance(value, list | tuple):
        raise refuse(f"{shown(value)} is not a list of days: give for example [2027-05-03, 2027-05-04]")
    return tuple(sorted({day(item) for item in value}))


def _variable(value: object) -> str:
    """Accept the name of an environment variable; an address may hold a password, so it is never shown."""
    if not isinstance(value, str):
        raise refuse(f"{shown(value)} is not text: give the name of an environment variable in quotes")
    if not re.fullmatch(r"[A-Za-z_][A-Za-z0-9_]*", value):
        raise refuse(
            "the value (not shown) is not the name of an environment variable: give the name of the one that "
            'holds the address, such as "SITES_DATABASE", never the address itself'
        )
    return value


def _query(value: object) -> str:
    """Accept the text of a query, which may stand on several lines."""
    if not isinstance(value, str) or not value.strip():
        raise refuse(f"{shown(value)} is not a query: give its text in quotes")
    return value


class Crew(Table):
    """A crew: where it starts, on which days it works and how much it can do on one."""

    name: Annotated[str, text("the crew's name")] = Field(description="the crew's name")
    base: LonLat = Field(description="where its days start and end: { lon_deg = -64.2, lat_deg = -31.4 }")
    visits_per_day: Annotated[int, whole("the most visits on one day", low=1, high=1000)] = Field(
        description="the most visits on one day"
    )
    km_per_day: Annotated[float, number("kilometres on one day", low=0, above=True, high=5000)] = Field(
        description="the most kilometres on one day"
    )
    days: Annotated[tuple[str, ...], BeforeValidator(_weekdays)] = WEEKDAYS[:5]
    off: Annotated[tuple[date, ...], BeforeValidator(_days_off)] = ()


class Visits(Table):
    """From which day visits are planned, and how distances on the road are taken."""

    first_day: Annotated[date, BeforeValidator(day)] = Field(
        description="the first day of work, such as 2027-05-03"
    )
    detour: Annotated[float, number("road over straight distance", low=1, high=5)] = 1.3
    distances: Annotated[Path, existing("a file of distances")] | None = None
    solver_seconds: Annotated[float, number("seconds", low=0, above=True, high=86400)] = 5.0


class Database(Table):
    """A database that the site list comes from (``query``) or that results go to (``table``)."""

    url_env: Annotated[str, BeforeValidator(_variable)] = Field(
        description="the name of the environment variable that holds the database's address"
    )
    query: Annotated[str, BeforeValidator(_query)] | None = None
    id: Annotated[str, text("the name of the column that identifies a site")] = "id"
    table: Annotated[str, text("the name of the table for results")] | None = None
    run: Annotated[str, text("the name that tells this study's rows in that table")] | None = None
