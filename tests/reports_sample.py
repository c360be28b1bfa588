"""Synthetic reports whose truth is known, and readings worked out apart from the package's own links."""

from __future__ import annotations

from typing import Any

import numpy as np

from geoskew.fieldwork.reports.evidence import Evidence, Slot
from geoskew.fieldwork.reports.hypotheses import AIM_LOSSES_DB, Plan

# The satellites are 21° of polarisation apart; the shared setting is half-way.
APART, HALF = 21.0, 10.5
C_N_BEFORE, C_N_AFTER, UPLINK = 11.0, 12.0, 24.0
NOISE, BIAS, INCLINOMETER = 0.3, 1.0, 0.5
COUNTS = {"done": 200, "wrong-way": 12, "half-turn": 6, "wrong-port": 4, "out-of-aim": 4}


def es_n0(c_n: float, off: Any, loss: Any) -> Any:
    """Es/N0 in dB of a carrier with an equal crossed one, by the convention's formulas written out."""
    leak = 10**-3.0 + 10 ** (-(25.0 - np.asarray(loss)) / 10)
    sine = np.sin(np.deg2rad(off)) ** 2
    wanted, crossed = 1 - sine + leak * sine, sine + leak * (1 - sine)
    noise = 10 ** (-UPLINK / 10) + (10 ** (-(c_n - np.asarray(loss)) / 10) + crossed) / wanted
    return np.maximum(-10 * np.log10(noise), 0.0)


class PlainMeter:
    """Foretells readings for feeds whose new satellite suits at `suits` and the old one 21° more."""

    def __init__(self, suits: Any) -> None:
        self.suits = suits

    def __call__(self, slot: Slot, setting: Any, *, aim: int, stays: bool) -> Any:
        loss = (0.0, *AIM_LOSSES_DB)[aim]
        if slot.moment == "before":
            return es_n0(C_N_BEFORE, setting - self.suits - APART, loss)
        return es_n0(C_N_AFTER, setting - self.suits, loss)


class Field:
    """Sites with a known fault, their plan and what was read there.

    Slots are those of one carrier: found before, found after, left before, left after.
    """

    def __init__(
        self, rng: np.random.Generator, counts: dict[str, int], *, after: bool, measured: float
    ) -> None:
        self.kind = np.repeat(list(counts), list(counts.values()))
        size = self.kind.size
        self.suits = rng.uniform(-40.0, 40.0, size)
        target = self.suits + HALF
        self.present, self.setting = draw_settings(rng, self.kind, self.suits)
        self.loss = draw_losses(rng, self.kind)
        self.quality = read_signals(rng, self.suits, self.present, self.setting, self.loss, after=after)
        has = np.zeros(size, dtype=bool)
        has[rng.permutation(size)[: int(size * measured)]] = True
        shown = np.where(has, self.setting + rng.normal(0.0, INCLINOMETER, size), np.nan)
        sigma = np.where(has, INCLINOMETER, np.nan)
        self.evidence = Evidence(shown, sigma, self.quality, np.isfinite(self.quality).astype(float))
        one = np.ones(size)
        self.plan = Plan(
            present=self.suits + APART,
            present_error=one,
            target=target,
            other_target=np.full(size, np.nan),
            spread=one,
            visited=np.ones(size, dtype=bool),
            ports=one,
        )
        self.meter = PlainMeter(self.suits)


def draw_settings(rng: np.random.Generator, kind: Any, suits: Any) -> tuple[Any, Any]:
    """Present setting and setting left, degrees: each scatters by 1°."""
    present = suits + APART + rng.normal(0.0, 1.0, np.shape(kind))
    intended = np.select(
        [kind == "wrong-way", kind == "half-turn", kind == "wrong-port"],
        [present + HALF, present - HALF / 2, suits + HALF + 90.0],
        suits + HALF,
    )
    return present, intended + rng.normal(0.0, 1.0, np.shape(kind))


def draw_losses(rng: np.random.Generator, kind: Any) -> Any:
    """Pointing loss of the dishes out of aim, 2 to 8 dB."""
    return np.where(kind == "out-of-aim", rng.uniform(2.0, 8.0, np.shape(kind)), 0.0)


def exact_signals(suits: Any, present: Any, setting: Any, loss: Any, *, after: bool) -> Any:
    """Signals without bias and noise, (..., 4), NaN where nothing is read."""
    found = es_n0(C_N_BEFORE, present - suits - APART, 0.0)
    left = es_n0(C_N_BEFORE, setting - suits - APART, loss)
    new = es_n0(C_N_AFTER, setting - suits, loss) if after else np.full(np.shape(found), np.nan)
    return np.stack([found, np.full(np.shape(found), np.nan), left, new], axis=-1)


def read_signals(
    rng: np.random.Generator, suits: Any, present: Any, setting: Any, loss: Any, *, after: bool
) -> Any:
    """Signals with 0.3 dB of noise each and a bias of 1 dB common to a site."""
    exact = exact_signals(suits, present, setting, loss, after=after)
    bias = rng.normal(0.0, BIAS, exact.shape[:-1])
    return exact + bias[..., None] + rng.normal(0.0, NOISE, exact.shape)
