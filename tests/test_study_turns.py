"""The turn to make at each site: the same in table, job card and plan of visits.

Expected turns are worked by hand: an axis of polarisation closes on itself after 180°, two ports are
90° apart, and a stop bars all settings beyond it.
"""

from __future__ import annotations

import math
from datetime import UTC, datetime
from types import SimpleNamespace
from typing import Any

import numpy as np
import pandas as pd
import pytest

from geoskew.outputs.cards.facts import CardFacts
from geoskew.outputs.cards.site import job_of
from geoskew.places import Places
from geoskew.study.reports.orders import orders_of
from geoskew.study.turns import turns_of

NAN = math.nan


def row(**values: Any) -> dict[str, Any]:
    site = {"action": "turn-at-changeover", "skew_before": 60.0, "turn_shared": 20.0, "turn_realigned": 40.0}
    site |= {"window_low": NAN, "window_high": NAN, "setting_deg": NAN, "feed_low_deg": NAN}
    return site | {"feed_high_deg": NAN, "feed_fixed": 0, "ports": 1} | values


def ahead(**values: Any) -> dict[str, Any]:
    return row(action="preset", window_low=5.0, window_high=30.0, **values)


STOPS = {"feed_low_deg": -95.0, "feed_high_deg": 95.0}
CASES = [
    # Site, turn, setting that the signal feels, what the remark says.
    (row(), 40.0, -80.0, ""),
    (row(setting_deg=50.0), 40.0, 90.0, ""),
    (ahead(), 20.0, 80.0, ""),
    # 60 + 40 = 100 lies behind the stop at 95: the same axis stands at −80, a quarter turn less at 10.
    (row(**STOPS), -140.0, -80.0, "the long way round"),
    (row(**STOPS, ports=2), -50.0, -80.0, "exchange the leads"),
    # Two ports and room enough: straight to it, with a shorter way from 45.5° on.
    (row(turn_realigned=-80.0, ports=2), -80.0, -20.0, "shorter with the leads exchanged"),
    # A stop at 70 inside the window (65 to 90): 10° and not 20°.
    (ahead(feed_high_deg=70.0), 10.0, 70.0, "up to the feed's stop"),
    (ahead(feed_low_deg=40.0, feed_high_deg=62.0), NAN, NAN, "cannot reach"),
    (ahead(feed_fixed=1), NAN, NAN, "cannot reach: the feed is fixed"),
    (row(action="leave"), NAN, NAN, ""),
    (row(turn_realigned=NAN), NAN, NAN, ""),
]


@pytest.mark.parametrize(("site", "turn", "setting", "remark"), CASES)
def test_turn_to_make(site: dict[str, Any], turn: float, setting: float, remark: str) -> None:
    found = turns_of(pd.DataFrame([site]), [site["ports"]])
    assert found.turn[0] == pytest.approx(turn, nan_ok=True)
    assert found.setting[0] == pytest.approx(setting, nan_ok=True)
    assert found.remark[0].startswith(remark)
    assert bool(found.remark[0]) == bool(remark)


def test_a_fixed_feed_with_two_ports_may_serve_with_its_leads_exchanged() -> None:
    # The window reaches from 80 to 100: a quarter turn of the leads alone lands inside, at 150, that is −30.
    site = row(action="preset", turn_shared=85.0, window_low=80.0, window_high=100.0, feed_fixed=1, ports=2)
    found = turns_of(pd.DataFrame([site]), 2)
    assert (found.turn[0], found.setting[0]) == (0.0, -30.0)
    assert found.remark[0].startswith("exchange the leads")


def test_a_table_without_columns_of_the_feed_has_direct_turns() -> None:
    table = pd.DataFrame({"action": ["preset", None, "re-aim"], "turn_shared": 5.0, "turn_realigned": 7.0})
    assert np.isnan(turns_of(table, 1).turn).all()
    found = turns_of(table.assign(skew_before=1.0), 1)
    np.testing.assert_array_equal(found.turn, [5.0, NAN, 7.0])
    assert not found.remark.astype(bool).any()


def test_the_table_and_the_job_card_say_the_same_turn() -> None:
    facts = CardFacts("Title", datetime(2027, 5, 18, tzinfo=UTC), "Old", "New", 0.0, 0.0, (), ())
    for site, *_ in CASES:
        if site["action"] == "leave":
            continue
        way = job_of(site, facts).turning.way
        found = turns_of(pd.DataFrame([site]), site["ports"])
        assert found.turn[0] == pytest.approx(NAN if way is None else way.turn, nan_ok=True)


def test_reports_are_judged_against_the_stop_where_the_card_ends_there() -> None:
    # Targets 80 and 80; a stop at 70 lies inside the window of the first, whose card ends there.
    table = pd.DataFrame([ahead(feed_high_deg=70.0), ahead(), row(feed_high_deg=95.0)])
    table = table.assign(setting_shared=80.0, setting_realigned=-80.0)
    places = Places.of([1.0, 2.0, 3.0], [1.0, 2.0, 3.0], np.nan)
    study: Any = SimpleNamespace(
        assessed=SimpleNamespace(table=table),
        sites=SimpleNamespace(places=places),
        scenario=SimpleNamespace(terminal=SimpleNamespace(setting_spread_deg=3.0, ports=1)),
    )
    orders = orders_of(study)
    assert orders.shared[:2].tolist() == [70.0, 80.0]
    assert orders.realigned.tolist() == [-80.0] * 3
    assert orders.at_changeover.tolist() == [False, False, True]
