"""From chances to a verdict: who is accused of a fault, and how often a good site would be.

A site is accused when its chance of a fault exceeds a threshold. Sites with a measured setting and
sites with signals alone have a threshold each, at which the readings of good sites, drawn from the
model itself with a fixed seed, would be accused in the stated share of cases. By the lemma of Neyman
and Pearson no other test finds more faults for the same share of false accusations.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.typing import NDArray

from geoskew.fieldwork.reports.evidence import Accuracy, Array, Evidence, Meter, Slot
from geoskew.fieldwork.reports.hypotheses import DONE, NAMES, OTHER_TARGET, Plan
from geoskew.fieldwork.reports.posterior import Posterior, Reasoning

# The share of good sites that may be accused.
FALSE_SHARE: Final = 0.02
# Never accuse on a smaller chance of a fault than this, however rarely a good site would show it.
LEAST_FAULT: Final = 0.2
# Good sites drawn, over all sites of a round, to find the thresholds.
DRAWS: Final = 8000
SEED: Final = 20270518

UNCLEAR: Final = "unclear"
NOT_REPORTED: Final = "not-reported"
CONTRADICTED: Final = "contradicted"


@dataclass(frozen=True)
class Judged:
    """Verdicts on N sites.

    Attributes
    ----------
    state : ndarray of str
        (N,) a state's name, ``unclear``, or ``not-reported``.
    accused : ndarray of bool
        (N,) whether the chance of a fault exceeds the threshold after a visit.
    posterior : Posterior
        Chances, settings and error bars.
    threshold : tuple of float
        Chance of a fault above which sites with signals alone, and with a measured setting, are accused.
    """

    state: NDArray[np.object_]
    accused: NDArray[np.bool_]
    posterior: Posterior
    threshold: tuple[float, float]


@dataclass(frozen=True)
class Chunk:
    """Some sites with the meter that foretells their readings."""

    plan: Plan
    evidence: Evidence
    meter: Meter


def judge(chunks: list[Chunk], slots: tuple[Slot, ...], accuracy: Accuracy) -> Judged:
    """Judge sites, chunk after chunk; the thresholds are common to all."""
    size = sum(chunk.plan.present.size for chunk in chunks)
    repeats = max(1, -(-DRAWS // max(size, 1)))
    rng = np.random.default_rng(SEED)
    posteriors, good, measured = [], [], []
    for chunk in chunks:
        reasoning = Reasoning(chunk.plan, chunk.evidence, chunk.meter, slots, accuracy)
        quality = chunk.evidence.quality[:, reasoning.used]
        posteriors.append(reasoning.posterior(chunk.evidence.setting, quality))
        good.append(_good_draws(reasoning, chunk.evidence, repeats, rng))
        measured.append(chunk.evidence.measured)
    posterior = Posterior(
        *(np.concatenate([getattr(one, name) for one in posteriors], axis=-1) for name in _FIELDS)
    )
    has_setting = np.concatenate(measured)
    visited = np.concatenate([chunk.plan.visited for chunk in chunks])
    drawn = np.concatenate(good, axis=1)
    limits = (_limit(drawn[:, visited & ~has_setting]), _limit(drawn[:, visited & has_setting]))
    known = np.concatenate([chunk.evidence.any for chunk in chunks])
    accused = visited & known & (posterior.fault > np.where(has_setting, limits[1], limits[0]))
    return Judged(_states(posterior, accused, visited, known), accused, posterior, limits)


_FIELDS: Final = ("probability", "setting", "error", "aim")


def _limit(drawn: Array) -> float:
    """The chance of a fault that only the allowed share of good sites exceeds."""
    if drawn.size == 0:
        return LEAST_FAULT
    return max(LEAST_FAULT, float(np.quantile(drawn, 1.0 - FALSE_SHARE, method="higher")))


def _good_draws(reasoning: Reasoning, evidence: Evidence, repeats: int, rng: np.random.Generator) -> Array:
    """Chances of a fault, (repeats, N), that sites done as planned would show."""
    plan, accuracy = reasoning.plan, reasoning.accuracy
    size = plan.present.size
    faults = np.empty((repeats, size))
    for number in range(repeats):
        takes_other = np.isfinite(plan.other_target) & (rng.random(size) < OTHER_TARGET)
        setting = np.where(takes_other, plan.other_target, plan.target) + plan.spread * rng.standard_normal(
            size
        )
        found = plan.present + plan.present_error * rng.standard_normal(size)
        bias = accuracy.site_bias * rng.standard_normal(size)
        spreads = {
            "before": accuracy.spread_before * rng.standard_normal(size),
            "after": accuracy.spread_after * rng.standard_normal(size),
        }
        quality = np.empty((size, len(reasoning.slots)))
        for k, slot in enumerate(reasoning.slots):
            at = found if slot.stage == "found" else setting
            noise = accuracy.quality / np.sqrt(np.maximum(reasoning.count[:, k], 1.0))
            exact = reasoning.meter(slot, at, aim=0, stays=slot.stage == "found")
            quality[:, k] = exact + bias + spreads[slot.moment] + noise * rng.standard_normal(size)
        if (plan.ports > 1).any():  # leads exchanged: the V mark stands a quarter turn off, and rightly
            mark = np.where(rng.random(size) < plan.exchanged, setting + 90.0, setting)
        else:
            mark = setting
        shown = np.where(evidence.measured, mark + evidence.setting_sigma * rng.standard_normal(size), np.nan)
        faults[number] = reasoning.fault(shown, quality)
    return faults


def _states(
    posterior: Posterior, accused: NDArray[np.bool_], visited: NDArray[np.bool_], known: NDArray[np.bool_]
) -> NDArray[np.object_]:
    names = np.array(NAMES, dtype=object)
    best = names[posterior.probability.argmax(axis=0)]
    worst = names[1:][posterior.probability[1:].argmax(axis=0)]
    likely_done = posterior.probability[DONE] >= 0.5
    state = np.where(accused, worst, np.where(likely_done & known, names[DONE], UNCLEAR))
    return np.asarray(np.where(visited, state, np.where(best == "undone", NOT_REPORTED, best)), dtype=object)
