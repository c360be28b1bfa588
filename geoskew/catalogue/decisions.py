"""Layers of the decision: action, reserve, chance of failure."""

from __future__ import annotations

from typing import Any

import numpy as np
from numpy.typing import NDArray

from geoskew import decision
from geoskew.geometry import Array
from geoskew.layers import layer
from geoskew.situation import Situation
from geoskew.situation.carriers import UNTOUCHED

# Code of a flag or class without a value, in memory as in the rasters.
NO_VALUE = 255


@layer(
    unit="",
    description="What is to be done",
    ramp="classes",
    limits=(0.0, 5.0),
    kind="category",
    classes=decision.ACTIONS,
)
def action(situation: Situation) -> NDArray[np.uint8]:
    return situation.action


_FLAG: dict[str, Any] = {"unit": "", "ramp": "classes", "limits": (0.0, 1.0), "kind": "flag"}


@layer(**_FLAG, of=("before",), description="Whether even the best margin before the changeover is below the reserve")
def below_reserve_before(situation: Situation) -> NDArray[np.uint8]:
    return _below(situation.best_before, situation)


@layer(**_FLAG, of=("after",), description="Whether even the best margin after the changeover is below the reserve")
def below_reserve_after(situation: Situation) -> NDArray[np.uint8]:
    return _below(situation.best_after, situation)


def _below(best: Array, situation: Situation) -> NDArray[np.uint8]:
    below = (best < situation.scenario.decision.reserve_db).astype(np.uint8)
    return np.where(np.isnan(best), NO_VALUE, below).astype(np.uint8)


@layer(
    unit="percent",
    description="Chance that the untouched margin after the changeover is below zero, given the spread of settings",
    ramp="loss",
    limits=(0.0, 100.0),
    contour_step=10.0,
    of=("before", "after"),
)
def fail_probability(situation: Situation) -> Array:
    return decision.fail_probability(
        situation.responses(UNTOUCHED, rain=situation.judged_in_rain),
        situation.present,
        spread_deg=situation.terminal("setting_spread_deg"),
        eirp_spread_db=situation.scenario.incoming.eirp_spread_db,
    )
