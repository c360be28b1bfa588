"""Chances of every state of a site once its readings are known, and the setting that they leave.

Bayes' rule over a mixture: every branch's setting is integrated numerically on its own grid. The
probability density of the readings at a setting is normal in the inclinometer's or scale's reading
and in the signals, whose common bias is integrated out in closed form.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final

import numpy as np

from geoskew.angles import fold
from geoskew.fieldwork.reports.evidence import Accuracy, Array, Evidence, Meter, Slot, weights_of
from geoskew.fieldwork.reports.hypotheses import AIM_LOSSES_DB, NAMES, Branch, Plan, branches

# Nodes of the Gauss-Hermite rule over the setting that the crew found.
_NODES: Final = 9


@dataclass(frozen=True)
class Posterior:
    """Of N sites.

    Attributes
    ----------
    probability : ndarray
        (states, N), adding up to 1 over the states.
    setting : ndarray
        (N,) mean setting in the likeliest state, degrees in (−90, 90].
    error : ndarray
        (N,) root mean square of what the setting may be off by, over all states, degrees.
    aim : ndarray
        (aims, N) chances of the dish's pointing errors, the stated one first.
    """

    probability: Array
    setting: Array
    error: Array
    aim: Array

    @property
    def fault(self) -> Array:
        """(N,) chance that the site is not done as planned."""
        return np.asarray(1.0 - self.probability[0])


class Reasoning:
    """The grids and foretold readings of N sites: made once, asked for any readings of the same kind.

    Parameters
    ----------
    plan : Plan
        What was asked for.
    evidence : Evidence
        Its counts and accuracies say which readings there are.
    meter : Meter
        Foretells signals.
    slots : tuple of Slot
        What the columns of the signals are.
    accuracy : Accuracy
        Of signals.
    """

    def __init__(
        self, plan: Plan, evidence: Evidence, meter: Meter, slots: tuple[Slot, ...], accuracy: Accuracy
    ) -> None:
        self.plan, self.meter, self.accuracy = plan, meter, accuracy
        self.used = [k for k in range(len(slots)) if (evidence.count[:, k] > 0).any()]
        self.slots = tuple(slots[k] for k in self.used)
        found_mean, found_variance = self._found(0)
        # A satellite that a site does not see tells nothing about it.
        blind = self._blind(found_mean)
        self.count = np.where(blind, 0.0, evidence.count[:, self.used])
        counted = Evidence(
            evidence.setting, evidence.setting_sigma, evidence.quality[:, self.used], self.count
        )
        # G = R·Rᵀ: readings are turned by Rᵀ once, so that their distance is a plain sum of squares.
        self.root = _root(weights_of(counted, accuracy, self.slots, found_variance))
        self.sigma = evidence.setting_sigma
        made = branches(plan)
        self.state = np.concatenate([np.full(len(one.setting), one.state) for one in made])
        self.aim = np.concatenate([np.full(len(one.setting), one.aim) for one in made])
        self.setting = np.concatenate([one.setting for one in made])
        self.shown = np.concatenate([one.setting + one.shown for one in made])
        self.log_chance = np.concatenate([one.log_chance for one in made])
        self.foretold = self._turned(np.concatenate([self._foretold(one, found_mean) for one in made]))

    def _found(self, aim: int) -> tuple[Array, Array]:
        """Mean and variance, (N, K), of what a crew reads on arrival, over the settings it may have found."""
        nodes, weights = np.polynomial.hermite_e.hermegauss(_NODES)
        weights = (weights / weights.sum())[:, None]
        settings = self.plan.present + nodes[:, None] * self.plan.present_error
        size = self.plan.present.size
        means, variances = np.zeros((size, len(self.slots))), np.zeros((size, len(self.slots)))
        for k, slot in enumerate(self.slots):
            if slot.stage == "found":
                values = self.meter(slot, settings, aim=aim, stays=True)
                means[:, k] = (weights * values).sum(axis=0)
                variances[:, k] = (weights * (values - means[:, k]) ** 2).sum(axis=0)
        return means, np.nan_to_num(variances)

    def _blind(self, found_mean: Array) -> Array:
        columns = [
            np.isnan(found_mean[:, k])
            if slot.stage == "found"
            else np.isnan(self.meter(slot, self.plan.target, aim=0, stays=False))
            | np.isnan(self.meter(slot, self.plan.target, aim=0, stays=True))
            for k, slot in enumerate(self.slots)
        ]
        return np.stack(columns, axis=1) if columns else np.zeros((self.plan.present.size, 0), dtype=bool)

    def _foretold(self, branch: Branch, found_mean: Array) -> Array:
        """Readings (M, N, K) along a branch; 0 where there is none to foretell."""
        setting: Array = branch.setting
        aim, stays = branch.aim, branch.stays
        aim_found = branch.aim_found
        found = found_mean if aim_found == 0 else self._found(aim_found)[0]
        columns = [
            np.broadcast_to(found[:, k], setting.shape)
            if slot.stage == "found"
            else self.meter(slot, setting, aim=aim, stays=stays)
            for k, slot in enumerate(self.slots)
        ]
        return np.nan_to_num(np.stack(columns, axis=-1)) if columns else np.zeros((*setting.shape, 0))

    def _turned(self, quality: Array) -> list[Array]:
        """Readings (..., N, K) turned by the root of their weights: K arrays (..., N)."""
        known = np.where(self.count > 0, np.nan_to_num(quality), 0.0)
        return [np.einsum("...nk,nk->...n", known, self.root[:, :, k]) for k in range(len(self.slots))]

    def log_weights(self, setting: Array, quality: Array) -> Array:
        """Log of chance beforehand times density of readings, (M, N), up to a constant a site."""
        total = self.log_chance.copy()
        for read, foretold in zip(self._turned(quality), self.foretold, strict=True):
            total -= 0.5 * (read - foretold) ** 2
        measured = np.isfinite(setting)
        if measured.any():
            gap = fold(setting[measured] - self.shown[:, measured]) / self.sigma[measured]
            total[:, measured] -= 0.5 * gap**2
        return np.asarray(total)

    def posterior(self, setting: Array, quality: Array) -> Posterior:
        """Chances of states and the setting left, for readings (N,) and (N, K) with K the slots used."""
        logs = self.log_weights(setting, quality)
        weight = np.exp(logs - logs.max(axis=0))
        weight /= weight.sum(axis=0)
        probability = _sums(weight, self.state, len(NAMES))
        best = probability.argmax(axis=0)
        within = np.where(self.state[:, None] == best, weight, 0.0)
        columns = np.arange(best.size)
        peak = self.setting[within.argmax(axis=0), columns]
        offset = fold(self.setting - peak)
        mean = (within * offset).sum(axis=0) / within.sum(axis=0)
        estimate = fold(peak + mean)
        error = np.sqrt((weight * fold(self.setting - estimate) ** 2).sum(axis=0))
        return Posterior(probability, estimate, error, _sums(weight, self.aim, len(AIM_LOSSES_DB) + 1))

    def fault(self, setting: Array, quality: Array) -> Array:
        """The chance of a fault alone, (N,): what `posterior` gives, for less work."""
        logs = self.log_weights(setting, quality)
        weight = np.exp(logs - logs.max(axis=0))
        return np.asarray(weight[self.state != 0].sum(axis=0) / weight.sum(axis=0))


def _root(weights: Array) -> Array:
    """R with R·Rᵀ = weights, (N, K, K); weights may be singular where readings are missing."""
    values, vectors = np.linalg.eigh(weights)
    return np.asarray(vectors * np.sqrt(np.maximum(values, 0.0))[:, None, :])


def _sums(weight: Array, label: np.ndarray, count: int) -> Array:
    return np.stack([weight[label == number].sum(axis=0) for number in range(count)])
