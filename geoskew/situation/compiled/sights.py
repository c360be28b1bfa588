"""Both satellites from a block of places, by compiled loops: only what the wanted layers need."""

from __future__ import annotations

from collections.abc import Collection
from functools import cached_property
from typing import Any

import numpy as np
from numpy.typing import NDArray

from geoskew import receiver
from geoskew.geometry import Array
from geoskew.kernels import powers, sights
from geoskew.link import ratio
from geoskew.places import Places
from geoskew.polarisation import power_sum
from geoskew.scenario import Scenario
from geoskew.situation.carriers import Moment, Stand
from geoskew.situation.compiled.terms import Curves, dish_of, gas_terms, power_terms
from geoskew.situation.core import Situation
from geoskew.situation.inputs import Inputs
from geoskew.weather.grids import clear_zenith_over

_GEOMETRY = ("azimuth", "elevation", "range", "skew")
# Beyond this the receive patterns have steps, which a table would smear.
_WIDEST_RAD = np.deg2rad(40.0)
_TABLE = 16384


class Sights(Situation):
    """The directions of a situation from kernels. Radians within, degrees in what is stored."""

    def __init__(
        self, scenario: Scenario, places: Places, inputs: Inputs | None, wanted: Collection[str]
    ) -> None:
        super().__init__(scenario, places, inputs)
        self.wanted = frozenset(wanted)

    @cached_property
    def known(self) -> frozenset[str]:
        """Layers that the loops give."""
        from geoskew.situation.compiled.layers import LAYERS

        return frozenset(LAYERS)

    @cached_property
    def _tables(self) -> sights.Ground:
        places = self.places
        height = np.broadcast_to(places.geometric_height, np.broadcast_shapes(places.height.shape, (1, 1)))
        return sights.ground(places.longitude, places.latitude, height)

    def _needed(self, moment: Moment) -> set[str]:
        """What is wanted of a satellite: layers to be stored, and what other layers are made of."""
        plain = {f"{name}_{which}" for name in _GEOMETRY for which in ("before", "after")} | {"seen_after"}
        names = {name for name in _GEOMETRY if f"{name}_{moment}" in self.wanted}
        # Wherever a layer has no value below the lowest elevation.
        names.add("sine")
        if self.wanted - plain:
            names |= {"distance", "radians"}
        if "seen_after" in self.wanted and moment == "after":
            names.add("radians")
        return names

    @cached_property
    def _looks(self) -> dict[Moment, dict[str, NDArray[Any]]]:
        first, second = self._needed("before"), self._needed("after")
        if self.scenario.slots_differ:
            return {"before": self._look("before", first), "after": self._look("after", second)}
        alike = (first | second) - {"skew", "radians"}
        before = self._look("before", first | alike)
        after = self._look("after", second - alike)
        return {"before": before, "after": {**{name: before[name] for name in alike}, **after}}

    def _look(self, moment: Moment, names: set[str]) -> dict[str, NDArray[Any]]:
        shape = self.places.shape
        made: dict[str, NDArray[Any]] = {
            name: np.empty(shape, dtype=np.float32 if name in _GEOMETRY else np.float64) for name in names
        }
        single = [made.get(name, sights.NOT_WANTED_SINGLE) for name in _GEOMETRY]
        double = [made.get(name, sights.NOT_WANTED) for name in ("distance", "sine", "radians")]
        if made:
            sights.look(*self._tables, self.view(moment).position, self._frame(moment), *single, *double)
        return made

    def _frame(self, moment: Moment) -> Array:
        """E-vector of the V axis on the beam axis, and that axis."""
        view = self.view(moment)
        angle = np.deg2rad(view.satellite.tilt_deg)
        return np.array([np.cos(angle) * view.frame.top - np.sin(angle) * view.frame.right, view.frame.axis])

    def stored(self, name: str, moment: Moment) -> NDArray[Any]:
        """A layer of geometry: degrees, or km."""
        return self._looks[moment][name]

    def skew_radians(self, moment: Moment) -> Array:
        """Skew, radians."""
        return self._looks[moment]["radians"]

    @cached_property
    def _across(self) -> tuple[Array, Array]:
        """Setting that suits the new satellite in a dish on the old slot, and angle between the slots."""
        seen, apart = np.empty((2, *self.places.shape))
        dish, other = self.before.position, self.after.position
        sights.look_across(*self._tables, dish, other, self._frame("after"), seen, apart)
        return seen, apart

    @cached_property
    def seen_radians(self) -> Array:
        """Setting that suits the new satellite in a dish on the old slot, radians."""
        return self._across[0] if self.scenario.slots_differ else self.skew_radians("after")

    @cached_property
    def usable_before(self) -> NDArray[np.bool_]:
        """Where the old satellite serves."""
        return self._usable("before")

    @cached_property
    def usable_after(self) -> NDArray[np.bool_]:
        """Where the new satellite serves."""
        return self._usable("after")

    def _usable(self, moment: Moment) -> NDArray[np.bool_]:
        least = np.sin(np.deg2rad(self.scenario.lowest_elevation_deg))
        return np.asarray(self._looks[moment]["sine"] >= least)

    # Clear sky --------------------------------------------------------------------------------

    @cached_property
    def _zenith(self) -> tuple[tuple[float, ...], Array]:
        """Frequencies of all carriers, and gas towards the zenith at each, (frequency, H, W)."""
        both = (*self.scenario.carriers_before, *self.scenario.carriers_after)
        frequencies = tuple(sorted({carrier.frequency_ghz for carrier in both}))
        places = self.places
        where = (places.longitude, places.latitude, places.height)
        return frequencies, clear_zenith_over(*where, frequencies_ghz=frequencies)

    def clear_curves(self, stand: Stand) -> Curves:
        """All carriers in clear sky, in a dish on the satellite they come from."""
        moment = stand.moment
        carriers = self.carriers(moment)
        frequencies, zenith = self._zenith
        look = self._looks[moment]
        noise = np.empty((len(carriers), *self.places.shape))
        terms = np.array([gas_terms(carrier, self.terminal) for carrier in carriers])
        eirp = np.ascontiguousarray(np.atleast_2d(self.view(moment).eirp))
        which = np.array([frequencies.index(carrier.frequency_ghz) for carrier in carriers])
        powers.clear_noise(look["distance"], look["sine"], eirp, zenith, which, terms, noise)
        error = np.asarray(self.terminal("pointing_error_deg"), dtype=np.float64)
        satellite = self._satellite_leak(moment)
        leaks = [satellite + self._terminal_leak(carrier, error) for carrier in carriers]
        return Curves(noise, np.stack(leaks), power_terms(carriers))

    def _satellite_leak(self, moment: Moment) -> Array:
        return np.ascontiguousarray(np.atleast_2d(power_sum(self.view(moment).isolation)))

    def _terminal_leak(self, carrier: Any, off_axis: Array) -> Array:
        isolation = receiver.isolation_off_axis(
            off_axis,
            isolation_db=self.terminal("isolation_db"),
            diameter_m=self.terminal("dish_m"),
            frequency_ghz=carrier.frequency_ghz,
        )
        return power_sum(isolation)

    @property
    def within_tables(self) -> bool:
        """Whether the slots are close enough for `untouched_curves`."""
        return not self.scenario.slots_differ or bool(np.nanmax(self._across[1]) < _WIDEST_RAD)

    def untouched_curves(self, aimed: Curves) -> Curves:
        """All new carriers in clear sky in a dish that stays on the old slot, from those in an aimed one.

        Loss and leak off the dish's axis are taken from tables over the angles that occur: they are smooth
        but for the joints of the patterns, and a step of the table is a fraction of 0.0001 degrees.
        """
        apart = self._across[1]
        nodes = np.linspace(np.nanmin(apart), np.nanmax(apart) + 1e-9, _TABLE)
        error = np.asarray(self.terminal("pointing_error_deg"), dtype=np.float64)
        off_axis = np.hypot(error, np.rad2deg(nodes))
        found: dict[float, tuple[Array, Array]] = {}
        noise, leak = np.empty(aimed.noise.shape), np.empty(aimed.noise.shape)
        for number, carrier in enumerate(self.carriers("after")):
            if carrier.frequency_ghz not in found:
                dish = dish_of(carrier, self.terminal)
                loss = receiver.wanted_gain_loss(off_axis, **dish) - receiver.wanted_gain_loss(error, **dish)
                tables = ratio(loss), self._terminal_leak(carrier, off_axis)
                found[carrier.frequency_ghz] = self._looked_up(nodes, *tables)
            factor, terminal = found[carrier.frequency_ghz]
            np.multiply(aimed.noise[number], factor, out=noise[number])
            np.add(terminal, self._satellite_leak("after"), out=leak[number])
        return Curves(noise, leak, aimed.terms)

    def _looked_up(self, nodes: Array, *tables: Array) -> tuple[Array, Array]:
        made = np.empty((2, *self.places.shape))
        apart = self._across[1].ravel()
        for out, table in zip(made, tables, strict=True):
            per_step = (nodes.size - 1) / (nodes[-1] - nodes[0])
            powers.looked_up(apart, float(nodes[0]), float(per_step), table, out.ravel())
        return made[0], made[1]
