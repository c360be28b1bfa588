"""The links to both satellites from each place: views, terminal, ports, and each carrier's response."""

from __future__ import annotations

from functools import cached_property
from typing import Any

import numpy as np
from numpy.typing import NDArray

from geoskew import geometry
from geoskew.angles import fold
from geoskew.geometry import Array
from geoskew.link import Response
from geoskew.places import Places
from geoskew.scenario import Scenario
from geoskew.situation import carriers
from geoskew.situation.carriers import MIXED_DEG, Link, Moment, Neighbours, Path, Sky, Stand
from geoskew.situation.inputs import Inputs, prepare
from geoskew.situation.neighbours import interference
from geoskew.situation.ports import is_linear, port_offset
from geoskew.situation.sky import SkyModel
from geoskew.situation.views import View


class Links:
    """A scenario's satellites, terminals and carriers over places, up to the responses to a setting."""

    def __init__(self, scenario: Scenario, places: Places, inputs: Inputs | None = None) -> None:
        self.scenario = scenario
        self.places = places
        self.inputs = prepare(scenario) if inputs is None else inputs
        self._suits: dict[tuple[Stand, int], Array] = {}
        self._paths: dict[tuple[Stand, int], Path] = {}
        self._leaks: dict[tuple[Stand, int], Array] = {}
        self._neighbours: dict[tuple[Stand, int], Neighbours] = {}
        self._links: dict[tuple[Stand, bool, int], Link] = {}
        self._responses: dict[tuple[Stand, bool], list[Response]] = {}

    # Satellites -------------------------------------------------------------------------------

    @cached_property
    def before(self) -> View:
        """The satellite in service."""
        return View(self.scenario.outgoing, self.places, self.inputs.coverage_before)

    @cached_property
    def after(self) -> View:
        """The satellite that takes over."""
        return View(self.scenario.incoming, self.places, self.inputs.coverage_after)

    def view(self, moment: Moment) -> View:
        """The satellite that carries the traffic at a moment."""
        return self.before if moment == "before" else self.after

    @cached_property
    def usable_before(self) -> NDArray[np.bool_]:
        """Where the old satellite serves."""
        return self.before.usable(self.scenario.lowest_elevation_deg)

    @cached_property
    def usable_after(self) -> NDArray[np.bool_]:
        """Where the new satellite serves."""
        return self.after.usable(self.scenario.lowest_elevation_deg)

    @cached_property
    def seen_after(self) -> Array:
        """Setting that suits the new satellite in a dish on the old slot, degrees."""
        return self.after.seen_from(self.before)

    @cached_property
    def separation(self) -> Array:
        """Angle between the two lines of sight, degrees."""
        return geometry.separation(self.before.sight.direction, self.after.sight.direction)

    # Terminal ---------------------------------------------------------------------------------

    def terminal(self, key: str) -> Any:
        """A terminal's value at each place: its own where it has one, else the scenario's."""
        default = getattr(self.scenario.terminal, key)
        own = self.places.columns.get(key)
        return default if own is None else np.where(np.isnan(own), default, own)

    @cached_property
    def present(self) -> Array:
        """The present setting, degrees: measured where it was, else aligned to the old satellite."""
        aligned = self.before.skew
        measured = self.places.columns.get("setting_deg")
        if measured is None:
            return aligned
        return np.where(np.isnan(measured), aligned, fold(measured))

    @cached_property
    def port_offset(self) -> list[Array]:
        """Degrees to add, a carrier, to the angle that suits: 90 where the old port must serve it."""
        return port_offset(
            self.scenario.carriers_before, self.scenario.carriers_after, self.terminal("ports")
        )

    @cached_property
    def fixed(self) -> dict[Moment, list[float | None]]:
        """A carrier: None where its mismatch follows the setting, else the angle that always holds."""
        feed = [is_linear(carrier) for carrier in self.scenario.carriers_before]
        return {
            "before": [None if linear else 0.0 for linear in feed],
            "after": [
                (None if linear else 0.0) if is_linear(carrier) == linear else MIXED_DEG
                for carrier, linear in zip(self.scenario.carriers_after, feed, strict=True)
            ],
        }

    @cached_property
    def turning_helps(self) -> bool:
        """Whether any carrier is linear both before and after; else no setting is better than another."""
        return any(
            one is None and other is None
            for one, other in zip(self.fixed["before"], self.fixed["after"], strict=True)
        )

    @cached_property
    def common_offset(self) -> Array:
        """The port offset where all new carriers share it, else 0: added to skew to realign."""
        offsets = self.port_offset
        return np.minimum.reduce(np.broadcast_arrays(*offsets)) if offsets else np.zeros(())

    # Links ------------------------------------------------------------------------------------

    def carriers(self, moment: Moment) -> Any:
        """The carriers of a moment, in the scenario's order."""
        return self.scenario.carriers_before if moment == "before" else self.scenario.carriers_after

    @cached_property
    def sky(self) -> SkyModel:
        """Attenuation on the paths to both satellites."""
        return SkyModel(self)

    def off_axis(self, stand: Stand) -> Array:
        """Angle between the dish's axis and the satellite, pointing error included, degrees."""
        error = np.asarray(self.terminal("pointing_error_deg"), dtype=np.float64)
        return np.hypot(error, self.separation) if stand.stays else error

    def path(self, stand: Stand, number: int) -> Path:
        """The terms of carrier `number` that do not depend on the weather."""
        key = (stand, number)
        if key not in self._paths:
            view = self.view(stand.moment)
            self._paths[key] = carriers.path(
                self.carriers(stand.moment)[number],
                eirp=view.eirp,
                range_km=view.sight.range_m / 1000.0,
                off_axis=self.off_axis(stand),
                dish=self.terminal,
            )
        return self._paths[key]

    def link(self, stand: Stand, number: int, *, rain: bool) -> Link:
        """The link of carrier `number`, perfectly set, in clear sky or at the stated availability."""
        key = (stand, rain, number)
        if key not in self._links:
            self._links[key] = self.link_under(stand, number, self.sky.path(stand.moment, number, rain=rain))
        return self._links[key]

    def link_under(self, stand: Stand, number: int, sky: Sky) -> Link:
        """The link of carrier `number` with a perfectly set feed under a given sky."""
        carrier = self.carriers(stand.moment)[number]
        return carriers.link(carrier, self.path(stand, number), sky, dish=self.terminal)

    def suits(self, stand: Stand, number: int) -> Array:
        """The setting that suits carrier `number`, degrees; NaN where the satellite serves nobody.

        One and the same array for carriers that suit alike.
        """
        offset = self.port_offset[number]
        key = (stand, id(offset) if stand.moment == "after" else 0)
        if key not in self._suits:
            self._suits[key] = self._suit(stand, offset)
        return self._suits[key]

    def _suit(self, stand: Stand, offset: Array) -> Array:
        if stand.moment == "before":
            return np.where(self.usable_before, self.before.skew, np.nan)
        if stand.stays:
            return np.where(self.usable_before & self.usable_after, fold(self.seen_after + offset), np.nan)
        return np.where(self.usable_after, fold(self.after.skew + offset), np.nan)

    def responses(self, stand: Stand, *, rain: bool) -> list[Response]:
        """How each carrier's margin depends on the setting."""
        key = (stand, rain)
        if key not in self._responses:
            self._responses[key] = [
                self.response(stand, number, self.link(stand, number, rain=rain))
                for number in range(len(self.carriers(stand.moment)))
            ]
        return self._responses[key]

    def response(self, stand: Stand, number: int, terms: Link) -> Response:
        """How the margin of carrier `number` depends on the setting, for a link under some sky."""
        carrier = self.carriers(stand.moment)[number]
        phasors = self.scenario.decision.addition == "phasor"
        leak = carriers.with_rain(
            self._antenna_leak(stand, number), terms.sky.depolarisation, phasors=phasors
        )
        return carriers.response(
            carrier,
            terms,
            suits=self.suits(stand, number),
            leak=leak,
            phasors=phasors,
            fixed=self.fixed[stand.moment][number],
            neighbours=self._interference(stand, number),
        )

    def _antenna_leak(self, stand: Stand, number: int) -> Array:
        key = (stand, number)
        if key not in self._leaks:
            self._leaks[key] = carriers.antenna_leak(
                self.carriers(stand.moment)[number],
                satellite_db=self.view(stand.moment).isolation,
                dish=self.terminal,
                off_axis=self.off_axis(stand),
                phasors=self.scenario.decision.addition == "phasor",
            )
        return self._leaks[key]

    def _interference(self, stand: Stand, number: int) -> Neighbours:
        key = (stand, number)
        if key not in self._neighbours:
            self._neighbours[key] = interference(self, stand, number)
        return self._neighbours[key]
