"""All rounds of reports against the plan: what became of each site in the end."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from datetime import date
from typing import Any, Final

import numpy as np
from numpy.typing import NDArray

from geoskew.fieldwork.reports.evidence import Accuracy, Array, Evidence, Meter, Slot
from geoskew.fieldwork.reports.hypotheses import AIM_LOSSES_DB, NAMES, Plan
from geoskew.fieldwork.reports.judge import CONTRADICTED, NOT_REPORTED, Chunk, Judged, judge
from geoskew.fieldwork.reports.rounds import Round
from geoskew.fieldwork.reports.scatter import with_observed_spread

# Sites reasoned about at once: their grids fit into the processor's cache.
CHUNK: Final = 250
NOT_PLANNED: Final = "not-planned"


@dataclass(frozen=True)
class Orders:
    """What was asked for at all sites, (N,), degrees.

    ``planned``: whether a visit was; ``at_changeover``: whether that was at the changeover;
    ``shared`` and ``realigned``: the settings of the two kinds of visit.
    """

    planned: NDArray[np.bool_]
    at_changeover: NDArray[np.bool_]
    present: Array
    present_error: Array
    shared: Array
    realigned: Array
    spread: Array
    ports: Array

    def plan(self, one: Round, present: Array, error: Array) -> Plan:
        """The plan of a round's sites, from the settings that the round before left."""
        sites = one.sites
        late = one.after & ~self.at_changeover[sites]
        shared, realigned = self.shared[sites], self.realigned[sites]
        unplanned = ~self.planned[sites]
        # Once the new satellite carries the traffic a card may ask for either setting.
        target = np.where(self.at_changeover[sites] | late, realigned, shared)
        target = np.where(unplanned | np.isnan(target), present[sites], target)
        return Plan(
            present=present[sites],
            present_error=error[sites],
            target=target,
            other_target=np.where(late & ~unplanned, shared, np.nan),
            spread=self.spread[sites],
            visited=one.visited,
            ports=self.ports[sites],
        )


@dataclass
class Reconciled:
    """Of all sites, (N,).

    Attributes
    ----------
    state : ndarray of str
        A state's name, ``unclear``, ``contradicted``, ``not-reported`` or ``not-planned``.
    accused : ndarray of bool
        Whether the chance of a fault exceeds the threshold.
    day : list of date or None
        Of the last visit, or of the last reading where nobody came.
    probability : ndarray
        (states, N) chances; NaN without a report.
    setting, error : ndarray
        Setting and error bar, degrees: estimated where there is a report, else as it was.
    lost : ndarray
        Pointing loss of a dish out of aim, dB; 0 for all others.
    thresholds : list of tuple
        Of each round: chance of a fault above which sites without and with a measured setting are accused.
    spreads : list of float
        Of each round: the spread that measured settings show, degrees; NaN where the stated one holds.
    """

    state: NDArray[Any]
    accused: NDArray[np.bool_]
    day: list[date | None]
    probability: Array
    setting: Array
    error: Array
    lost: Array
    reported: NDArray[np.bool_]
    thresholds: list[tuple[float, float]]
    spreads: list[float]


MeterOf = Callable[[NDArray[np.intp]], Meter]


def reconcile(
    orders: Orders, rounds: Sequence[Round], meter_of: MeterOf, slots: tuple[Slot, ...], accuracy: Accuracy
) -> Reconciled:
    """Go through the rounds in order; a later round starts from the settings that the one before left.

    Parameters
    ----------
    orders : Orders
        What was asked for.
    rounds : sequence of Round
        Evidence.
    meter_of : callable
        Gives the meter of some sites, by their numbers.
    slots, accuracy
        As `judge` takes them.
    """
    size = orders.present.size
    result = Reconciled(
        state=np.where(orders.planned, NOT_REPORTED, NOT_PLANNED).astype(object),
        accused=np.zeros(size, dtype=np.bool_),
        day=[None] * size,
        probability=np.full((len(NAMES), size), np.nan),
        setting=orders.present.copy(),
        error=orders.present_error.copy(),
        lost=np.zeros(size),
        reported=np.zeros(size, dtype=np.bool_),
        thresholds=[],
        spreads=[],
    )
    for one in rounds:
        plan, spread = with_observed_spread(orders.plan(one, result.setting, result.error), one.evidence)
        usable = np.isfinite(plan.present) & np.isfinite(plan.target) & ~one.contradicted
        _note(result, one, usable)
        rows = np.flatnonzero(usable)
        if rows.size == 0:
            continue
        chunks = [
            Chunk(_rows(plan, part), _evidence(one.evidence, part), meter_of(one.sites[part]))
            for part in np.array_split(rows, -(-rows.size // CHUNK))
        ]
        result.spreads.append(spread)
        _take(result, one.sites[rows], judge(chunks, slots, accuracy))
    return result


def _rows(plan: Plan, rows: NDArray[np.intp]) -> Plan:
    return Plan(*(getattr(plan, name)[rows] for name in Plan.__dataclass_fields__))


def _evidence(evidence: Evidence, rows: NDArray[np.intp]) -> Evidence:
    return Evidence(*(getattr(evidence, name)[rows] for name in Evidence.__dataclass_fields__))


def _note(result: Reconciled, one: Round, usable: NDArray[np.bool_]) -> None:
    """Days of all, and the sites that nothing can be made of: they keep their setting."""
    for site, day, visited in zip(one.sites.tolist(), one.days, one.visited, strict=True):
        result.day[site] = day
        result.reported[site] |= bool(visited)
    lost = one.sites[~usable]
    result.state[lost] = np.where(one.contradicted[~usable], CONTRADICTED, "unclear")
    result.accused[lost] = False
    result.probability[:, lost] = np.nan
    result.lost[lost] = 0.0


def _take(result: Reconciled, sites: NDArray[np.intp], judged: Judged) -> None:
    posterior = judged.posterior
    result.state[sites] = judged.state
    result.accused[sites] = judged.accused
    result.probability[:, sites] = posterior.probability
    result.setting[sites] = posterior.setting
    result.error[sites] = posterior.error
    out = np.array([0.0, *AIM_LOSSES_DB])
    chance = posterior.aim[1:]
    with np.errstate(invalid="ignore", divide="ignore"):
        mean = (chance * out[1:, None]).sum(axis=0) / chance.sum(axis=0)
    result.lost[sites] = np.where(judged.state == "out-of-aim", mean, 0.0)
    result.thresholds.append(judged.threshold)
