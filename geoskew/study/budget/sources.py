"""Where a value of the budget comes from, in a few words."""

from __future__ import annotations

from typing import Any, Final

import numpy as np

from geoskew import receiver
from geoskew.situation import Situation
from geoskew.situation.carriers import Moment
from geoskew.study.budget.account import number

DEFAULT: Final = "default"
_SIDES: Final[dict[Moment, str]] = {"before": "outgoing", "after": "incoming"}
# The patterns behind the names of `receive_mask`, with their editions.
_MASKS: Final = {"BO.1213": "ITU-R BO.1213-1", "S.465": "ITU-R S.465-6", "S.580": "ITU-R S.580-6"}


class Sources:
    """Names the sources of one situation's values."""

    def __init__(self, situation: Situation) -> None:
        self._situation = situation

    def own(self, column: str) -> bool:
        """Whether the place has its own value of a column of the site list."""
        column_values = self._situation.places.columns.get(column)
        return column_values is not None and not bool(np.isnan(number(column_values)))

    def terminal(self, key: str) -> str:
        """Of a terminal's value."""
        if self.own(key):
            return f"site list: {key}"
        given = key in self._situation.scenario.terminal.model_fields_set
        return f"scenario: terminal.{key}" if given else DEFAULT

    def satellite(self, moment: Moment, key: str) -> str:
        """Of a key of the moment's satellite."""
        given = key in self._situation.view(moment).satellite.model_fields_set
        return f"scenario: {_SIDES[moment]}.{key}" if given else DEFAULT

    def carrier(self, moment: Moment, number: int, key: str) -> str:
        """Of a key of a carrier; a value of its own at one moment is an override or what it stands over."""
        old, new = (self._situation.carriers(when)[number] for when in ("before", "after"))
        if key not in (old if moment == "before" else new).model_fields_set:
            return DEFAULT
        both = getattr(old, key) == getattr(new, key)
        return f"scenario: carrier.{key}" if both else f"scenario: carrier.{key} {moment} the changeover"

    def weather(self) -> str:
        """Of the percentage that attenuation is for."""
        stated = self._situation.scenario.weather
        return DEFAULT if stated is None else "scenario: weather.availability_percent"

    def eirp(self, moment: Moment) -> str:
        """Of the level that the moment's satellite sends towards the place."""
        view = self._situation.view(moment)
        satellite: Any = view.satellite
        if satellite.eirp_contours is not None:
            return f"contours: {satellite.eirp_contours.file.name}, field {satellite.eirp_contours.field}"
        if satellite.eirp_raster is not None:
            return f"raster: {satellite.eirp_raster.name}"
        if not satellite.beams:
            return f"scenario: {_SIDES[moment]}.eirp_dbw"
        which = int(number(view.strongest_beam[1]))
        of = f" {which + 1} of {len(satellite.beams)}" if len(satellite.beams) > 1 else ""
        beam = satellite.beams[max(which, 0)]
        return f"scenario: {_SIDES[moment]}.beam{of}, {beam.pattern} pattern, peak {beam.peak_dbw:g} dBW"

    def mask(self, frequency_ghz: float) -> str:
        """The receive pattern in use and its edition."""
        chosen = self._situation.terminal("receive_mask")
        name = receiver.mask_name(frequency_ghz) if chosen is None else str(chosen)
        return _MASKS[name]

    def height(self) -> str:
        """Of the place's height as the weather takes it; directions take 0 where it is not known."""
        return (
            "topography of ITU-R P.1511-2" if np.isnan(number(self._situation.places.height)) else "as given"
        )

    def required(self, moment: Moment, number: int) -> str:
        """Of the required Es/N0, with the table where a waveform was named."""
        carrier = self._situation.carriers(moment)[number]
        if carrier.modcod is None:
            return self.carrier(moment, number, "required_es_n0_db")
        if carrier.modcod.startswith("EN 300 421"):
            return f"{carrier.modcod}, its Eb/N0 less 0.8 dB, as Es/N0"
        return f"EN 302 307-1 Table 13, {carrier.modcod}"
