"""Chances of failure and the spread that a stated chance needs, against the normal distribution and draws."""

from __future__ import annotations

import numpy as np
import pytest
from scipy import optimize, stats

from geoskew.decision import WIDEST_SPREAD_DEG, Scattered, fail_probability, widest_spread
from geoskew.evaluate import evaluate
from geoskew.link import Response
from geoskew.places import Places
from geoskew.resources import demo_scenario
from geoskew.scenario import load
from geoskew.situation import Situation
from geoskew.situation.carriers import BEFORE, UNTOUCHED

REQUIRED_DB = 6.0


def carrier(half_deg, *, suits=0.0):
    """A carrier with noise alone: C/N falls by cos²d, so the margin is zero where cos²d = cos²(half)."""
    wanted = np.cos(np.deg2rad(half_deg)) ** 2
    return Response(
        suits=np.asarray(suits, dtype=float),
        noise=np.asarray(wanted * 10.0 ** (-REQUIRED_DB / 10.0)),
        crossed=np.zeros(()),
        leak=np.zeros(()),
        uplink=np.zeros(()),
        required_db=REQUIRED_DB,
    )


@pytest.mark.parametrize("spread", [4.0, 9.0, 15.0])
@pytest.mark.parametrize("off", [0.0, -7.0, 21.0])
def test_chance_is_the_normal_distribution_beyond_the_two_ends(spread, off):
    # scipy's normal distribution; its images half a turn away weigh below 1e-15 here.
    expected = 100.0 * (stats.norm.sf((30.0 - off) / spread) + stats.norm.cdf((-30.0 - off) / spread))
    found = fail_probability([carrier(30.0, suits=50.0)], 50.0 + off, spread_deg=spread)
    assert found == pytest.approx(expected, rel=1e-9)


@pytest.mark.parametrize("half", [5.0, 20.0, 40.0])
def test_spread_of_a_centred_feed_in_closed_form(half):
    # 2·Q(half/s) = 1 %: s = half / Q⁻¹(0.005)
    expected = half / stats.norm.isf(0.005)
    found = widest_spread([Scattered([carrier(half)], 0.0)], 0.0, percent=1.0)
    assert found == pytest.approx(expected, abs=0.001)


def test_spread_off_centre_and_of_the_worse_moment():
    def chance(spread):
        sides = stats.norm.sf((25.0 - 8.0) / spread) + stats.norm.cdf((-25.0 - 8.0) / spread)
        return sides - 0.01

    expected = optimize.brentq(chance, 0.5, 20.0)
    moments = [Scattered([carrier(60.0)], 0.0), Scattered([carrier(25.0)], 0.0)]
    assert widest_spread(moments, 8.0, percent=1.0) == pytest.approx(expected, abs=0.001)
    assert widest_spread(moments[::-1], 8.0, percent=1.0) == pytest.approx(expected, abs=0.001)


def test_ends_of_the_range_of_spreads():
    always = carrier(30.0)
    good = Response(
        always.suits, np.asarray(1e-9), always.crossed, np.asarray(0.01), always.uplink, REQUIRED_DB
    )
    bad = Response(always.suits, np.asarray(9.0), always.crossed, always.leak, always.uplink, REQUIRED_DB)
    none = Response(
        np.asarray(np.nan), np.asarray(np.nan), always.crossed, always.leak, always.uplink, REQUIRED_DB
    )
    assert widest_spread([Scattered([good], 0.0)], 0.0, percent=1.0) == WIDEST_SPREAD_DEG
    assert widest_spread([Scattered([bad], 0.0)], 0.0, percent=1.0) == 0.0
    assert np.isnan(widest_spread([Scattered([none], 0.0)], 0.0, percent=1.0))


def test_chance_with_two_carriers_and_spread_of_power_against_a_million_draws():
    rng = np.random.default_rng(20270518)
    count, spread, eirp_spread, intended = 1_000_000, 6.0, 0.8, 12.0
    pair = [carrier(24.0, suits=4.0), carrier(30.0, suits=18.0)]
    settings = rng.normal(intended, spread, count)
    power = 10.0 ** (rng.normal(0.0, eirp_spread, count) / 10.0)
    fails = np.zeros(count, dtype=bool)
    for one in pair:
        # C/N of the definition: wanted·power over the noise of a perfectly set feed at the stated power
        ratio = np.cos(np.deg2rad(settings - one.suits)) ** 2 * power / one.noise
        fails |= 10.0 * np.log10(ratio) < REQUIRED_DB
    share = fails.mean()
    error_bar = np.sqrt(share * (1.0 - share) / count)
    found = fail_probability(pair, intended, spread_deg=spread, eirp_spread_db=eirp_spread) / 100.0
    assert abs(found - share) < 4.0 * error_bar


@pytest.fixture(scope="module")
def demo():
    scenario = load(demo_scenario())
    places = Places.of(np.linspace(-70.0, -58.0, 13), np.linspace(-50.0, -22.0, 13))
    return scenario, places


def test_tolerances_reach_to_what_each_moment_is_held_to(demo):
    scenario, places = demo
    names = ["setting_shared", "tolerance_low", "tolerance_high", "window_low", "window_high"]
    found = evaluate(scenario, places, names)
    width = found["window_high"] - found["window_low"]
    np.testing.assert_allclose(found["tolerance_low"] + found["tolerance_high"], width, atol=1e-9)
    assert np.isfinite(width).any()
    situation = Situation(scenario, places)
    for side, sign in (("low", -1.0), ("high", 1.0)):
        at = found["setting_shared"] + sign * found[f"tolerance_{side}"]
        excess = []
        for stand, best in ((BEFORE, situation.best_before), (UNTOUCHED, situation.best_after)):
            rule = scenario.decision
            held = np.where(best < rule.reserve_db, best - rule.allowed_loss_db, rule.reserve_db)
            excess.append(situation.deciding_margin(stand, at) - held)
        known = np.isfinite(width) & (width < 180.0)
        # At the end of the window one moment is exactly at its limit.
        np.testing.assert_allclose(np.minimum(*excess)[known], 0.0, atol=1e-6)


def test_the_spread_needed_gives_the_stated_chance(demo):
    scenario, places = demo
    needed = evaluate(scenario, places, ["spread_needed"])["spread_needed"]
    inner = (needed > 0.01) & (needed < WIDEST_SPREAD_DEG)
    assert inner.sum() >= 3
    columns = {"setting_spread_deg": needed}
    at_needed = Places(places.longitude, places.latitude, places.height, columns=columns)
    found = evaluate(scenario, at_needed, ["fail_shared_before", "fail_shared_after"])
    larger = np.maximum(found["fail_shared_before"], found["fail_shared_after"])
    # The spread is found to 0.001° from below: the chance comes out at or just under 1 %.
    assert np.all(larger[inner] <= 1.0 + 1e-9)
    assert np.all(larger[inner] > 0.97)


def test_chances_of_the_policies_agree_with_each_other(demo):
    scenario, places = demo
    shared = evaluate(scenario, places, ["setting_shared"])["setting_shared"]
    there = Places(places.longitude, places.latitude, places.height, columns={"setting_deg": shared})
    untouched = evaluate(scenario, there, ["fail_probability"])["fail_probability"]
    after = evaluate(scenario, places, ["fail_shared_after"])["fail_shared_after"]
    # A feed that stands at the shared setting already is an untouched one.
    np.testing.assert_allclose(untouched, after, atol=1e-9)
    # Same slot: a feed that stands at the new satellite's skew is a realigned one.
    skew = evaluate(scenario, places, ["setting_realigned"])["setting_realigned"]
    there = Places(places.longitude, places.latitude, places.height, columns={"setting_deg": skew})
    untouched = evaluate(scenario, there, ["fail_probability"])["fail_probability"]
    realigned = evaluate(scenario, places, ["fail_realigned"])["fail_realigned"]
    np.testing.assert_allclose(untouched, realigned, atol=1e-9)
