"""Rules that hold between several keys of a scenario, checked on the file's own tables.

Each check looks at what was written, whatever else is wrong with it, so that all problems come at once.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator
from datetime import UTC, date, datetime
from typing import Any, Final, TypeAlias

from geoskew.scenario.carrier import THRESHOLD_KINDS
from geoskew.scenario.ground import frequency_outside_rain_models
from geoskew.scenario.lines import Loc
from geoskew.scenario.overrides import entries
from geoskew.scenario.satellites import EIRP_KINDS, check_axes
from geoskew.scenario.values import shown

Fault: TypeAlias = tuple[Loc, str]
Document: TypeAlias = dict[str, Any]

_LINEAR: Final = ("V", "H")
_CIRCULAR: Final = ("L", "R")


def all_faults(document: Document, carriers: dict[str, list[Any]]) -> Iterator[Fault]:
    """Yield every rule that is broken; ``carriers`` are the merged tables by moment, before and after."""
    for check in _CHECKS:
        yield from check(document)
    yield from _one_kind_of_polarisation(carriers)
    yield from _carriers_within_rain_models(document, carriers)


def _one_kind_of_eirp(document: Document) -> Iterator[Fault]:
    """Each satellite has exactly one kind of EIRP, and an ellipse's larger width is its larger one."""
    for side in ("outgoing", "incoming"):
        satellite = document.get(side)
        if not isinstance(satellite, dict):
            continue
        given = [kind for kind in EIRP_KINDS if kind in satellite]
        if not given:
            yield (side,), "has no EIRP: give one of eirp_dbw, eirp_contours, eirp_raster or beam"
        for kind in given[1:]:
            yield (side, kind), f"{given[0]} is given too: keep one kind of EIRP"
        for place, beam in entries(satellite.get("beam"), (side, "beam")):
            if isinstance(beam, dict) and (message := check_axes(beam)):
                yield (*place, "minor_deg"), message


def _thresholds(document: Document) -> Iterator[Fault]:
    """A carrier, or an override of it, gives its threshold in one way."""
    for place in (("carrier",), ("outgoing", "carrier"), ("incoming", "carrier")):
        value: Any = document
        for key in place:
            value = value.get(key) if isinstance(value, dict) else None
        for where, table in entries(value, place):
            if isinstance(table, dict) and all(kind in table for kind in THRESHOLD_KINDS):
                yield (*where, "required_es_n0_db"), "modcod is given too: keep one of the two"


def _something_to_assess(document: Document) -> Iterator[Fault]:
    """There is a region or a site list, and the list has one source."""
    region, database = document.get("region"), document.get("database")
    has_region = "region" in document and (
        not isinstance(region, dict) or any(key != "lowest_elevation_deg" for key in region)
    )
    has_query = isinstance(database, dict) and "query" in database
    if not (has_region or has_query or "sites" in document):
        yield (
            (),
            "there is neither a [region] nor [sites]: add one of them, so that there is something to assess",
        )
    if has_query and "sites" in document:
        yield ("database", "query"), "[sites] names a file too: keep one source of the site list"


def _region_and_step(document: Document) -> Iterator[Fault]:
    """A region has one shape and one step that fits its coordinates."""
    region = document.get("region")
    if not isinstance(region, dict) or not any(key != "lowest_elevation_deg" for key in region):
        return
    place: Loc = ("region",)
    if "bounds_deg" in region and "outline" in region:
        yield (*place, "outline"), "bounds_deg is given too: keep one of the two"
    if "bounds_deg" not in region and "outline" not in region:
        yield place, "has no shape: give bounds_deg = [west, south, east, north] or outline"
    if "step_deg" in region and ("step_m" in region or "crs" in region):
        other = "step_m" if "step_m" in region else "crs"
        yield (*place, "step_deg"), f"{other} is given too: keep step_deg, or crs with step_m"
    elif "step_m" in region and "crs" not in region:
        yield (*place, "step_m"), 'needs crs = "EPSG:...", a projected system in metres; or give step_deg'
    elif "crs" in region and "step_m" not in region:
        yield (
            (*place, "crs"),
            "needs step_m, the size of a cell in metres; or leave crs out and give step_deg",
        )
    elif "step_deg" not in region and "step_m" not in region:
        yield place, "has no step: give step_deg, or crs with step_m"
    else:
        yield from _step_fits(region)


def _step_fits(region: Document) -> Iterator[Fault]:
    """A cell is not larger than the region."""
    bounds, step = region.get("bounds_deg"), region.get("step_deg")
    if not isinstance(step, int | float) or not isinstance(bounds, list) or len(bounds) != 4:
        return
    if not all(isinstance(edge, int | float) for edge in bounds):
        return
    west, south, east, north = bounds
    extent = min((east - west) % 360 or 360, north - south)
    if 0 < extent < step <= 30:
        yield (
            ("region", "step_deg"),
            f"{step:g} is larger than the region, {extent:g} across: give a smaller step",
        )


def _conditions(document: Document) -> Iterator[Fault]:
    """Margins in rain can be judged only with weather."""
    decision = document.get("decision")
    if isinstance(decision, dict) and decision.get("judged_in") == "rain" and "weather" not in document:
        yield (
            ("decision", "judged_in"),
            '"rain" needs [weather] with availability_percent: add it, or give "clear"',
        )


def _crews(document: Document) -> Iterator[Fault]:
    """Crews have names of their own."""
    seen: list[Any] = []
    for place, crew in entries(document.get("crew"), ("crew",)):
        name = crew.get("name") if isinstance(crew, dict) else None
        if name is not None and name in seen:
            yield (*place, "name"), f"{shown(name)} is the name of two crews: rename one"
        seen.append(name)


def _first_day(document: Document) -> Iterator[Fault]:
    """Visits begin before the changeover."""
    visits, changeover = document.get("visits"), document.get("changeover")
    first = visits.get("first_day") if isinstance(visits, dict) else None
    if (
        not isinstance(changeover, datetime)
        or changeover.tzinfo is None
        or not 1970 <= changeover.year <= 2200
    ):
        return
    last = changeover.astimezone(UTC).date()
    if isinstance(first, date) and not isinstance(first, datetime) and first > last:
        yield ("visits", "first_day"), f"{first} is after the changeover on {last}: give a day before it"


def _one_kind_of_polarisation(carriers: dict[str, list[Any]]) -> Iterator[Fault]:
    """At one moment all carriers are linear or all are circular."""
    for moment, tables in carriers.items():
        kinds = [table.get("polarisation") for table in tables if isinstance(table, dict)]
        if any(kind in _LINEAR for kind in kinds) and any(kind in _CIRCULAR for kind in kinds):
            first = kinds[0] in _LINEAR
            odd = next(i for i, kind in enumerate(kinds) if kind in (_CIRCULAR if first else _LINEAR))
            yield (
                (moment, odd, "polarisation"),
                f"{shown(kinds[odd])} among carriers such as {shown(kinds[0])}: linear and circular carriers "
                "at one moment need two feeds; make a scenario for each",
            )


def _carriers_within_rain_models(document: Document, carriers: dict[str, list[Any]]) -> Iterator[Fault]:
    """With weather, frequencies lie in the range of the rain model."""
    for moment, tables in carriers.items() if "weather" in document else ():
        for number, table in enumerate(tables):
            frequency = table.get("frequency_ghz") if isinstance(table, dict) else None
            if frequency_outside_rain_models(frequency):
                yield (
                    (moment, number, "frequency_ghz"),
                    f"{shown(frequency)} is above 55 GHz, where the rain model of ITU-R P.618 ends: "
                    "leave [weather] out",
                )


_CHECKS: Final[tuple[Callable[[Document], Iterator[Fault]], ...]] = (
    _one_kind_of_eirp, _thresholds, _something_to_assess, _region_and_step, _conditions, _crews, _first_day,
)  # fmt: skip
