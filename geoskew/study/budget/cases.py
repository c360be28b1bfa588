"""The cases of a budget: a moment and a policy each, and why one may have no numbers."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final

import numpy as np

from geoskew.geometry import Array
from geoskew.situation import Situation
from geoskew.situation.carriers import BEFORE, REALIGNED, UNTOUCHED, Moment, Stand
from geoskew.study.budget.account import number


@dataclass(frozen=True)
class Case:
    """A moment and a policy, and the layers that hold its margin and its outage."""

    policy: str
    stand: Stand
    margin_layer: str
    outage_layer: str | None
    meaning: str

    @property
    def moment(self) -> Moment:
        """Whose carriers are received."""
        return self.stand.moment

    @property
    def needs(self) -> tuple[Moment, ...]:
        """The satellites without which there is no margin."""
        if self.stand == REALIGNED:
            return ("after",)
        return ("before",) if self.margin_layer == "margin_before" else ("before", "after")

    def setting(self, situation: Situation) -> Array:
        """The feed's setting under this policy, degrees."""
        if self.policy == "shared":
            return situation.policy_shared
        if self.policy == "reversed":
            return situation.policy_reversed
        return situation.setting_realigned if self.policy == "realigned" else situation.present


CASES: Final = (
    Case("untouched", BEFORE, "margin_before", "outage_before", "present setting, dish on the old slot"),
    Case("shared", BEFORE, "margin_shared_before", None, "shared setting, dish on the old slot"),
    Case(
        "untouched", UNTOUCHED, "margin_untouched", "outage_untouched", "present setting, dish left as it is"
    ),
    Case(
        "shared",
        UNTOUCHED,
        "margin_shared_after",
        "outage_shared_after",
        "shared setting, dish left as it is",
    ),
    Case("reversed", UNTOUCHED, "margin_reversed", None, "turn the wrong way, dish left as it is"),
    Case(
        "realigned",
        REALIGNED,
        "margin_realigned",
        "outage_realigned",
        "dish and feed set for the new satellite",
    ),
)


def why_not_served(situation: Situation, moment: Moment) -> str | None:
    """Why a satellite serves nothing at the place, in words; None where it stands high enough."""
    usable = situation.usable_before if moment == "before" else situation.usable_after
    if bool(np.all(usable)):
        return None
    view, lowest = situation.view(moment), situation.scenario.lowest_elevation_deg
    elevation = number(view.elevation)
    name = view.satellite.name
    if elevation < 0.0:
        return f"{name} is {-elevation:.2f}° below the horizon here"
    return f"{name} stands {elevation:.2f}° above the horizon here, below the lowest usable {lowest:g}°"


def why_no_numbers(situation: Situation, case: Case) -> str | None:
    """Why a case has no budget at the place, in words; None where it has one."""
    for moment in case.needs:
        reason = why_not_served(situation, moment)
        if reason is not None:
            return reason
    # The shared setting weighs the margins of both moments, the others need their own satellite's power.
    powers: tuple[Moment, ...] = case.needs if case.policy in ("shared", "reversed") else (case.moment,)
    for moment in powers:
        if np.isnan(number(situation.view(moment).eirp)):
            return f"the place is outside of the coverage of {situation.view(moment).satellite.name}"
    if not np.isfinite(number(case.setting(situation))):
        return "there is no such setting at this place"
    return None
