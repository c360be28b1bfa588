"""The table of sensitivity against scenarios that are written with the changed assumption and assessed as usual."""

from __future__ import annotations

import re
import shutil
from collections import Counter

import numpy as np
import pytest

from geoskew.resources import demo_scenario
from geoskew.study.core import Study
from geoskew.study.sensitivity import RISK_PERCENT, assumptions, sensitivity


@pytest.fixture(scope="module")
def folder(tmp_path_factory):
    made = tmp_path_factory.mktemp("demo")
    shutil.copytree(demo_scenario().parent, made / "plan")
    return made / "plan"


@pytest.fixture(scope="module")
def rows(folder):
    study = Study(folder / "scenario.toml")
    return sensitivity(study.scenario, study.sites.places, study.inputs)


def row(rows, name, value):
    return next(one for one in rows if (one["assumption"], one["value"]) == (name, value))


def assessed(folder, pattern, replacement):
    """Actions of the same sites, from a scenario file in which one line was changed by hand."""
    text = (folder / "scenario.toml").read_text(encoding="utf-8")
    changed, count = re.subn(pattern, replacement, text)
    assert count >= 1
    path = folder / "changed.toml"
    path.write_text(changed, encoding="utf-8")
    return Study(path).assessed.table


@pytest.mark.parametrize(
    ("name", "value", "pattern", "replacement"),
    [
        ("reserve", "1.5 dB", r"reserve_db = 1\.0", "reserve_db = 1.5"),
        ("crossed polarisation", "empty", r"crossed_offset_db = .*", "crossed = false"),
        ("availability", "99.8 %", r"availability_percent = 99\.6", "availability_percent = 99.8"),
        ("EIRP of the new satellite", "+0.5 dB", r"eirp_offset_db = -4\.0", "eirp_offset_db = -3.5"),
        ("judged in", "clear sky", r"reserve_db = 1\.0", 'reserve_db = 1.0\njudged_in = "clear"'),
    ],
)
def test_a_row_says_what_a_changed_scenario_gives(folder, rows, name, value, pattern, replacement):
    planned = Study(folder / "scenario.toml").assessed.table
    table = assessed(folder, pattern, replacement)
    found = row(rows, name, value)
    assert found["sites_that_change"] == int((table["action"] != planned["action"]).sum())
    assert found["sites_that_change"] > 0
    counts = Counter(table["action"])
    assert found["by_action"] == {action: counts[action] for action in found["by_action"]}


def test_the_plan_itself_comes_first_and_changes_nothing(folder, rows):
    table = Study(folder / "scenario.toml").assessed.table
    assert (rows[0]["assumption"], rows[0]["sites_that_change"]) == ("as planned", 0)
    chance = np.select(
        [table["action"] == "leave", table["action"] == "preset"],
        [table["fail_probability"], table[["fail_shared_before", "fail_shared_after"]].max(axis=1)],
        table["fail_realigned"],
    )
    served = ~table["action"].isin(["upgrade", "no-sight"])
    assert rows[0]["at_risk"] == int((served & (chance > RISK_PERCENT)).sum())
    assert all(sum(one["by_action"].values()) == len(table) for one in rows)


def test_spread_changes_the_risk_but_no_action(rows):
    narrow, wide = row(rows, "spread of settings", "× 0.5"), row(rows, "spread of settings", "× 2")
    assert narrow["sites_that_change"] == wide["sites_that_change"] == 0
    assert narrow["at_risk"] < rows[0]["at_risk"] < wide["at_risk"]


def test_only_values_that_a_scenario_may_have(folder):
    scenario = Study(folder / "scenario.toml").scenario
    low = scenario.model_copy(update={"decision": scenario.decision.model_copy(update={"reserve_db": 0.5})})
    values = [one.value for one in assumptions(low) if one.name == "reserve"]
    assert values == ["0 dB", "1 dB", "1.5 dB"]
    weather = scenario.weather.model_copy(update={"availability_percent": 96.0})
    values = [
        one.value
        for one in assumptions(scenario.model_copy(update={"weather": weather}))
        if one.name == "availability"
    ]
    assert values == ["98 %"]
    empty = tuple(one.model_copy(update={"crossed": False}) for one in scenario.carriers_before)
    bare = scenario.model_copy(update={"weather": None, "carriers_before": empty, "carriers_after": empty})
    named = [(one.name, one.value) for one in assumptions(bare)]
    assert ("crossed polarisation", "in use, equal power") in named
    assert not any(name in ("availability", "judged in") for name, _ in named)
