"""Layers of settings and turns, and of what a feed's error costs."""

from __future__ import annotations

from typing import Any

import numpy as np

from geoskew import polarisation
from geoskew.angles import fold
from geoskew.geometry import Array
from geoskew.layers import layer
from geoskew.situation import Situation
from geoskew.situation.carriers import UNTOUCHED, Moment

BOTH = ("before", "after")
_SETTING: dict[str, Any] = {
    "unit": "deg",
    "ramp": "signed",
    "limits": (-90.0, 90.0),
    "contour_step": 5.0,
    "kind": "circular",
    "period": 180.0,
}
_WINDOW: dict[str, Any] = {
    "unit": "deg",
    "ramp": "signed",
    "limits": (-90.0, 90.0),
    "contour_step": 5.0,
    "of": BOTH,
}
_MISMATCH: dict[str, Any] = {
    "unit": "dB",
    "ramp": "loss",
    "limits": (0.0, 6.0),
    "contour_step": 0.5,
    "of": BOTH,
}
_DISCRIMINATION: dict[str, Any] = {
    "unit": "dB",
    "ramp": "level",
    "limits": (-10.0, 30.0),
    "contour_step": 2.0,
    "of": BOTH,
}


@layer(
    **_SETTING,
    of=BOTH,
    description="Feed setting that serves both satellites best, clockwise from the local vertical",
)
def setting_shared(situation: Situation) -> Array:
    return situation.setting_shared


@layer(**_SETTING, of=("after",), description="Feed setting for the new satellite in a re-aimed dish")
def setting_realigned(situation: Situation) -> Array:
    if not situation.turning_helps:
        return np.full(situation.places.shape, np.nan)
    return situation.setting_realigned


@layer(**_SETTING, of=BOTH, description="Turn from the present setting to the shared one, clockwise positive")
def turn_shared(situation: Situation) -> Array:
    return situation.shared.turn


@layer(
    **_SETTING, of=BOTH, description="Turn from the present setting to the realigned one, clockwise positive"
)
def turn_realigned(situation: Situation) -> Array:
    if not situation.turning_helps:
        return np.full(situation.places.shape, np.nan)
    return fold(situation.setting_realigned - situation.present)


@layer(
    **_WINDOW,
    description="Low end of the window of settings that serve both, as a turn from the present setting",
)
def window_low(situation: Situation) -> Array:
    return situation.shared.low


@layer(
    **_WINDOW,
    description="High end of the window of settings that serve both, as a turn from the present setting",
)
def window_high(situation: Situation) -> Array:
    return situation.shared.high


def _error(situation: Situation, moment: Moment, setting: Array) -> Array:
    """Angle between a setting and the one that suits the weakest carrier of the moment, degrees."""
    suits = (
        [situation.before.skew for _ in situation.carriers("before")]
        if moment == "before"
        else [situation.suits(UNTOUCHED, number) for number in range(len(situation.carriers("after")))]
    )
    errors = []
    for one, fixed in zip(suits, situation.fixed[moment], strict=True):
        errors.append(fold(setting - one) if fixed is None else np.full(situation.places.shape, fixed))
    return situation.of_weakest(moment, errors)


def _discrimination(situation: Situation, moment: Moment, setting: Array) -> Array:
    """Clear sky, with the stated on-axis isolations of that moment's satellite and of the terminal."""
    phasors = situation.scenario.decision.addition == "phasor"
    total = polarisation.amplitude_sum if phasors else polarisation.power_sum
    leak = total(situation.view(moment).satellite.isolation_db, situation.terminal("isolation_db"))
    error = _error(situation, moment, setting)
    # Linear into circular: the two polarisations arrive alike, whatever the isolations.
    mixed = [fixed not in (None, 0.0) for fixed in situation.fixed[moment]]
    value = polarisation.discrimination(error, leak, phasors=phasors)
    return np.where(situation.of_weakest(moment, [np.asarray(one) for one in mixed]), 0.0 * error, value)


@layer(
    **_MISMATCH,
    description="Loss of the wanted carrier by cos² of the feed's error alone, after the changeover, when nothing is touched",
)
def mismatch_untouched(situation: Situation) -> Array:
    return polarisation.mismatch(_error(situation, "after", situation.present))


@layer(
    **_MISMATCH,
    description="Loss of the wanted carrier by cos² of the feed's error alone, before the changeover, at the shared setting",
)
def mismatch_shared_before(situation: Situation) -> Array:
    return polarisation.mismatch(_error(situation, "before", situation.policy_shared))


@layer(
    **_MISMATCH,
    description="Loss of the wanted carrier by cos² of the feed's error alone, after the changeover, at the shared setting",
)
def mismatch_shared_after(situation: Situation) -> Array:
    return polarisation.mismatch(_error(situation, "after", situation.policy_shared))


@layer(
    **_MISMATCH,
    description="Loss of the wanted carrier by cos² of the feed's error alone, after the changeover, when the shared turn was made the wrong way",
)
def mismatch_reversed(situation: Situation) -> Array:
    return polarisation.mismatch(_error(situation, "after", situation.policy_reversed))


@layer(
    **_DISCRIMINATION,
    description="Wanted over crossed polarisation after the changeover when nothing is touched",
)
def discrimination_untouched(situation: Situation) -> Array:
    return _discrimination(situation, "after", situation.present)


@layer(
    **_DISCRIMINATION,
    description="Wanted over crossed polarisation before the changeover at the shared setting",
)
def discrimination_shared_before(situation: Situation) -> Array:
    return _discrimination(situation, "before", situation.policy_shared)


@layer(
    **_DISCRIMINATION,
    description="Wanted over crossed polarisation after the changeover at the shared setting",
)
def discrimination_shared_after(situation: Situation) -> Array:
    return _discrimination(situation, "after", situation.policy_shared)


@layer(
    **_DISCRIMINATION,
    description="Wanted over crossed polarisation after the shared turn was made the wrong way",
)
def discrimination_reversed(situation: Situation) -> Array:
    return _discrimination(situation, "after", situation.policy_reversed)
