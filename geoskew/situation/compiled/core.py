"""A situation whose heavy intermediates come from kernels."""

from __future__ import annotations

from collections.abc import Callable, Collection
from functools import cached_property, partial
from typing import Any

import numpy as np
from numpy.typing import NDArray

from geoskew import decision
from geoskew.geometry import Array
from geoskew.kernels import powers, settings
from geoskew.places import Places
from geoskew.policies import Shared
from geoskew.scenario import Scenario
from geoskew.situation.carriers import BEFORE, REALIGNED, UNTOUCHED, Moment, Stand
from geoskew.situation.compiled.sights import Sights
from geoskew.situation.compiled.terms import Curves, gas_terms, of_responses
from geoskew.situation.inputs import Inputs
from geoskew.situation.ports import is_linear

# Cosine of 2d in a perfectly set feed.
PERFECT = np.ones((1, 1))


def suits(places: Places) -> bool:
    """Whether the loops can take places: the rows of a two-dimensional array, all with one terminal."""
    return places.longitude.ndim == places.latitude.ndim == 2 and not places.columns


def _covered(scenario: Scenario) -> bool:
    """Whether the loops cover a scenario's carriers: linear, leaks that add as powers, no neighbours."""
    carriers = (*scenario.carriers_before, *scenario.carriers_after)
    return (
        not scenario.neighbours
        and scenario.decision.addition == "power"
        and all(is_linear(carrier) for carrier in carriers)
    )


class CompiledSituation(Sights):
    """A scenario over a block of a large grid; `wanted` are the layers that will be asked for."""

    def __init__(
        self, scenario: Scenario, places: Places, inputs: Inputs | None, wanted: Collection[str]
    ) -> None:
        super().__init__(scenario, places, inputs, wanted)
        self._curves: dict[tuple[Stand, bool], Curves] = {}
        self._worst: dict[tuple[Stand, bool, str], Array] = {}

    def maker(self, name: str) -> Callable[[], NDArray[Any]] | None:
        """What makes a layer by the loops; None: it is computed as always."""
        from geoskew.situation.compiled.layers import GEOMETRY, JUDGED

        if name in GEOMETRY:
            return partial(GEOMETRY[name], self)
        return partial(JUDGED[name], self) if name in JUDGED and self.in_reach else None

    @cached_property
    def offset(self) -> float:
        """The port offset that all new carriers share, degrees; NaN where they do not."""
        offsets = {float(np.asarray(one)) for one in self.port_offset}
        return offsets.pop() if len(offsets) == 1 else np.nan

    @cached_property
    def delta(self) -> Array:
        """From the setting that suits before to the one after in the untouched dish, radians; else NaN."""
        both = self.usable_before & self.usable_after
        angle: Array = self.seen_radians - self.skew_radians("before") + np.deg2rad(self.offset)
        angle -= np.pi * np.ceil((angle - 0.5 * np.pi) / np.pi)
        np.minimum(angle, 0.5 * np.pi, out=angle)
        if not both.all():
            angle[~both] = np.nan
        return angle

    def curves_of(self, stand: Stand, *, rain: bool) -> Curves:
        """All carriers' noise, leaks and terms; from the plain links in rain."""
        key = (stand, rain)
        if key not in self._curves:
            if rain:
                made = of_responses(self.responses(stand, rain=True), self.places.shape)
            elif stand == UNTOUCHED:
                aimed = self.curves_of(REALIGNED, rain=False)
                made = self.untouched_curves(aimed) if self.scenario.slots_differ else aimed
            else:
                made = self.clear_curves(stand)
            self._curves[key] = made
        return self._curves[key]

    @cached_property
    def in_reach(self) -> bool:
        """Whether every carrier keeps more of itself than it leaks: the loops take that for granted."""
        if not _covered(self.scenario) or np.isnan(self.offset) or not self.within_tables:
            return False
        stands = (BEFORE, UNTOUCHED, REALIGNED)
        leaks = [self.curves_of(stand, rain=self.judged_in_rain).leak for stand in stands]
        leaks += [self.curves_of(stand, rain=False).leak for stand in stands]
        return all(float(np.nanmax(leak)) < 0.99 for leak in leaks)

    # Angles -----------------------------------------------------------------------------------

    @cached_property
    def turn_radians(self) -> Array:
        """Turn to the shared setting, radians."""
        return self._search[0]

    @property
    def window(self) -> tuple[NDArray[np.float32], NDArray[np.float32]]:
        """Ends of the window as turns from the present setting, degrees."""
        return self._search[1:]

    @cached_property
    def _search(self) -> tuple[Array, NDArray[np.float32], NDArray[np.float32]]:
        rain = self.judged_in_rain
        rule = self.scenario.decision
        shape = self.places.shape
        turn, low, high = np.empty(shape), np.empty((0, 0), np.float32), np.empty((0, 0), np.float32)
        if self.wanted & {"window_low", "window_high", "action"} or self.wanted - self.known:
            low, high = np.empty((2, *shape), dtype=np.float32)
        settings.shared(
            self.delta,
            *self.curves_of(BEFORE, rain=rain),
            *self.curves_of(UNTOUCHED, rain=rain),
            self.worst(REALIGNED, "perfect", rain=rain),
            10.0 ** (0.1 * rule.reserve_db),
            10.0 ** (0.1 * rule.allowed_loss_db),
            turn,
            low,
            high,
        )
        return turn, low, high

    @cached_property
    def _turned(self) -> tuple[Array, Array, Array]:
        """Cosine of 2d at the shared setting before and after, and after the turn made the wrong way."""
        before, after, reversed_after = np.empty((3, *self.places.shape))
        flat = (self.turn_radians, self.delta, before, after, reversed_after)
        powers.cosines(*(array.ravel() for array in flat))
        return before, after, reversed_after

    @cached_property
    def _untouched(self) -> Array:
        out = np.empty(self.places.shape)
        powers.double_cosine(self.delta.ravel(), out.ravel())
        return out

    def cosine(self, stand: Stand, policy: str) -> Array:
        """Cosine of 2d of a policy, d the angle between its setting and the one that suits."""
        if policy == "perfect" or (policy == "present" and stand == BEFORE):
            return PERFECT
        if policy == "present":
            return self._untouched
        before, after, reversed_after = self._turned
        if policy == "shared":
            return before if stand == BEFORE else after
        return reversed_after

    # Power ------------------------------------------------------------------------------------

    def worst(self, stand: Stand, policy: str, *, rain: bool) -> Array:
        """(N+I)/C over what is required, of the weakest carrier."""
        key = (stand, rain, policy)
        if key not in self._worst:
            out = np.empty(self.places.shape)
            powers.worst(*self.curves_of(stand, rain=rain), self.cosine(stand, policy), out)
            self._worst[key] = out
        return self._worst[key]

    def margin_db(self, stand: Stand, policy: str, *, rain: bool) -> NDArray[np.float32]:
        """Margin of a policy, dB."""
        out = np.empty(self.places.shape, dtype=np.float32)
        powers.margin(self.worst(stand, policy, rain=rain).ravel(), out.ravel())
        return out

    def adjacent(self, moment: Moment) -> Array:
        """What adjacent satellites add to each carrier's noise in an aimed dish, ratios."""
        return np.array([gas_terms(carrier, self.terminal)[-1] for carrier in self.carriers(moment)])

    # What the plain situation would find ------------------------------------------------------

    @cached_property
    def shared(self) -> Shared:
        """The shared setting; from the loops where they hold."""
        if not self.in_reach:
            return super().shared
        turn, low, high = self._search
        none = np.full(self.places.shape, np.nan)
        return Shared(np.rad2deg(turn), none, low.astype(np.float64), high.astype(np.float64))

    @cached_property
    def action(self) -> NDArray[np.uint8]:
        """Action by code."""
        if not self.in_reach:
            return super().action
        rain = self.judged_in_rain
        seen = self.usable_before & self.usable_after
        untouched, best = (
            np.where(seen, self.margin_db(UNTOUCHED, policy, rain=rain), np.nan)
            for policy in ("present", "perfect")
        )
        realigned = np.where(self.usable_after, self.margin_db(REALIGNED, "perfect", rain=rain), np.nan)
        return decision.action(
            new_satellite_usable=self.usable_after,
            margin_untouched=untouched,
            margin_realigned=realigned,
            best_without_aiming=best,
            window_exists=np.isfinite(self._search[1]),
            reserve_db=self.scenario.decision.reserve_db,
            slots_differ=self.scenario.slots_differ,
        )
