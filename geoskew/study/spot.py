"""One place: every layer's value, and the link budget line by line."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import numpy as np

from geoskew.evaluate import NO_CLASS, available, evaluate
from geoskew.layers import REGISTRY
from geoskew.places import Places
from geoskew.scenario import Scenario, load
from geoskew.study.budget import budget, budget_as_text, words

Value = float | int | str | None


def spot_places(latitude: float, longitude: float, height: float | None) -> Places:
    """One place as Places."""
    return Places.of(longitude, latitude, np.nan if height is None else height)


def spot_values(
    scenario_path: Path, latitude: float, longitude: float, height: float | None
) -> dict[str, Value]:
    """Every layer's value at one place, None where there is none; `action` by its name."""
    scenario = load(scenario_path, sites_may_be_missing=True)
    values = evaluate(scenario, spot_places(latitude, longitude, height), available(scenario))
    return {name: plain(name, value[()]) for name, value in values.items()}


def plain(name: str, value: Any) -> Value:
    """A layer's value as JSON and tables carry it: None for no value, a class by its name."""
    record = REGISTRY[name]
    if record.is_class:
        code = int(value)
        if code == NO_CLASS:
            return None
        return dict(record.classes).get(code, code)
    number = float(value)
    return None if np.isnan(number) else round(number, 6)


def values_as_text(values: dict[str, Value]) -> str:
    """Name, value and unit, a line each."""
    width = max(map(len, values))
    lines = []
    for name, value in values.items():
        lines.append(f"{name:<{width}}  {_shown(name, value):>12} {REGISTRY[name].unit}".rstrip())
    return "\n".join(lines)


def _shown(name: str, value: Value) -> str:
    """A value for reading; an outage beyond the range of its method only by the side it lies on."""
    if value is None:
        return "no value"
    if not isinstance(value, float):
        return str(value)
    return words.outage(value) if REGISTRY[name].unit == "hours/year" else f"{value:.4f}"


def spot_budget(
    scenario_path: Path, latitude: float, longitude: float, height: float | None
) -> tuple[str, dict[str, Any]]:
    """The link budget as text and as data."""
    scenario: Scenario = load(scenario_path, sites_may_be_missing=True)
    data = budget(scenario, spot_places(latitude, longitude, height))
    return budget_as_text(data), data
