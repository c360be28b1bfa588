"""What a meter at a site would show: Es/N0 out of the same links that give the margins."""

from __future__ import annotations

from dataclasses import replace
from functools import cached_property
from typing import TYPE_CHECKING, Final

import numpy as np
from numpy.typing import NDArray

from geoskew.fieldwork.reports import AIM_LOSSES_DB, Slot
from geoskew.geometry import Array
from geoskew.link import Response
from geoskew.places import Places
from geoskew.receiver import half_power_beamwidth
from geoskew.situation import Situation
from geoskew.situation.carriers import BEFORE, REALIGNED, UNTOUCHED, Stand

if TYPE_CHECKING:
    from geoskew.study.core import Study

# Below its threshold by this much, and below 0 dB, a receiver does not lock: such readings say no more.
NO_LOCK_DB: Final = 3.0


def no_lock(required_db: float) -> float:
    """Es/N0 below which readings are not told apart, dB."""
    return min(0.0, required_db - NO_LOCK_DB)


def aim_errors(study: Study, places: Places) -> list[Array]:
    """Pointing errors in degrees, (N,) each: the stated one, then those of a dish out of aim."""
    situation = Situation(study.scenario, places, study.inputs)
    frequency = study.scenario.carriers_before[0].frequency_ghz
    width = half_power_beamwidth(situation.terminal("dish_m"), frequency_ghz=frequency)
    stated = np.broadcast_to(
        np.asarray(situation.terminal("pointing_error_deg"), dtype=np.float64), places.shape
    )
    return [stated, *(np.hypot(stated, width * np.sqrt(loss / 12.0)) for loss in AIM_LOSSES_DB)]


def some(places: Places, numbers: NDArray[np.intp], **columns: Array) -> Places:
    """Some places of a list, with columns added or replaced (values of those places)."""
    count = places.shape[0]
    kept = {name: np.broadcast_to(column, (count,))[numbers] for name, column in places.columns.items()}
    return Places(
        places.longitude[numbers],
        places.latitude[numbers],
        np.broadcast_to(places.height, (count,))[numbers],
        columns=kept | columns,
    )


class SiteMeter:
    """The meter of some sites, in clear sky: crews do not read signals in the rain."""

    def __init__(self, study: Study, places: Places, at_changeover: NDArray[np.bool_]) -> None:
        self._study, self._places, self._at_changeover = study, places, at_changeover
        self._situations: dict[int, Situation] = {}

    @cached_property
    def _errors(self) -> list[Array]:
        return aim_errors(self._study, self._places)

    def _response(self, stand: Stand, carrier: int, aim: int) -> Response:
        if aim not in self._situations:
            everything = np.arange(self._places.shape[0])
            places = some(self._places, everything, pointing_error_deg=self._errors[aim])
            self._situations[aim] = Situation(self._study.scenario, replace(places), self._study.inputs)
        return self._situations[aim].responses(stand, rain=False)[carrier]

    def _es_n0(self, stand: Stand, slot: Slot, setting: Array, aim: int) -> Array:
        response = self._response(stand, slot.carrier, aim)
        with np.errstate(invalid="ignore"):
            shown = response.margin(setting) + response.required_db
        return np.maximum(shown, no_lock(response.required_db))

    def __call__(self, slot: Slot, setting: Array, *, aim: int, stays: bool) -> Array:
        """Es/N0 in dB at settings (..., N)."""
        if slot.moment == "before":
            return self._es_n0(BEFORE, slot, setting, aim)
        untouched = self._es_n0(UNTOUCHED, slot, setting, aim)
        if stays or not self._study.scenario.slots_differ or not self._at_changeover.any():
            return untouched
        return np.where(self._at_changeover, self._es_n0(REALIGNED, slot, setting, aim), untouched)
