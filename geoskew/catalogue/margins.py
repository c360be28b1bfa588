"""Layers of margins: each policy in clear sky and at the stated availability."""

from __future__ import annotations

from typing import Any

import numpy as np

from geoskew.angles import fold
from geoskew.geometry import Array
from geoskew.layers import layer
from geoskew.situation import Situation
from geoskew.situation.carriers import BEFORE, REALIGNED, UNTOUCHED

_MARGIN: dict[str, Any] = {"unit": "dB", "ramp": "margin", "limits": (-12.0, 12.0), "contour_step": 1.0}
_OLD: dict[str, Any] = {**_MARGIN, "of": ("before",)}
_NEW: dict[str, Any] = {**_MARGIN, "of": ("after",)}
_TWO: dict[str, Any] = {**_MARGIN, "of": ("before", "after")}
_RAIN: dict[str, Any] = {"needs": ("weather",)}


@layer(**_OLD, description="Margin before the changeover, present setting, clear sky")
def margin_before(situation: Situation) -> Array:
    return situation.margin(BEFORE, situation.present, rain=False)


@layer(**_TWO, description="Margin after the changeover when nothing is touched, clear sky")
def margin_untouched(situation: Situation) -> Array:
    return situation.margin(UNTOUCHED, situation.present, rain=False)


@layer(**_TWO, description="Margin before the changeover at the shared setting, clear sky")
def margin_shared_before(situation: Situation) -> Array:
    return situation.margin(BEFORE, situation.policy_shared, rain=False)


@layer(
    **_TWO, description="Margin after the changeover at the shared setting, dish on the old slot, clear sky"
)
def margin_shared_after(situation: Situation) -> Array:
    return situation.margin(UNTOUCHED, situation.policy_shared, rain=False)


@layer(
    **_NEW, description="Margin after the changeover with dish and feed set for the new satellite, clear sky"
)
def margin_realigned(situation: Situation) -> Array:
    return situation.margin(REALIGNED, situation.setting_realigned, rain=False)


@layer(
    **_TWO, description="Margin after the changeover when the shared turn was made the wrong way, clear sky"
)
def margin_reversed(situation: Situation) -> Array:
    return situation.margin(UNTOUCHED, situation.policy_reversed, rain=False)


@layer(
    **_OLD, **_RAIN, description="Margin before the changeover, present setting, at the stated availability"
)
def margin_before_rain(situation: Situation) -> Array:
    return situation.margin(BEFORE, situation.present, rain=True)


@layer(
    **_TWO,
    **_RAIN,
    description="Margin after the changeover when nothing is touched, at the stated availability",
)
def margin_untouched_rain(situation: Situation) -> Array:
    return situation.margin(UNTOUCHED, situation.present, rain=True)


@layer(
    **_TWO,
    **_RAIN,
    description="Margin before the changeover at the shared setting, at the stated availability",
)
def margin_shared_before_rain(situation: Situation) -> Array:
    return situation.margin(BEFORE, situation.policy_shared, rain=True)


@layer(
    **_TWO,
    **_RAIN,
    description="Margin after the changeover at the shared setting, dish on the old slot, at the stated availability",
)
def margin_shared_after_rain(situation: Situation) -> Array:
    return situation.margin(UNTOUCHED, situation.policy_shared, rain=True)


@layer(
    **_NEW,
    **_RAIN,
    description="Margin after the changeover with dish and feed set for the new satellite, at the stated availability",
)
def margin_realigned_rain(situation: Situation) -> Array:
    return situation.margin(REALIGNED, situation.setting_realigned, rain=True)


@layer(
    **_TWO,
    **_RAIN,
    description="Margin after the changeover when the shared turn was made the wrong way, at the stated availability",
)
def margin_reversed_rain(situation: Situation) -> Array:
    return situation.margin(UNTOUCHED, situation.policy_reversed, rain=True)


def _marked(situation: Situation) -> Array:
    """The shared setting moved to the nearest mark of the feed's scale, degrees.

    Marks lie at the scale's zero and whole steps from it; where the zero is not known a crew counts
    whole steps from the present setting. Nothing is folded before it is rounded: half a turn on, marks
    lie elsewhere where the step does not divide 180°.
    """
    step = np.asarray(situation.terminal("scale_step_deg"), dtype=np.float64)
    zero = situation.places.columns.get("scale_zero_deg")
    measured = situation.places.columns.get("setting_deg")
    start = (
        situation.present if measured is None else np.where(np.isnan(measured), situation.present, measured)
    )
    base = start if zero is None else np.where(np.isnan(zero), start, zero)
    turn = fold(situation.policy_shared - situation.present)
    return base + step * np.rint((start + turn - base) / step)


@layer(
    **_TWO,
    where="sites",
    description="Deciding margin before the changeover at the mark of the feed's scale nearest to the shared setting",
)
def margin_marked_before(situation: Situation) -> Array:
    return situation.deciding_margin(BEFORE, _marked(situation))


@layer(
    **_TWO,
    where="sites",
    description="Deciding margin after the changeover at the mark of the feed's scale nearest to the shared setting",
)
def margin_marked_after(situation: Situation) -> Array:
    return situation.deciding_margin(UNTOUCHED, _marked(situation))


_WRONG = "Margin after the changeover with the dish on the new slot when the realigning turn was made the wrong way"


@layer(**_TWO, where="sites", description=f"{_WRONG}, clear sky")
def margin_wrong_way(situation: Situation) -> Array:
    return situation.margin(REALIGNED, situation.policy_wrong_way, rain=False)


@layer(**_TWO, **_RAIN, where="sites", description=f"{_WRONG}, at the stated availability")
def margin_wrong_way_rain(situation: Situation) -> Array:
    return situation.margin(REALIGNED, situation.policy_wrong_way, rain=True)
