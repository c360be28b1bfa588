"""The budget of one place as data."""

from __future__ import annotations

from typing import Any, Final

import numpy as np

from geoskew import weather
from geoskew.places import Places
from geoskew.scenario import Scenario
from geoskew.situation import Situation
from geoskew.study.budget.account import Line
from geoskew.study.budget.bench import Bench
from geoskew.study.budget.cases import CASES, Case, why_no_numbers
from geoskew.study.budget.facts import Facts
from geoskew.study.budget.interference_lines import ORDER
from geoskew.study.budget.link_lines import lines_of
from geoskew.study.budget.sources import Sources

NOTHING_LEFT: Final = "nothing of the wanted carrier is left at this setting"


def budget(scenario: Scenario, places: Places) -> dict[str, Any]:
    """The link budget of one place, ready for JSON.

    Parameters
    ----------
    scenario : Scenario
    places : Places
        One place, with its own columns where it comes from a site list.

    Returns
    -------
    dict
        ``place``, ``satellites`` and ``feed``: what is known of the place. ``budgets``: one entry a moment,
        policy and sky, each with its margin (the layer named there), the carrier that has it, and the
        lines of every carrier. The ``signed_db`` of a carrier's lines sum to its margin. Numbers are
        unrounded; no value is None, and ``no_numbers`` says why.

    Raises
    ------
    ValueError
        More or fewer places than one.
    InputError
        A footprint cannot be read.
    """
    if int(np.prod(places.shape)) != 1:
        raise ValueError(
            f"a budget is for one place, not for {int(np.prod(places.shape))}: give them one by one"
        )
    with np.errstate(invalid="ignore"):
        situation = Situation(scenario, places)
        sources = Sources(situation)
        facts = Facts(scenario, places, situation)
        skies = (False, True) if scenario.weather is not None else (False,)
        return {
            "title": scenario.title,
            **facts.as_data(),
            "judged_in": scenario.judged_in,
            "interference_order": ORDER,
            "weather": list(weather.EDITIONS) if scenario.weather is not None else [],
            "budgets": [
                _entry(situation, sources, facts, case, rain=rain)
                for moment in ("before", "after")
                for rain in skies
                for case in CASES
                if case.moment == moment
            ],
        }


def _entry(situation: Situation, sources: Sources, facts: Facts, case: Case, *, rain: bool) -> dict[str, Any]:
    """One moment, policy and sky."""
    reason = why_no_numbers(situation, case)
    carriers = [] if reason else _carriers(situation, sources, case, rain=rain)
    # A carrier without a margin has lost everything: it is the least.
    least = min(
        carriers, key=lambda one: -np.inf if one["margin_db"] is None else one["margin_db"], default=None
    )
    margin = None if least is None else least["margin_db"]
    if least is not None and margin is None:
        reason = NOTHING_LEFT
    return {
        "moment": case.moment,
        "policy": case.policy,
        "meaning": case.meaning,
        "sky": "rain" if rain else "clear",
        "layer": f"{case.margin_layer}_rain" if rain else case.margin_layer,
        "margin_db": margin,
        "weakest_carrier": None if least is None else least["name"],
        **facts.outage(case),
        "no_numbers": reason,
        "carriers": carriers,
    }


def _carriers(situation: Situation, sources: Sources, case: Case, *, rain: bool) -> list[dict[str, Any]]:
    found = []
    for which, carrier in enumerate(situation.carriers(case.moment)):
        lines = lines_of(Bench(situation, sources, case, which, rain))
        found.append(
            {
                "name": carrier.name,
                "polarisation": carrier.polarisation,
                "frequency_ghz": carrier.frequency_ghz,
                "margin_db": _value(lines, "margin"),
                "lines": [line.as_data() for line in lines],
            }
        )
    return found


def _value(lines: list[Line], key: str) -> float | None:
    return next(line.value for line in lines if line.key == key)
