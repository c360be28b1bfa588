"""Attenuation on each path, in clear sky and at the stated availability."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from geoskew.situation.carriers import Moment, Sky

if TYPE_CHECKING:
    from geoskew.situation.core import Situation


class SkyModel:
    """The weather over a situation's places; each path is computed once."""

    def __init__(self, situation: Situation) -> None:
        self._situation = situation

    def path(self, moment: Moment, number: int, *, rain: bool) -> Sky:
        """Attenuation towards the satellite of a moment for one carrier, dB."""
        zero = np.zeros(())
        return Sky(zero, zero, zero, np.asarray(np.inf))
