"""Layers of outage: hours of an average year in which a policy's margin is below zero."""

from __future__ import annotations

from typing import Any

from geoskew.geometry import Array
from geoskew.layers import layer
from geoskew.situation import Situation
from geoskew.situation.carriers import BEFORE, REALIGNED, UNTOUCHED
from geoskew.situation.outage import outage_hours

_OUTAGE: dict[str, Any] = {
    "unit": "hours/year",
    "ramp": "loss",
    "limits": (0.0, 200.0),
    "needs": ("weather",),
}
_ENDS = "; 0.0877 stands for less, 438.3 for more, 8766 for a margin that clear sky already loses"


@layer(**_OUTAGE, of=("before",), description=f"Outage before the changeover at the present setting{_ENDS}")
def outage_before(situation: Situation) -> Array:
    return outage_hours(situation, BEFORE, situation.present)


@layer(
    **_OUTAGE,
    of=("before", "after"),
    description=f"Outage after the changeover when nothing is touched{_ENDS}",
)
def outage_untouched(situation: Situation) -> Array:
    return outage_hours(situation, UNTOUCHED, situation.present)


@layer(
    **_OUTAGE, of=("before", "after"), description=f"Outage after the changeover at the shared setting{_ENDS}"
)
def outage_shared_after(situation: Situation) -> Array:
    return outage_hours(situation, UNTOUCHED, situation.policy_shared)


@layer(
    **_OUTAGE,
    of=("after",),
    description=f"Outage after the changeover with dish and feed set for the new satellite{_ENDS}",
)
def outage_realigned(situation: Situation) -> Array:
    return outage_hours(situation, REALIGNED, situation.setting_realigned)
