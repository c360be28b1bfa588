"""Everything that the layers need of a scenario over places, computed once and when asked for."""

from __future__ import annotations

from functools import cached_property
from typing import Any

import numpy as np
from numpy.typing import NDArray

from geoskew import decision, policies
from geoskew.angles import fold
from geoskew.geometry import Array
from geoskew.policies import Curve, Shared
from geoskew.situation.carriers import BEFORE, REALIGNED, UNTOUCHED, Moment, Stand
from geoskew.situation.links import Links


class Situation(Links):
    """A scenario over places. Arrays broadcast to ``places.shape``; NaN where there is no value."""

    @property
    def judged_in_rain(self) -> bool:
        """Whether the margins that decide are those in rain."""
        return bool(self.scenario.judged_in == "rain")

    def margin(self, stand: Stand, setting: Any, *, rain: bool) -> Array:
        """Least margin over all carriers at a setting, dB."""
        margins = [one.margin(setting) for one in self.responses(stand, rain=rain)]
        return np.asarray(np.minimum.reduce(np.broadcast_arrays(*margins)))

    def deciding_margin(self, stand: Stand, setting: Any) -> Array:
        """The same, in the weather that decides."""
        return self.margin(stand, setting, rain=self.judged_in_rain)

    @cached_property
    def setting_realigned(self) -> Array:
        """Absolute setting of a feed realigned for the new satellite, degrees."""
        return np.where(self.usable_after, fold(self.after.skew + self.common_offset), np.nan)

    @cached_property
    def best_before(self) -> Array:
        """Deciding margin before, with the feed aligned to the old satellite, dB."""
        return self.deciding_margin(BEFORE, self.before.skew)

    @cached_property
    def best_after(self) -> Array:
        """Deciding margin after, with dish and feed set for the new satellite, dB."""
        return self.deciding_margin(REALIGNED, self.setting_realigned)

    def curves(self) -> list[Curve]:
        """All carriers of both moments with what each moment is held to."""
        rule = self.scenario.decision
        both = []
        for stand, best in ((BEFORE, self.best_before), (UNTOUCHED, self.best_after)):
            held = policies.held_to(best, reserve_db=rule.reserve_db, allowed_loss_db=rule.allowed_loss_db)
            both += [Curve(one, held) for one in self.responses(stand, rain=self.judged_in_rain)]
        return both

    @cached_property
    def shared(self) -> Shared:
        """The shared setting and its window; without values where no turn changes anything."""
        if not self.turning_helps:
            none = np.full(self.places.shape, np.nan)
            return Shared(none, none, none, none)
        return policies.shared_setting(self.curves(), self.present)

    @cached_property
    def setting_shared(self) -> Array:
        """Absolute shared setting, degrees."""
        return fold(self.present + self.shared.turn)

    @cached_property
    def policy_shared(self) -> Array:
        """The setting that the policy `shared` leaves: the present one where no turn changes anything."""
        return self.setting_shared if self.turning_helps else self.present

    @cached_property
    def policy_reversed(self) -> Array:
        """The setting that the shared turn, made the wrong way, leaves."""
        return fold(self.present - self.shared.turn) if self.turning_helps else self.present

    @cached_property
    def policy_wrong_way(self) -> Array:
        """The setting that the realigning turn, made the wrong way, leaves."""
        if not self.turning_helps:
            return self.present
        return fold(2.0 * self.present - self.setting_realigned)

    @cached_property
    def action(self) -> NDArray[np.uint8]:
        """Action by code, at every place."""
        return decision.action(
            new_satellite_usable=self.usable_after,
            margin_untouched=self.deciding_margin(UNTOUCHED, self.present),
            margin_realigned=self.best_after,
            best_without_aiming=self.deciding_margin(UNTOUCHED, fold(self.seen_after + self.common_offset)),
            window_exists=np.isfinite(self.shared.low),
            reserve_db=self.scenario.decision.reserve_db,
            slots_differ=self.scenario.slots_differ,
            turning_helps=self.turning_helps,
        )

    def weakest(self, moment: Moment) -> NDArray[np.int64]:
        """Number of the carrier with the least margin at a perfect setting (dish on that satellite)."""
        return self._weakest[moment]

    @cached_property
    def _weakest(self) -> dict[Moment, NDArray[np.int64]]:
        found: dict[Moment, NDArray[np.int64]] = {}
        for stand in (BEFORE, REALIGNED):
            responses = self.responses(stand, rain=self.judged_in_rain)
            margins = np.broadcast_arrays(*(one.margin(one.suits) for one in responses))
            # Where there is no value any carrier may stand for it: the result has none either.
            found[stand.moment] = np.argmin(np.nan_to_num(np.stack(margins), nan=np.inf), axis=0)
        return found

    def of_weakest(self, moment: Moment, values: list[Array]) -> Array:
        """Of one array a carrier, the value of the weakest carrier at each place."""
        if len(values) == 1:
            return values[0]
        weakest = self.weakest(moment)
        shape = np.broadcast_shapes(weakest.shape, *(np.shape(value) for value in values))
        return np.choose(np.broadcast_to(weakest, shape), [np.broadcast_to(value, shape) for value in values])
