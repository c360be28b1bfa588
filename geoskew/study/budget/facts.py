"""What stands at the head of a budget: directions, feed, window, action, outage."""

from __future__ import annotations

from typing import Any, Final

import numpy as np

from geoskew.evaluate import NO_CLASS, available, evaluate
from geoskew.layers import REGISTRY
from geoskew.places import Places
from geoskew.scenario import Scenario
from geoskew.situation import Situation
from geoskew.situation.carriers import Moment
from geoskew.study.budget import words
from geoskew.study.budget.account import finite
from geoskew.study.budget.cases import Case, why_not_served
from geoskew.study.budget.sources import Sources

_OF_SATELLITE: Final = {
    "azimuth_deg": "azimuth",
    "elevation_deg": "elevation",
    "range_km": "range",
    "skew_deg": "skew",
}
_FEED: Final = (
    "seen_after", "setting_shared", "turn_shared", "window_low", "window_high", "setting_realigned",
    "turn_realigned",
)  # fmt: skip
_DECISION: Final = ("action", "below_reserve_before", "below_reserve_after", "fail_probability")
_OUTAGES: Final = ("outage_before", "outage_untouched", "outage_shared_after", "outage_realigned")


class Facts:
    """The layers that the head shows, at one place."""

    def __init__(self, scenario: Scenario, places: Places, situation: Situation) -> None:
        self._situation, self._sources = situation, Sources(situation)
        wanted = [f"{name}_{moment}" for name in _OF_SATELLITE.values() for moment in ("before", "after")]
        can = set(available(scenario))
        names = [name for name in (*wanted, *_FEED, *_DECISION, *_OUTAGES) if name in can]
        self._values = evaluate(scenario, places, names, inputs=situation.inputs)

    def value(self, layer: str) -> float | str | int | None:
        """A layer's value at the place, unrounded; None where there is none, a class by its name."""
        values = self._values.get(layer)
        if values is None:
            return None
        record = REGISTRY[layer]
        if record.is_class:
            code = int(values.reshape(-1)[0])
            return None if code == NO_CLASS else dict(record.classes).get(code, code)
        return finite(values)

    def angle(self, layer: str) -> float | None:
        """The value of a layer that is a number."""
        value = self.value(layer)
        return float(value) if isinstance(value, int | float) else None

    def outage(self, case: Case) -> dict[str, Any]:
        """Hours a year of a case's outage as a number and as it is read, where there is a layer of it."""
        if case.outage_layer is None or case.outage_layer not in self._values:
            return {}
        hours = self.angle(case.outage_layer)
        return {"outage_hours": hours, "outage": None if hours is None else words.outage(hours)}

    def as_data(self) -> dict[str, Any]:
        """Place, satellites, feed and decision."""
        places = self._situation.places
        return {
            "place": {
                "latitude_deg": finite(places.latitude),
                "longitude_deg": finite(places.longitude),
                "height_m": finite(places.height),
            },
            "satellites": {"before": self._satellite("before"), "after": self._satellite("after")},
            "feed": self._feed(),
            "decision": {name: self.value(name) for name in _DECISION},
        }

    def _satellite(self, moment: Moment) -> dict[str, Any]:
        satellite = self._situation.view(moment).satellite
        return {
            "name": satellite.name,
            "longitude_deg": satellite.longitude_deg,
            "latitude_deg": satellite.latitude_deg,
            "tilt_deg": satellite.tilt_deg,
            **{key: self.value(f"{name}_{moment}") for key, name in _OF_SATELLITE.items()},
            "serves_nothing": why_not_served(self._situation, moment),
        }

    def _feed(self) -> dict[str, Any]:
        situation = self._situation
        measured = self._sources.own("setting_deg")
        served = measured or bool(np.all(situation.usable_before))
        return {
            "present_setting": finite(situation.present) if served else None,
            "present_setting_source": "site list: setting_deg"
            if measured
            else "aligned to the old satellite",
            **{name: self.value(name) for name in _FEED},
            "turn_shared_in_words": words.turn(self.angle("turn_shared")),
            "turn_realigned_in_words": words.turn(self.angle("turn_realigned")),
            "window_in_words": words.window(self.angle("window_low"), self.angle("window_high")),
            "separation_deg": finite(situation.separation),
        }
