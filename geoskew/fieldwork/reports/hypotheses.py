"""What can have become of a feed, and the setting that each of these would have left.

Every state is one or more branches: a centre and a spread of the setting, the dish's aim, and what
an inclinometer would show. The chances beforehand are common practice, no source; they matter where
readings tell little, and are printed with the result.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final, NamedTuple

import numpy as np

from geoskew.angles import fold
from geoskew.fieldwork.reports.evidence import Array


class State(NamedTuple):
    """A state of a site, in words, and its chance beforehand: after a visit, and without one."""

    name: str
    meaning: str
    after_visit: float
    without_visit: float


STATES: Final = (
    State("done", "set as planned", 0.86, 0.05),
    State("wrong-way", "turned the wrong way", 0.04, 0.005),
    State("half-turn", "turned about half as far as planned", 0.025, 0.005),
    State("wrong-port", "received on the wrong port, 90° off", 0.015, 0.005),
    State("out-of-aim", "set as planned, but the dish is out of aim", 0.02, 0.01),
    State("undone", "left as it was", 0.03, 0.92),
    State("elsewhere", "stands at some other setting", 0.01, 0.005),
)
NAMES: Final = tuple(state.name for state in STATES)
DONE: Final = 0

# Pointing losses that stand for a dish out of aim, dB; equally likely.
AIM_LOSSES_DB: Final = (1.5, 3.0, 5.0, 8.0, 12.0)
# How often a dish out of aim was so before the visit.
OUT_BEFORE: Final = 0.25
# How often the other target is what a crew aimed at, where a site has two.
OTHER_TARGET: Final = 0.5
# How often the leads were exchanged, where a feed has two ports: a card offers or orders it, and the V
# mark then stands 90° from the target of a job well done. A setting alone does not tell the two apart.
EXCHANGED: Final = 0.5
# Points over ± so many standard deviations, and over the half circle.
POINTS: Final = 61
SIGMAS: Final = 4.5
CIRCLE_POINTS: Final = 180
# Feeds cannot be set better than this, degrees.
LEAST_SPREAD_DEG: Final = 0.25


@dataclass(frozen=True)
class Plan:
    """What was asked for at N sites; all (N,), degrees.

    Attributes
    ----------
    present, present_error : ndarray
        Setting before the visit and its standard deviation.
    target : ndarray
        Setting asked for.
    other_target : ndarray
        A second setting that the crew's card may have asked for; NaN: none.
    spread : ndarray
        Standard deviation of a setting around the one intended.
    visited : ndarray of bool
        Whether anybody reports a visit; else there are only readings of the signal.
    ports : ndarray
        Ports of the feed. With two, the leads may have been exchanged, as cards offer it.
    """

    present: Array
    present_error: Array
    target: Array
    other_target: Array
    spread: Array
    visited: np.ndarray
    ports: Array

    def part(self, rows: slice) -> Plan:
        """Some of the sites."""
        return Plan(*(getattr(self, name)[rows] for name in self.__dataclass_fields__))

    @property
    def exchanged(self) -> Array:
        """Chance, (N,), that the leads of a feed set as planned were exchanged."""
        return np.where(self.ports > 1, EXCHANGED, 0.0)


@dataclass(frozen=True)
class Branch:
    """One way to a state: settings (M, N) with their chances, log (M, N), and what goes with them.

    ``shown``: what an inclinometer shows less the setting that the signal feels, degrees.
    ``aim`` and ``aim_found``: number of the dish's pointing error when it was left and found.
    """

    state: int
    setting: Array
    log_chance: Array
    shown: float = 0.0
    aim: int = 0
    aim_found: int = 0
    stays: bool = False


def branches(plan: Plan) -> list[Branch]:
    """All branches of N sites; the chances of one site add up to 1 over all of them.

    A state whose setting lies within the spread of a target cannot be told from a job done and does no
    harm: it is left out.
    """
    spread = np.maximum(plan.spread, LEAST_SPREAD_DEG)
    turned = np.hypot(spread, plan.present_error)
    turn = fold(plan.target - plan.present)
    has_other = np.isfinite(plan.other_target)
    other = np.where(has_other, plan.other_target, plan.target)
    share = np.where(has_other, OTHER_TARGET, 0.0)
    centres = {
        "wrong-way": (plan.present - turn, turned),
        "half-turn": (plan.present + 0.5 * turn, turned),
        "undone": (plan.present, np.maximum(plan.present_error, LEAST_SPREAD_DEG)),
    }
    chance = {state.name: np.where(plan.visited, state.after_visit, state.without_visit) for state in STATES}
    for name, (centre, _) in centres.items():
        gap = np.minimum(np.abs(fold(centre - plan.target)), np.abs(fold(centre - other)))
        chance[name] = np.where(gap <= spread, 0.0, chance[name])
    number = {name: index for index, name in enumerate(NAMES)}
    # Leads left as they were, or exchanged.
    exchanges = ((1.0 - plan.exchanged, 0.0), (plan.exchanged, 90.0))
    found = [
        _normal(number["done"], goal, spread, chance["done"] * often * leads, shown=shown)
        for goal, often in ((plan.target, 1.0 - share), (other, share))
        for leads, shown in exchanges
    ]
    # A turn of the wrong way with the leads exchanged ends at the same axis, its V mark a quarter turn off.
    found += [
        _normal(number["wrong-way"], *centres["wrong-way"], chance["wrong-way"] * leads, shown=shown)
        for leads, shown in exchanges
    ]
    found += [
        _normal(number[name], *centres[name], chance[name], stays=name == "undone")
        for name in ("half-turn", "undone")
    ]
    # Feed a quarter turn off, or leads exchanged: with leads exchanged an inclinometer shows the target.
    off = plan.target + 90.0
    found += [
        _normal(number["wrong-port"], off, spread, 0.5 * chance["wrong-port"], shown=shown)
        for shown in (0.0, -90.0)
    ]
    for aim in range(1, len(AIM_LOSSES_DB) + 1):
        for aim_found, often in ((0, 1.0 - OUT_BEFORE), (aim, OUT_BEFORE)):
            of_this = chance["out-of-aim"] * often / len(AIM_LOSSES_DB)
            found += [
                _normal(
                    number["out-of-aim"],
                    plan.target,
                    spread,
                    of_this * leads,
                    shown=shown,
                    aim=aim,
                    aim_found=aim_found,
                )
                for leads, shown in exchanges
            ]
    found.append(_anywhere(number["elsewhere"], plan.target, chance["elsewhere"]))
    found = [one for one in found if np.isfinite(one.log_chance).any()]
    total = np.logaddexp.reduce([np.logaddexp.reduce(one.log_chance, axis=0) for one in found])
    return [
        Branch(one.state, one.setting, one.log_chance - total, one.shown, one.aim, one.aim_found, one.stays)
        for one in found
    ]


def _normal(
    state: int,
    centre: Array,
    spread: Array,
    chance: Array,
    *,
    shown: float = 0.0,
    aim: int = 0,
    aim_found: int = 0,
    stays: bool = False,
) -> Branch:
    """Settings scattered normally, on a grid of their own."""
    steps = np.linspace(-SIGMAS, SIGMAS, POINTS)
    density = -0.5 * steps**2
    density -= np.logaddexp.reduce(density)
    with np.errstate(divide="ignore"):
        log_chance = density[:, None] + np.log(chance)[None, :]
    setting = centre[None, :] + steps[:, None] * spread[None, :]
    return Branch(state, setting, log_chance, shown, aim, aim_found, stays)


def _anywhere(state: int, start: Array, chance: Array) -> Branch:
    """Every setting of the half circle alike."""
    steps = np.arange(CIRCLE_POINTS) * (180.0 / CIRCLE_POINTS)
    with np.errstate(divide="ignore"):
        log_chance = np.broadcast_to(np.log(chance / CIRCLE_POINTS)[None, :], (CIRCLE_POINTS, start.size))
    return Branch(state, start[None, :] + steps[:, None], log_chance)
