"""What is to be done at each place, and how likely a feed fails."""

from __future__ import annotations

from geoskew.decision.actions import (
    ACTIONS,
    LEAVE,
    NO_SIGHT,
    PRESET,
    RE_AIM,
    TURN_AT_CHANGEOVER,
    UPGRADE,
    action,
)
from geoskew.decision.chance import WIDEST_SPREAD_DEG, fail_probability, widest_spread
from geoskew.decision.powers import Scattered

__all__ = [
    "ACTIONS",
    "LEAVE",
    "NO_SIGHT",
    "PRESET",
    "RE_AIM",
    "TURN_AT_CHANGEOVER",
    "UPGRADE",
    "WIDEST_SPREAD_DEG",
    "Scattered",
    "action",
    "fail_probability",
    "widest_spread",
]
