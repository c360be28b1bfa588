"""The assessed table: what was given of each site, and every layer's value there."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any, Final

import numpy as np
from numpy.typing import NDArray

from geoskew.evaluate import NO_CLASS, available, evaluate
from geoskew.layers import REGISTRY
from geoskew.outputs.tables import ColumnInfo, layer_column
from geoskew.places import Places
from geoskew.scenario import Scenario
from geoskew.sites import SiteList
from geoskew.situation import Inputs, Situation
from geoskew.study.meanings import GIVEN
from geoskew.study.reasons import action_reasons
from geoskew.study.turns import turns_of

if TYPE_CHECKING:
    import pandas as pd

# Sites computed at once: enough to be quick, few enough to keep memory flat.
CHUNK: Final = 50_000


@dataclass(frozen=True)
class Assessed:
    """The table and what its columns are, in their order."""

    table: pd.DataFrame
    columns: tuple[ColumnInfo, ...]


def assess(scenario: Scenario, sites: SiteList, inputs: Inputs) -> Assessed:
    """Assess a site list.

    Returns
    -------
    Assessed
        Columns: id, lat, lon, reserved columns that were given, every layer, the weakest carriers,
        the turns to make, then the columns passed through. ``action`` by name; None or NaN where there is
        no value.
    """
    import pandas as pd

    names = available(scenario)
    parts = [_values(scenario, part, names, inputs) for part in chunks(sites.places, CHUNK)]
    layers = pd.DataFrame({name: np.concatenate([part[name] for part in parts]) for name in parts[0]})
    front, back = sites.front().reset_index(drop=True), sites.back()
    # The turns need what was given of a feed: its present setting, its stops, its ports.
    turns = turns_of(pd.concat([front, layers], axis=1), ports_of(scenario, sites.places))
    layers = layers.assign(turn_to_make=turns.turn, turn_remark=turns.remark)
    # A column of the list that bears a layer's name would stand twice: ours keeps the name.
    taken = set(layers.columns) | set(front.columns)
    back = back.rename(columns={name: f"given_{name}" for name in back.columns if name.lower() in taken})
    table = pd.concat([front, layers, back.reset_index(drop=True)], axis=1)
    return Assessed(table, tuple(_info(name, name in back.columns) for name in table.columns))


def chunks(places: Places, size: int) -> Iterator[Places]:
    """Parts of a list of places."""
    count = places.shape[0]
    for start in range(0, count, size):
        part = slice(start, start + size)
        yield Places(
            places.longitude[part],
            places.latitude[part],
            np.broadcast_to(places.height, (count,))[part],
            columns={
                name: np.broadcast_to(column, (count,))[part] for name, column in places.columns.items()
            },
        )


def ports_of(scenario: Scenario, places: Places) -> Any:
    """Ports of the places' feeds, (N,), or one number where no place has its own."""
    ports = places.columns.get("ports")
    default = scenario.terminal.ports
    return default if ports is None else np.where(np.isnan(ports), default, ports)


def _values(
    scenario: Scenario, places: Places, names: tuple[str, ...], inputs: Inputs
) -> dict[str, NDArray[Any]]:
    values: dict[str, NDArray[Any]] = {}
    for name, array in evaluate(scenario, places, names, inputs=inputs).items():
        record = REGISTRY[name]
        if record.kind == "category":
            words = dict(record.classes)
            values[name] = np.array([words.get(int(code)) for code in array], dtype=object)
        else:
            values[name] = np.where(array == NO_CLASS, np.nan, array) if record.is_class else array
    values["action_reason"] = action_reasons(scenario, values["action"], ports_of(scenario, places))
    if len(scenario.carriers_before) > 1:
        situation = Situation(scenario, places, inputs)
        for moment in ("before", "after"):
            carriers = np.array([one.name for one in situation.carriers(moment)], dtype=object)
            weakest = np.broadcast_to(situation.weakest(moment), places.shape)
            usable = situation.usable_before if moment == "before" else situation.usable_after
            names_of = np.array(carriers[weakest], dtype=object)
            names_of[~usable] = None
            values[f"weakest_{moment}"] = names_of
    return values


def _info(name: str, passed_through: bool) -> ColumnInfo:
    if passed_through:
        return ColumnInfo(name, "", "as given in the site list")
    if name in REGISTRY:
        return layer_column(REGISTRY[name])
    unit, meaning = GIVEN.get(name, ("", "as given in the site list"))
    return ColumnInfo(name, unit, meaning)
