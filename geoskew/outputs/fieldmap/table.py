"""The assessed table as columns of a packed block.

Layers become quantised numbers, everything else stays the text that it was. What the list, the
filters and the symbols need goes into a first block, the rest into a second one that the page opens
with the first card.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import TYPE_CHECKING, Any, Final

import numpy as np
from numpy.typing import NDArray

from geoskew.layers import REGISTRY
from geoskew.outputs.fieldmap.blocks import pack
from geoskew.outputs.fieldmap.content import ColumnFact, Route
from geoskew.outputs.fieldmap.quantise import degrees_as_integers, quantise, step_of

if TYPE_CHECKING:
    import pandas as pd

PLACE_DECIMALS: Final = 6
# Columns that list, filters and symbols work on; the rest waits for a card.
FIRST: Final = frozenset(
    {"id", "name", "district", "weight", "turn_shared", "turn_realigned", "turn_to_make", "crew", "day"}
)
# Numbers that are no layers, with their units.
NUMBERS: Final = {"turn_to_make": "deg"}


def text_codes(values: Sequence[str]) -> tuple[NDArray[Any], list[str]]:
    """Codes into a list of distinct texts, in the order of their first appearance."""
    order: dict[str, int] = {}
    codes = [order.setdefault(value, len(order)) for value in values]
    width = np.uint16 if len(order) <= 65_536 else np.uint32
    return np.asarray(codes, dtype=width), list(order)


def as_text(column: pd.Series) -> list[str]:
    """Cells as a reader would write them: empty for no value, whole numbers without a point."""
    out = []
    for value, missing in zip(column.tolist(), column.isna(), strict=True):
        if missing:
            out.append("")
        elif isinstance(value, float) and value.is_integer() and abs(value) < 1e15:
            out.append(str(int(value)))
        else:
            out.append(str(value))
    return out


def number_column(values: NDArray[Any], unit: str) -> tuple[NDArray[Any], dict[str, float]]:
    """Codes of a column of numbers and what turns them back."""
    codes, offset, step = quantise(values, step_of(unit))
    return codes, {"offset": offset, "step": step}


def first_margins(judged_in: str) -> frozenset[str]:
    """Names of the margins that the list can sort by."""
    ending = "_rain" if judged_in == "rain" else ""
    return frozenset({f"margin_untouched{ending}", f"margin_realigned{ending}"})


def packed_sites(table: pd.DataFrame, *, judged_in: str) -> tuple[str, str]:
    """First and second block of the assessed table.

    Parameters
    ----------
    table : DataFrame
        ``id``, ``lat``, ``lon``, then anything; one row a site.
    judged_in : {"clear", "rain"}
        Which margins decide; they go into the first block.

    Raises
    ------
    ValueError
        A column of the three is missing, or a coordinate is not a finite number.
    """
    missing = [name for name in ("id", "lat", "lon") if name not in table.columns]
    if missing:
        raise ValueError(f"the assessed table lacks the columns {missing}")
    places = table[["lat", "lon"]].to_numpy(dtype=np.float64)
    if not np.isfinite(places).all():
        raise ValueError("the assessed table holds a site without coordinates")
    early = FIRST | first_margins(judged_in)
    blocks = []
    for wanted in (True, False):
        names = [
            str(name)
            for name in table.columns
            if str(name) not in ("lat", "lon", "action") and (str(name) in early) == wanted
        ]
        arrays, texts, facts = _columns(table, names)
        if wanted:
            arrays["lat"] = degrees_as_integers(places[:, 0], decimals=PLACE_DECIMALS)
            arrays["lon"] = degrees_as_integers(places[:, 1], decimals=PLACE_DECIMALS)
            arrays["action"] = action_codes(table)
        blocks.append(pack(arrays, texts=texts, facts={"count": len(table), "columns": facts}))
    return blocks[0], blocks[1]


def _columns(
    table: pd.DataFrame, names: Sequence[str]
) -> tuple[dict[str, NDArray[Any]], dict[str, list[str]], list[dict[str, Any]]]:
    arrays: dict[str, NDArray[Any]] = {}
    texts: dict[str, list[str]] = {}
    facts: list[dict[str, Any]] = []
    for name in names:
        layer = REGISTRY.get(name)
        if layer is not None and not (layer.is_class and table[name].dtype == object):
            values = table[name].to_numpy(dtype=np.float64, na_value=np.nan)
            if layer.is_class:
                values = np.where(values == 255, np.nan, values)
            arrays[name], back = number_column(values, layer.unit if not layer.is_class else "dB")
            facts.append({"name": name, "kind": "number", "flag": layer.is_class, **back})
        elif name in NUMBERS and table[name].dtype.kind == "f":
            arrays[name], back = number_column(table[name].to_numpy(dtype=np.float64), NUMBERS[name])
            facts.append({"name": name, "kind": "number", "flag": False, **back})
        else:
            arrays[name], texts[name] = text_codes(as_text(table[name]))
            facts.append({"name": name, "kind": "text"})
    return arrays, texts, facts


def action_codes(table: pd.DataFrame) -> NDArray[np.uint8]:
    """Code of each site's action, 255 where it has none or the table has no such column."""
    if "action" not in table.columns:
        return np.full(len(table), 255, dtype=np.uint8)
    layer = REGISTRY.get("action")
    by_name = {name: code for code, name in (layer.classes if layer is not None else ())}
    column = as_text(table["action"])
    return np.asarray([by_name.get(cell, _digit(cell)) for cell in column], dtype=np.uint8)


def _digit(cell: str) -> int:
    return int(cell) if cell.isdigit() and int(cell) < 255 else 255


def column_facts(columns: Sequence[ColumnFact], names: Sequence[str]) -> dict[str, dict[str, str]]:
    """Unit and meaning of every column of the table, from the given facts or the registry."""
    known: Mapping[str, ColumnFact] = {column.name: column for column in columns}
    out = {}
    for name in names:
        if name in known:
            out[name] = {"unit": known[name].unit or "", "meaning": known[name].meaning or ""}
        elif name in REGISTRY:
            out[name] = {"unit": REGISTRY[name].unit, "meaning": REGISTRY[name].description}
    return out


def packed_visits(table: pd.DataFrame, routes: Sequence[Route]) -> str:
    """Which site is visited by whom, on which day, as what stop.

    Taken from the routes; a table with columns ``crew`` and ``day`` serves where there are none.
    """
    row_of = {str(identity): row for row, identity in enumerate(as_text(table["id"]))}
    crews: dict[str, int] = {}
    days: dict[str, int] = {}
    rows: list[tuple[int, int, int, int]] = []
    for route in routes:
        for stop, identity in enumerate(route.sites, start=1):
            if identity in row_of:
                crew, day = crews.setdefault(route.crew, len(crews)), days.setdefault(route.day, len(days))
                rows.append((row_of[identity], crew, day, stop))
    if not rows and {"crew", "day"} <= set(table.columns):
        pairs = zip(as_text(table["crew"]), as_text(table["day"]), strict=True)
        for row, (crew_name, day_name) in enumerate(pairs):
            if crew_name:
                crew, day = crews.setdefault(crew_name, len(crews)), days.setdefault(day_name, len(days))
                rows.append((row, crew, day, 0))
    found = np.asarray(rows, dtype=np.uint32).reshape(-1, 4)
    arrays = {name: found[:, at] for at, name in enumerate(("site", "crew", "day", "stop"))}
    return pack(arrays, texts={"crews": list(crews), "days": list(days)})
