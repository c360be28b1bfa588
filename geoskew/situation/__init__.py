"""One scenario over one set of places: the only module that turns scenario objects into arrays."""

from __future__ import annotations

from geoskew.situation.core import Situation
from geoskew.situation.inputs import Inputs, prepare

__all__ = ["Inputs", "Situation", "prepare"]
