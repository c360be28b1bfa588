"""Layers that come out of the loops whole, by name; every other one is computed as always."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any, Final

import numpy as np
from numpy.typing import NDArray

from geoskew.geometry import Array
from geoskew.kernels import powers
from geoskew.polarisation import power_sum
from geoskew.situation.carriers import BEFORE, REALIGNED, UNTOUCHED, Moment, Stand
from geoskew.situation.compiled.core import CompiledSituation

Made = NDArray[Any]
Maker = Callable[[CompiledSituation], Made]


def _geometry(name: str, moment: Moment) -> Maker:
    return lambda situation: situation.stored(name, moment)


def _margin(stand: Stand, policy: str, *, rain: bool) -> Maker:
    return lambda situation: situation.margin_db(stand, policy, rain=rain)


def _mismatch(stand: Stand, policy: str) -> Maker:
    def make(situation: CompiledSituation) -> Made:
        out = np.empty(situation.places.shape, dtype=np.float32)
        powers.mismatch(situation.cosine(stand, policy).ravel(), out.ravel())
        return out

    return make


def _discrimination(stand: Stand, policy: str) -> Maker:
    def make(situation: CompiledSituation) -> Made:
        out = np.empty(situation.places.shape, dtype=np.float32)
        satellite = situation.view(stand.moment).satellite.isolation_db
        leak = float(power_sum(satellite, situation.terminal("isolation_db")))
        powers.discrimination(situation.cosine(stand, policy).ravel(), leak, out.ravel())
        return out

    return make


def _sum(first: str, second: str, *, offset: bool = False, sign: float = 1.0) -> Maker:
    """Degrees of two angles in radians by the names of a situation's attributes."""

    def angle(situation: CompiledSituation, name: str) -> Array:
        moments: dict[str, Moment] = {"skew_before": "before", "skew_after": "after"}
        if name in moments:
            return situation.skew_radians(moments[name])
        return np.asarray(getattr(situation, name))

    def make(situation: CompiledSituation) -> Made:
        out = np.empty(situation.places.shape, dtype=np.float32)
        added = situation.offset if offset else 0.0
        one, other = angle(situation, first), angle(situation, second) if second else angle(situation, first)
        powers.folded(one.ravel(), other.ravel(), sign if second else 0.0, added, out.ravel())
        return out

    return make


def _window(end: int) -> Maker:
    return lambda situation: situation.window[end]


def _eirp(moment: Moment) -> Maker:
    return lambda situation: situation.view(moment).eirp.astype(np.float32)


def _carrier_to_noise(stand: Stand) -> Maker:
    def make(situation: CompiledSituation) -> Made:
        out = np.empty(situation.places.shape, dtype=np.float32)
        deciding = situation.curves_of(stand, rain=situation.judged_in_rain)
        clear = situation.curves_of(stand, rain=False)
        powers.weakest_noise(*deciding, clear.noise, situation.adjacent(stand.moment), out)
        return out

    return make


def _below_reserve(stand: Stand) -> Maker:
    def make(situation: CompiledSituation) -> Made:
        worst = situation.worst(stand, "perfect", rain=situation.judged_in_rain)
        below = worst > 10.0 ** (-0.1 * situation.scenario.decision.reserve_db)
        return np.where(np.isnan(worst), 255, below).astype(np.uint8)

    return make


# Of these a scenario needs geometry alone.
GEOMETRY: Final[dict[str, Maker]] = {
    f"{name}_{moment}": _geometry(name, moment)
    for name in ("azimuth", "elevation", "range", "skew")
    for moment in ("before", "after")
} | {"seen_after": _sum("seen_radians", "")}

_POLICIES: Final[dict[str, tuple[Stand, str]]] = {
    "untouched": (UNTOUCHED, "present"),
    "shared_before": (BEFORE, "shared"),
    "shared_after": (UNTOUCHED, "shared"),
    "reversed": (UNTOUCHED, "reversed"),
}
_MARGINS: Final = {"before": (BEFORE, "present"), "realigned": (REALIGNED, "perfect"), **_POLICIES}

# And of these carriers that the loops can take.
JUDGED: Final[dict[str, Maker]] = {
    "setting_shared": _sum("skew_before", "turn_radians"),
    "setting_realigned": _sum("skew_after", "", offset=True),
    "turn_shared": _sum("turn_radians", ""),
    "turn_realigned": _sum("skew_after", "skew_before", offset=True, sign=-1.0),
    "window_low": _window(0),
    "window_high": _window(1),
    "eirp_before": _eirp("before"),
    "eirp_after": _eirp("after"),
    "cn_before": _carrier_to_noise(BEFORE),
    "cn_after": _carrier_to_noise(REALIGNED),
    "below_reserve_before": _below_reserve(BEFORE),
    "below_reserve_after": _below_reserve(REALIGNED),
    **{f"mismatch_{name}": _mismatch(*of) for name, of in _POLICIES.items()},
    **{f"discrimination_{name}": _discrimination(*of) for name, of in _POLICIES.items()},
    **{f"margin_{name}": _margin(*of, rain=False) for name, of in _MARGINS.items()},
    **{f"margin_{name}_rain": _margin(*of, rain=True) for name, of in _MARGINS.items()},
}

LAYERS: Final[dict[str, Maker]] = {**GEOMETRY, **JUDGED}
