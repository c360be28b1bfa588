"""How far the plan hangs on its assumptions: the same sites judged with one assumption changed at a time."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import dataclass, replace
from typing import Any, Final

import numpy as np
from numpy.typing import NDArray

from geoskew.decision import ACTIONS, LEAVE, PRESET, UPGRADE
from geoskew.evaluate import evaluate
from geoskew.places import Places
from geoskew.scenario import Scenario
from geoskew.situation import Inputs
from geoskew.study.table import CHUNK, chunks

# A site counts as at risk where its action leaves it with a larger chance of failure than this, percent.
RISK_PERCENT: Final = 1.0
RESERVE_STEPS_DB: Final = (-1.0, -0.5, 0.5, 1.0)
CROSSED_STEPS_DB: Final = (-2.0, 2.0)
EIRP_STEPS_DB: Final = (-0.5, 0.5)
SPREAD_FACTORS: Final = (0.5, 2.0)
UNAVAILABLE_FACTORS: Final = (0.5, 2.0)
# What a scenario may state, percent.
LEAST_AVAILABLE, MOST_AVAILABLE = 95.0, 99.999

CHANCES: Final = ("fail_probability", "fail_shared_before", "fail_shared_after", "fail_realigned")
LAYERS: Final = ("action", *CHANCES)


@dataclass(frozen=True)
class Assumption:
    """One assumption changed: its name, the value it is given in words, and the scenario that has it.

    ``spread_factor`` scales the settings' spread, that of single sites included.
    """

    name: str
    value: str
    scenario: Scenario
    spread_factor: float = 1.0


@dataclass(frozen=True)
class Judged:
    """Sites under one assumption: codes of actions, and the chance that the action fails; both (N,)."""

    actions: NDArray[np.uint8]
    chance: NDArray[np.float64]


def assumptions(scenario: Scenario) -> Iterator[Assumption]:
    """The scenario as it is, then with one assumption changed at a time to a value that it may have."""
    yield Assumption("as planned", "", scenario)
    decision = scenario.decision
    for step in RESERVE_STEPS_DB:
        reserve = decision.reserve_db + step
        if reserve >= 0.0:
            changed = decision.model_copy(update={"reserve_db": reserve})
            yield Assumption("reserve", f"{reserve:g} dB", scenario.model_copy(update={"decision": changed}))
    for factor in SPREAD_FACTORS:
        yield Assumption("spread of settings", f"× {factor:g}", scenario, factor)
    yield from _crossed(scenario)
    for step in EIRP_STEPS_DB:
        yield Assumption(
            "EIRP of both satellites", f"{step:+g} dB", _stronger(scenario, step, "outgoing", "incoming")
        )
    for step in EIRP_STEPS_DB:
        yield Assumption("EIRP of the new satellite", f"{step:+g} dB", _stronger(scenario, step, "incoming"))
    if scenario.weather is not None and scenario.judged_in == "rain":
        yield from _weather(scenario)


def _crossed(scenario: Scenario) -> Iterator[Assumption]:
    """Crossed carriers weaker, stronger, away; or there with equal power where all were away."""
    name = "crossed polarisation"
    both = (*scenario.carriers_before, *scenario.carriers_after)
    if not any(one.crossed for one in both):
        yield Assumption(name, "in use, equal power", _carriers(scenario, lambda one: {"crossed": True}))
        return
    for step in CROSSED_STEPS_DB:
        changed = _carriers(scenario, lambda one, by=step: {"crossed_offset_db": one.crossed_offset_db + by})
        yield Assumption(name, f"{step:+g} dB", changed)
    yield Assumption(name, "empty", _carriers(scenario, lambda one: {"crossed": False}))


def _carriers(scenario: Scenario, update: Callable[..., dict[str, Any]]) -> Scenario:
    changed = {
        key: tuple(one.model_copy(update=update(one)) for one in getattr(scenario, key))
        for key in ("carriers_before", "carriers_after")
    }
    return scenario.model_copy(update=changed)


def _stronger(scenario: Scenario, decibels: float, *which: str) -> Scenario:
    changed = {}
    for key in which:
        satellite = getattr(scenario, key)
        changed[key] = satellite.model_copy(update={"eirp_offset_db": satellite.eirp_offset_db + decibels})
    return scenario.model_copy(update=changed)


def _weather(scenario: Scenario) -> Iterator[Assumption]:
    assert scenario.weather is not None  # for the type checker: the caller has seen it
    for factor in UNAVAILABLE_FACTORS:
        available = round(100.0 - factor * (100.0 - scenario.weather.availability_percent), 9)
        if LEAST_AVAILABLE <= available <= MOST_AVAILABLE:
            weather = scenario.weather.model_copy(update={"availability_percent": available})
            yield Assumption(
                "availability", f"{available:g} %", scenario.model_copy(update={"weather": weather})
            )
    clear = scenario.decision.model_copy(update={"judged_in": "clear"})
    yield Assumption("judged in", "clear sky", scenario.model_copy(update={"decision": clear}))


def judge(assumption: Assumption, places: Places, inputs: Inputs) -> Judged:
    """Actions of a list of places, and how likely each fails although its action was done.

    A place left alone counts with its present setting, one preset with the worse of the two moments,
    any other with dish and feed set for the new satellite.
    """
    parts = [evaluate(assumption.scenario, one, LAYERS, inputs=inputs) for one in _scaled(assumption, places)]
    found = {name: np.concatenate([part[name] for part in parts]) for name in LAYERS}
    actions = found["action"]
    untouched, before, after, realigned = (found[name] for name in CHANCES)
    chance = np.select(
        [actions == LEAVE, actions == PRESET], [untouched, np.maximum(before, after)], realigned
    )
    return Judged(actions.astype(np.uint8), np.asarray(chance, dtype=np.float64))


def _scaled(assumption: Assumption, places: Places) -> Iterator[Places]:
    factor = assumption.spread_factor
    for part in chunks(places, CHUNK):
        if factor == 1.0:
            yield part
            continue
        default = assumption.scenario.terminal.setting_spread_deg
        own = part.columns.get("setting_spread_deg", np.full(part.shape, np.nan))
        spread = factor * np.where(np.isnan(own), default, own)
        yield replace(part, columns={**part.columns, "setting_spread_deg": spread})


def sensitivity(
    scenario: Scenario,
    places: Places,
    inputs: Inputs,
    *,
    on_progress: Callable[[int, int], None] | None = None,
) -> list[dict[str, Any]]:
    """The table of sensitivity over a list of places.

    Returns
    -------
    list of dict
        A row an assumption, the plan itself first: ``assumption``, ``value``, ``sites_that_change``
        (another action than planned), ``at_risk`` (sites whose own action leaves a chance of failure
        above `RISK_PERCENT`, not counting those to upgrade or out of sight), and ``by_action``.
    """
    cases = list(assumptions(scenario))
    rows: list[dict[str, Any]] = []
    planned: NDArray[np.uint8] | None = None
    for number, case in enumerate(cases):
        if on_progress is not None:
            on_progress(number, len(cases))
        judged = judge(case, places, inputs)
        planned = judged.actions if planned is None else planned
        exposed = (judged.actions < UPGRADE) & (judged.chance > RISK_PERCENT)
        counts = {name: int(np.sum(judged.actions == code)) for code, name in ACTIONS}
        rows.append(
            {
                "assumption": case.name,
                "value": case.value,
                "sites_that_change": int(np.sum(judged.actions != planned)),
                "at_risk": int(np.sum(exposed)),
                "by_action": counts,
            }
        )
    if on_progress is not None:
        on_progress(len(cases), len(cases))
    return rows
