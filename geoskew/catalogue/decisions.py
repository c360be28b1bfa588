"""Layers of the decision: action, reserve, chance of failure."""

from __future__ import annotations

from typing import Any

import numpy as np
from numpy.typing import NDArray

from geoskew import decision
from geoskew.decision import Scattered
from geoskew.geometry import Array
from geoskew.layers import layer
from geoskew.situation import Situation
from geoskew.situation.carriers import BEFORE, REALIGNED, UNTOUCHED, Stand

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


@layer(
    **_FLAG,
    of=("before",),
    description="Whether even the best margin before the changeover is below the reserve",
)
def below_reserve_before(situation: Situation) -> NDArray[np.uint8]:
    return _below(situation.best_before, situation)


@layer(
    **_FLAG,
    of=("after",),
    description="Whether even the best margin after the changeover is below the reserve",
)
def below_reserve_after(situation: Situation) -> NDArray[np.uint8]:
    return _below(situation.best_after, situation)


def _below(best: Array, situation: Situation) -> NDArray[np.uint8]:
    below = (best < situation.scenario.decision.reserve_db).astype(np.uint8)
    return np.where(np.isnan(best), NO_VALUE, below).astype(np.uint8)


_CHANCE: dict[str, Any] = {"unit": "percent", "ramp": "loss", "limits": (0.0, 100.0), "contour_step": 10.0}
_TWO = ("before", "after")


@layer(
    **_CHANCE,
    of=_TWO,
    description="Chance that the untouched margin after the changeover is below zero, given the spread of settings",
)
def fail_probability(situation: Situation) -> Array:
    return _chance(situation, UNTOUCHED, situation.present)


@layer(
    **_CHANCE,
    of=_TWO,
    where="sites",
    description="Chance that the margin before the changeover is below zero about the shared setting, given the spread",
)
def fail_shared_before(situation: Situation) -> Array:
    return _chance(situation, BEFORE, situation.policy_shared)


@layer(
    **_CHANCE,
    of=_TWO,
    where="sites",
    description="Chance that the margin after the changeover is below zero about the shared setting, given the spread",
)
def fail_shared_after(situation: Situation) -> Array:
    return _chance(situation, UNTOUCHED, situation.policy_shared)


@layer(
    **_CHANCE,
    of=("after",),
    where="sites",
    description="Chance that the margin of a feed and dish set for the new satellite is below zero, given the spread",
)
def fail_realigned(situation: Situation) -> Array:
    return _chance(situation, REALIGNED, situation.setting_realigned)


def _chance(situation: Situation, stand: Stand, intended: Array) -> Array:
    return decision.fail_probability(
        situation.responses(stand, rain=situation.judged_in_rain),
        intended,
        spread_deg=situation.terminal("setting_spread_deg"),
        eirp_spread_db=situation.view(stand.moment).satellite.eirp_spread_db,
    )


_TOLERANCE: dict[str, Any] = {"unit": "deg", "ramp": "level", "of": _TWO, "where": "sites"}


@layer(
    **_TOLERANCE,
    limits=(0.0, 90.0),
    description="How far below the shared setting a feed may be left: down to the window's low end",
)
def tolerance_low(situation: Situation) -> Array:
    return situation.shared.turn - situation.shared.low


@layer(
    **_TOLERANCE,
    limits=(0.0, 90.0),
    description="How far above the shared setting a feed may be left: up to the window's high end",
)
def tolerance_high(situation: Situation) -> Array:
    return situation.shared.high - situation.shared.turn


# The chance of failure that `spread_needed` is held to, percent.
STATED_CHANCE_PERCENT = 1.0


@layer(
    **_TOLERANCE,
    limits=(0.0, decision.WIDEST_SPREAD_DEG),
    description=(
        f"Largest spread of settings (standard deviation) at which the shared setting fails in at most "
        f"{STATED_CHANCE_PERCENT:g} % before and after the changeover; {decision.WIDEST_SPREAD_DEG:g}: any, 0: none is small enough"
    ),
)
def spread_needed(situation: Situation) -> Array:
    if not situation.turning_helps:
        return np.full(situation.places.shape, np.nan)
    moments = [
        Scattered(
            situation.responses(stand, rain=situation.judged_in_rain),
            situation.view(stand.moment).satellite.eirp_spread_db,
        )
        for stand in (BEFORE, UNTOUCHED)
    ]
    return decision.widest_spread(moments, situation.policy_shared, percent=STATED_CHANCE_PERCENT)
