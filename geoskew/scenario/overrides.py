"""Carriers of both moments: those of ``carrier``, with each satellite's own keys put over them."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Any

from geoskew import waveform
from geoskew.scenario.carrier import THRESHOLD_KINDS
from geoskew.scenario.lines import Loc
from geoskew.scenario.values import nearest, shown

_ONLY_NAME = "carrier"


@dataclass
class Merged:
    """The carriers of one moment as tables, where each of their keys was given, and what is wrong."""

    tables: list[Any] = field(default_factory=list)
    places: list[dict[str, Loc]] = field(default_factory=list)
    faults: list[tuple[Loc, str]] = field(default_factory=list)


def entries(value: Any, place: Loc) -> list[tuple[Loc, Any]]:
    """Return one table or an array of tables as a list, each with its place; nothing for anything else."""
    if isinstance(value, list):
        return [((*place, number), item) for number, item in enumerate(value)]
    return [(place, value)] if isinstance(value, dict) else []


def merge(document: dict[str, Any], side: str) -> Merged:
    """Return the carriers of the moment of satellite ``side``, its overrides applied key by key."""
    merged = Merged()
    for place, table in entries(document.get("carrier"), ("carrier",)):
        plain = dict(table) if isinstance(table, dict) else table
        merged.tables.append(plain)
        merged.places.append(
            {"": place} | {key: (*place, key) for key in plain} if plain is not table else {"": place}
        )
    names = _name(merged)
    satellite = document.get(side)
    given = satellite.get("carrier") if isinstance(satellite, dict) else None
    overrides = entries(given, (side, "carrier"))
    merged.faults += _doubled(overrides)
    # One without a name is for all carriers and gives way to one with a name.
    for place, override in sorted(
        overrides, key=lambda entry: isinstance(entry[1], dict) and "name" in entry[1]
    ):
        if not isinstance(override, dict):
            merged.faults.append((place, f"{shown(override)} is not a table: give keys of a carrier"))
            continue
        for number in _chosen(override, names, place, merged):
            _apply(override, merged.tables[number], place, merged.places[number])
    for table in merged.tables:
        _resolve(table)
    return merged


def _name(merged: Merged) -> list[str]:
    """Give the only carrier a name, report doubled and missing ones, and return all."""
    tables = [table for table in merged.tables if isinstance(table, dict)]
    if len(merged.tables) == 1 and tables:
        tables[0].setdefault("name", _ONLY_NAME)
    names: list[str] = []
    for table, places in zip(merged.tables, merged.places, strict=True):
        name = table.get("name") if isinstance(table, dict) else None
        if isinstance(table, dict) and "name" not in table:
            merged.faults.append(
                (places[""], 'has no name: with several carriers each needs one, name = "..."')
            )
            table["name"] = f"{_ONLY_NAME} {len(names) + 1}"
        elif isinstance(name, str) and name in names:
            merged.faults.append((places["name"], f"{shown(name)} is the name of two carriers: rename one"))
        names.append(name if isinstance(name, str) else "")
    return names


def _chosen(override: dict[str, Any], names: list[str], place: Loc, merged: Merged) -> list[int]:
    """Return which carriers an override is for: the one of its name, or all without a name."""
    if "name" not in override:
        return list(range(len(names)))
    name = override["name"]
    if isinstance(name, str) and name and name in names:
        return [names.index(name)]
    near = nearest(name, names) if isinstance(name, str) else None
    if names == [_ONLY_NAME]:
        remedy = "the only [carrier] has no name, so leave the name out"
    else:
        remedy = (
            f'did you mean "{near}"?' if near else "known are " + ", ".join(shown(known) for known in names)
        )
    if names:
        merged.faults.append(((*place, "name"), f"{shown(name)} is not the name of a carrier: {remedy}"))
    return []


def _doubled(overrides: list[tuple[Loc, Any]]) -> list[tuple[Loc, str]]:
    """Report keys that two overrides of the same name, or two without a name, both give."""
    faults: list[tuple[Loc, str]] = []
    taken: set[tuple[str, str]] = set()
    for place, override in overrides:
        for key, value in override.items() if isinstance(override, dict) else ():
            mark = (str(override.get("name", "")), key)
            if key != "name" and mark in taken:
                message = (
                    f"{shown(value)}: another override of the same carrier gives {key} too: give it once"
                )
                faults.append(((*place, key), message))
            taken.add(mark)
    return faults


def _apply(override: dict[str, Any], table: Any, place: Loc, places: dict[str, Loc]) -> None:
    """Put an override's keys over those of one carrier; a threshold of either kind replaces both."""
    if not isinstance(table, dict):
        return
    if any(kind in override for kind in THRESHOLD_KINDS):
        for kind in THRESHOLD_KINDS:
            table.pop(kind, None)
    for key, value in override.items():
        if key != "name":
            table[key] = value
            places[key] = (*place, key)


def _resolve(table: Any) -> None:
    """Fill the threshold in from a waveform's name; an unknown name is reported by its own check."""
    if isinstance(table, dict) and "modcod" in table and "required_es_n0_db" not in table:
        name = table["modcod"]
        known = isinstance(name, str) and name in waveform.names()
        table["required_es_n0_db"] = waveform.required_es_n0(name) if known else 0.0
