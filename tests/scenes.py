"""A small scenario to start from, and changes put over it: tables merge key by key, lists replace."""

from __future__ import annotations

import copy
from collections.abc import Mapping
from typing import Any

import numpy as np

from geoskew.evaluate import evaluate
from geoskew.places import Places
from geoskew.scenario import Scenario, from_dict

BASE: dict[str, Any] = {
    "title": "Test",
    "outgoing": {"name": "Old", "longitude_deg": -66.2, "tilt_deg": 21.0, "eirp_dbw": 50.0},
    "incoming": {"name": "New", "longitude_deg": -66.2, "tilt_deg": 0.0, "eirp_dbw": 50.0},
    "carrier": {
        "polarisation": "V",
        "frequency_ghz": 11.95,
        "symbol_rate_mbaud": 27.5,
        "required_es_n0_db": 7.9,
    },
    "terminal": {"dish_m": 0.9},
    "region": {"bounds_deg": [-76.0, -56.0, -53.0, -17.0], "step_deg": 1.0},
}


def document(**changes: Any) -> dict[str, Any]:
    """The base with changes merged in; None takes a key away."""
    return _merged(copy.deepcopy(BASE), changes)


def _merged(base: dict[str, Any], changes: Mapping[str, Any]) -> dict[str, Any]:
    for key, value in changes.items():
        if value is None:
            base.pop(key, None)
        elif isinstance(value, Mapping) and isinstance(base.get(key), dict):
            _merged(base[key], value)
        else:
            base[key] = copy.deepcopy(value)
    return base


def scenario(**changes: Any) -> Scenario:
    """The scenario of `document`."""
    return from_dict(document(**changes))


def at(scene: Scenario, latitude: Any, longitude: Any, *names: str, **columns: Any) -> Any:
    """Values of layers at places in degrees, with columns of the site list: one layer's array, or a dict."""
    arrays = {key: np.asarray(value, dtype=np.float64) for key, value in columns.items()}
    found = evaluate(scene, Places.of(longitude, latitude, columns=arrays), names)
    return found[names[0]] if len(names) == 1 else found
