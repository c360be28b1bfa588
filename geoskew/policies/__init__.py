"""The setting that serves both satellites, and its window.

A curve is a `Response` of one carrier at one moment, and a level that this moment is held to. Its
excess is its margin less that level. The shared setting maximises the least excess of all curves.
"""

from __future__ import annotations

from geoskew.policies.curves import Curve, held_to, least_excess
from geoskew.policies.shared import Shared, shared_setting

__all__ = ["Curve", "Shared", "held_to", "least_excess", "shared_setting"]
