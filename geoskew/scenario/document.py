"""From the tables of a scenario file to the tables of the model, with the way back for messages."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Any, Final

from pydantic import BaseModel

from geoskew.scenario import overrides
from geoskew.scenario.carrier import Carrier
from geoskew.scenario.fieldwork import Crew, Database, Visits
from geoskew.scenario.ground import Decision, Region, SitesTable, Terminal, Terrain, Weather
from geoskew.scenario.lines import Loc
from geoskew.scenario.parts import LonLat
from geoskew.scenario.satellites import Beam, EirpContours, Neighbour, Satellite
from geoskew.scenario.values import nearest, shown

_SIDES: Final = ("outgoing", "incoming")
_MOMENTS: Final = {"outgoing": "carriers_before", "incoming": "carriers_after"}
# Attributes of the model that stand under another key in the file.
_RENAMED: Final = {"neighbours": "neighbour", "crews": "crew", "beams": "beam"}


def _keys(model: type[BaseModel], *more: str) -> tuple[str, ...]:
    """Return the file's keys of a table."""
    return (*(_RENAMED.get(name, name) for name in model.model_fields), *more)


# Every table of the file by its path without indices, and its keys.
KNOWN: Final[dict[tuple[str, ...], tuple[str, ...]]] = {
    (): (
        "title", "changeover", "overlap_hours", "outgoing", "incoming", "carrier", "terminal", "region",
        "sites", "weather", "terrain", "decision", "neighbour", "crew", "visits", "database",
    ),
    **{(side,): _keys(Satellite, "carrier") for side in _SIDES},
    **{(side, "carrier"): _keys(Carrier) for side in _SIDES},
    **{(side, "aim"): _keys(LonLat) for side in _SIDES},
    **{(side, "eirp_contours"): _keys(EirpContours) for side in _SIDES},
    **{(side, "beam"): _keys(Beam) for side in _SIDES},
    **{(side, "beam", "aim"): _keys(LonLat) for side in _SIDES},
    ("carrier",): _keys(Carrier),
    ("terminal",): _keys(Terminal),
    ("region",): _keys(Region, "lowest_elevation_deg"),
    ("sites",): _keys(SitesTable),
    ("weather",): _keys(Weather),
    ("terrain",): _keys(Terrain),
    ("decision",): _keys(Decision),
    ("neighbour",): _keys(Neighbour),
    ("crew",): _keys(Crew),
    ("crew", "base"): _keys(LonLat),
    ("visits",): _keys(Visits),
    ("database",): _keys(Database),
}  # fmt: skip


@dataclass
class Prepared:
    """Tables as the model takes them, where each came from, and what was found wrong on the way."""

    values: dict[str, Any] = field(default_factory=dict)
    faults: list[tuple[Loc, str]] = field(default_factory=list)
    _carriers: dict[str, overrides.Merged] = field(default_factory=dict)
    _single: set[Loc] = field(default_factory=set)

    def place(self, loc: Loc) -> Loc:
        """Return the place in the file of a place in the model."""
        if loc[0] in self._carriers and len(loc) > 1:
            places = self._carriers[str(loc[0])].places[int(loc[1])]
            key = str(loc[2]) if len(loc) > 2 else ""
            return places.get(key, (*places[""], *([key] if key else [])))
        if loc[0] in _MOMENTS.values():
            return ("carrier",)
        if loc == ("lowest_elevation_deg",):
            return ("region", *loc)
        place: Loc = ()
        for part in loc:
            place = (*place, _RENAMED.get(part, part) if isinstance(part, str) else part)
            if isinstance(part, int) and place[:-1] in self._single:
                place = place[:-1]
        return place


def prepare(document: dict[str, Any]) -> Prepared:
    """Rearrange a parsed scenario file for the model; unknown keys are reported and left out."""
    prepared = Prepared()
    document = _known_only(document, (), (), prepared.faults)
    prepared.values = {
        key: value for key, value in document.items() if key not in ("carrier", "neighbour", "crew")
    }
    for side, moment in _MOMENTS.items():
        if "carrier" in document and not isinstance(document["carrier"], dict | list):
            prepared.values[moment] = document["carrier"]
        elif document.get("carrier"):
            merged = overrides.merge(document, side)
            prepared._carriers[moment] = merged
            prepared.faults += merged.faults
            prepared.values[moment] = merged.tables
        satellite = document.get(side)
        if isinstance(satellite, dict):
            prepared.values[side] = _satellite(satellite, side, prepared)
    for key in ("neighbour", "crew"):
        if key in document:
            prepared.values[key + "s"] = _numbered(document[key], key, prepared)
    _move_lowest_elevation(prepared.values)
    return prepared


def _known_only(
    table: dict[str, Any], path: tuple[str, ...], loc: Loc, faults: list[tuple[Loc, str]]
) -> dict[str, Any]:
    """Return a table without its unknown keys, and those of the tables within it."""
    kept: dict[str, Any] = {}
    for key, value in table.items():
        if key not in KNOWN[path]:
            faults.append(((*loc, key), _unknown(key, path)))
            continue
        below = (*path, key)
        if below not in KNOWN:
            kept[key] = value
        elif isinstance(value, dict):
            kept[key] = _known_only(value, below, (*loc, key), faults)
        elif isinstance(value, list):
            kept[key] = [
                _known_only(item, below, (*loc, key, number), faults) if isinstance(item, dict) else item
                for number, item in enumerate(value)
            ]
        else:
            kept[key] = value
    return kept


def _unknown(key: str, path: tuple[str, ...]) -> str:
    """Say that a key is not known, and which one may be meant."""
    where = f"[{'.'.join(path)}]" if path else "the top of the file"
    homes = [table for table, keys in KNOWN.items() if key in keys and len(table) < 2]
    if homes and len(homes) <= 2:
        home = " or ".join(
            f"[{table[0]}]" if table else "the top of the file, above the first [table]" for table in homes
        )
        return f"is not a key of {where}: it belongs in {home}"
    near = nearest(key, KNOWN[path])
    if near:
        return f"is not a known key of {where}: did you mean {near}?"
    return f"is not a known key of {where}: known are {', '.join(KNOWN[path])}"


def _satellite(table: dict[str, Any], side: str, prepared: Prepared) -> dict[str, Any]:
    """Return a satellite's table as the model takes it."""
    satellite = {_beam(key): value for key, value in table.items() if key != "carrier"}
    satellite.setdefault("name", f"{side} satellite")
    if isinstance(table.get("beam"), dict):
        prepared._single.add((side, "beam"))
    if "carrier" in table and not isinstance(table["carrier"], dict | list):
        prepared.faults.append(
            ((side, "carrier"), f"{shown(table['carrier'])} is not a table: give keys of a carrier")
        )
    return satellite


def _beam(key: str) -> str:
    """Return the model's name of a satellite's key."""
    return "beams" if key == "beam" else key


def _numbered(value: Any, key: str, prepared: Prepared) -> Any:
    """Return one or several tables as a list; those of neighbours without a name get their number."""
    if isinstance(value, dict):
        prepared._single.add((key,))
        value = [value]
    if not isinstance(value, list) or key != "neighbour":
        return value
    return [
        {"name": f"neighbour {number}", **item} if isinstance(item, dict) else item
        for number, item in enumerate(value, start=1)
    ]


def _move_lowest_elevation(values: dict[str, Any]) -> None:
    """Take the lowest elevation out of the region's table, which is no region when nothing else is in it."""
    region = values.get("region")
    if isinstance(region, dict) and "lowest_elevation_deg" in region:
        values["lowest_elevation_deg"] = region["lowest_elevation_deg"]
        values["region"] = {key: value for key, value in region.items() if key != "lowest_elevation_deg"}
        if not values["region"]:
            del values["region"]
