"""How well crews really set feeds, learned from the settings that were measured."""

from __future__ import annotations

from dataclasses import replace
from typing import Final

import numpy as np

from geoskew.angles import fold
from geoskew.fieldwork.reports.evidence import Evidence
from geoskew.fieldwork.reports.hypotheses import Plan

# With fewer settings than this the stated spread holds.
FEWEST: Final = 30
# Median of the absolute value of a normal variable with standard deviation 1.
MEDIAN: Final = 0.67449
# No crew is taken to be better than this, degrees.
BEST_DEG: Final = 0.5


def with_observed_spread(plan: Plan, evidence: Evidence) -> tuple[Plan, float]:
    """The plan with the spread that the measured settings show where it is below the stated one.

    The median distance from the target, which a few faults hardly move, less the reading's own error,
    plus one standard deviation of such an estimate. A spread is never raised: many faults alike would
    otherwise pass for the custom.

    Returns
    -------
    plan : Plan
    spread : float
        Degrees; NaN where the stated spread holds for every site.
    """
    distance = np.abs(fold(evidence.setting - plan.target))
    distance = np.fmin(distance, np.abs(fold(evidence.setting - plan.other_target)))
    # With the leads exchanged the V mark of a feed set as planned stands a quarter turn off.
    distance = np.where(plan.ports > 1, np.minimum(distance, 90.0 - distance), distance)
    known = np.isfinite(distance) & plan.visited
    count = int(known.sum())
    if count < FEWEST:
        return plan, float("nan")
    total = (np.median(distance[known]) / MEDIAN) ** 2
    own = max(float(total - np.median(evidence.setting_sigma[known]) ** 2), 0.0)
    spread = max(np.sqrt(own) * (1.0 + count**-0.5), BEST_DEG)
    if not (plan.spread > spread).any():
        return plan, float("nan")
    return replace(plan, spread=np.minimum(plan.spread, spread)), float(spread)
