"""Order of the actions, and the chance of failure against closed forms and draws."""

from __future__ import annotations

import itertools
from dataclasses import replace

import numpy as np
import pytest
from scipy import stats

from geoskew import decision
from geoskew.decision import fail_probability
from geoskew.link import Response

NAMES = dict(decision.ACTIONS)


def response(suits=0.0, noise_db=10.0, **more):
    terms = {"crossed": 1.0, "leak": 0.004, "uplink": 0.003} | {
        key: more.pop(key) for key in ("crossed", "leak", "uplink") if key in more
    }
    return Response(
        suits=np.asarray(suits, dtype=float),
        noise=np.asarray(10.0 ** (-np.asarray(noise_db) / 10.0)),
        **{key: np.asarray(value) for key, value in terms.items()},
        required_db=6.0,
        **more,
    )


# Actions


def by_the_book(*, usable, untouched, realigned, without_aiming, window, slots_differ, reserve):
    """The rule in words, one place at a time; a margin that is not there keeps no reserve."""
    if not usable:
        return "no-sight"
    if not realigned >= reserve:
        return "upgrade"
    if untouched >= reserve:
        return "leave"
    if window:
        return "preset"
    if slots_differ and not without_aiming >= reserve:
        return "re-aim"
    return "turn-at-changeover"


@pytest.mark.parametrize("slots_differ", [False, True])
def test_order_of_precedence(slots_differ):
    margins = [3.0, 1.0, 0.99, -8.0, np.nan]
    cases = list(itertools.product([True, False], margins, margins, margins, [True, False]))
    usable, untouched, realigned, without, window = (np.array(column) for column in zip(*cases, strict=True))
    codes = decision.action(
        new_satellite_usable=usable,
        margin_untouched=untouched,
        margin_realigned=realigned,
        best_without_aiming=without,
        window_exists=window,
        reserve_db=1.0,
        slots_differ=slots_differ,
    )
    assert codes.dtype == np.uint8
    expected = [
        by_the_book(
            usable=case[0],
            untouched=case[1],
            realigned=case[2],
            without_aiming=case[3],
            window=case[4],
            slots_differ=slots_differ,
            reserve=1.0,
        )
        for case in cases
    ]
    assert [NAMES[int(code)] for code in codes] == expected
    assert len(set(expected)) == (6 if slots_differ else 5)


def test_names_and_codes_of_the_interface():
    assert NAMES == {
        0: "leave",
        1: "preset",
        2: "turn-at-changeover",
        3: "re-aim",
        4: "upgrade",
        5: "no-sight",
    }


def test_no_preset_where_no_turn_helps():
    codes = decision.action(
        new_satellite_usable=True,
        margin_untouched=0.0,
        margin_realigned=5.0,
        best_without_aiming=0.0,
        window_exists=True,
        reserve_db=1.0,
        slots_differ=True,
        turning_helps=False,
    )
    assert NAMES[int(codes)] == "re-aim"


# Chance of failure


def zero_margin(one):
    """The angle at which the margin is zero, found by bisection of the margin itself."""
    low, high = 0.0, 90.0
    for _ in range(80):
        middle = 0.5 * (low + high)
        low, high = (middle, high) if float(one.margin(one.suits + middle)) > 0.0 else (low, middle)
    return low


@pytest.mark.parametrize("spread", [1.0, 3.0, 8.0])
def test_one_flank_is_a_normal_distribution(spread):
    # The feed is off by so much that only one end of the good settings matters.
    one = response(suits=40.0, noise_db=9.0)
    end = zero_margin(one)
    for short in (-6.0, -1.0, 0.0, 2.0, 5.0):
        intended = 40.0 - end + short
        expected = 100.0 * (stats.norm.cdf(-short / spread) + stats.norm.sf((2.0 * end - short) / spread))
        assert float(fail_probability([one], intended, spread_deg=spread)) == pytest.approx(
            expected, abs=1e-6
        )


@pytest.mark.parametrize("spread", [3.0, 20.0, 45.0])
def test_both_flanks_wrapped(spread):
    one = response(suits=10.0, noise_db=9.0)
    end = zero_margin(one)
    # Good settings come back every half turn.
    good = sum(
        stats.norm.cdf((10.0 + end + 180.0 * k - 25.0) / spread)
        - stats.norm.cdf((10.0 - end + 180.0 * k - 25.0) / spread)
        for k in range(-6, 7)
    )
    found = float(fail_probability([one], 25.0, spread_deg=spread))
    assert found == pytest.approx(100.0 * (1.0 - good), abs=1e-8)


def test_without_spread_it_is_yes_or_no():
    margins = response(suits=np.array([0.0, 20.0, 60.0, np.nan]), noise_db=9.0)
    chance = fail_probability([margins], 0.0, spread_deg=0.0)
    assert chance[:3].tolist() == [100.0 if margin < 0.0 else 0.0 for margin in margins.margin(0.0)[:3]]
    assert np.isnan(chance[3])
    assert set(chance[:3].tolist()) == {0.0, 100.0}


def test_certain_failure_and_certain_success():
    hopeless = response(noise_db=5.0)
    splendid = response(noise_db=25.0, leak=0.5, crossed=0.0)
    for eirp_spread in (0.0, 0.2):
        bad = float(fail_probability([hopeless], 0.0, spread_deg=20.0, eirp_spread_db=eirp_spread))
        assert bad == pytest.approx(100.0, abs=1e-5)
        good = float(fail_probability([splendid], 0.0, spread_deg=20.0, eirp_spread_db=eirp_spread))
        assert good == pytest.approx(0.0, abs=1e-9)


def test_eirp_spread_alone_is_a_normal_distribution():
    # Without a spread of settings and with nothing but noise, margin and EIRP move dB by dB.
    for off in (0.0, 15.0):
        one = response(noise_db=8.0, crossed=0.0, uplink=0.0)
        margin = float(one.margin(off))
        for sigma in (0.3, 1.0, 4.0):
            expected = 100.0 * stats.norm.cdf(-margin / sigma)
            found = float(fail_probability([one], off, spread_deg=0.0, eirp_spread_db=sigma))
            assert found == pytest.approx(expected, abs=1e-9)


def weaker(one, decibels):
    """The same carrier with its satellite's EIRP raised by draws: noise and neighbours against it fall."""
    factor = 10.0 ** (-decibels / 10.0)
    keys = ("noise", "neighbour_even", "neighbour_cosine", "neighbour_sine")
    return replace(one, **{key: getattr(one, key) * factor for key in keys})


CARRIERS = {
    "one": [response(suits=12.0, noise_db=9.0)],
    "several": [response(suits=12.0, noise_db=9.0), response(suits=3.0, noise_db=9.5, crossed=0.3)],
    "two ports": [
        response(suits=5.0, noise_db=14.0),
        response(suits=-85.0, noise_db=14.0, crossed=0.0, leak=0.4),
    ],
    "phasors": [response(suits=8.0, noise_db=12.0, leak=0.08, phasors=True)],
    "circular": [response(suits=8.0, noise_db=6.8, fixed=0.0)],
    "neighbour": [
        response(suits=10.0, noise_db=10.0, neighbour_even=0.03, neighbour_cosine=0.01, neighbour_sine=-0.02)
    ],
}


@pytest.mark.parametrize("eirp_spread", [0.0, 0.1, 0.5, 2.0])
@pytest.mark.parametrize("spread", [0.0, 3.0, 20.0])
@pytest.mark.parametrize("kind", CARRIERS)
def test_against_a_million_draws(kind, spread, eirp_spread):
    carriers = CARRIERS[kind]
    rng = np.random.default_rng(20270518)
    draws = 1_000_000
    if spread == 0.0 and eirp_spread == 0.0:
        draws = 1
    settings = rng.normal(0.0, spread, draws) if spread else np.zeros(draws)
    power = rng.normal(0.0, eirp_spread, draws) if eirp_spread else np.zeros(draws)
    margin = np.minimum.reduce(
        [np.broadcast_to(weaker(one, power).margin(settings), (draws,)) for one in carriers]
    )
    share = float(np.mean(margin < 0.0))
    found = float(fail_probability(carriers, 0.0, spread_deg=spread, eirp_spread_db=eirp_spread)) / 100.0
    # Four standard errors of the draws, and what the quadrature is stated to be good for where EIRP scatters.
    error = 4.0 * np.sqrt(max(share * (1.0 - share), 1e-6) / draws) if draws > 1 else 0.0
    assert found == pytest.approx(share, abs=error + (2e-3 if eirp_spread else 1e-9))


def test_shapes_and_spread_of_each_place():
    suits = np.array([[0.0, 5.0, 10.0], [15.0, 20.0, np.nan]])
    one = response(suits=suits, noise_db=9.0)
    spread = np.array([1.0, 3.0, 10.0])
    for eirp_spread in (0.0, 0.5):
        chance = fail_probability([one], 2.0, spread_deg=spread, eirp_spread_db=eirp_spread)
        assert chance.shape == (2, 3)
        assert np.isnan(chance).tolist() == np.isnan(suits).tolist()
        for row, column in ((0, 1), (1, 0)):
            alone = fail_probability(
                [response(suits=suits[row, column], noise_db=9.0)],
                2.0,
                spread_deg=spread[column],
                eirp_spread_db=eirp_spread,
            )
            assert float(alone) == pytest.approx(chance[row, column], rel=1e-12)


def test_more_spread_of_a_good_feed_fails_more():
    one = response(suits=4.0, noise_db=9.0)
    chances = [
        float(fail_probability([one], 0.0, spread_deg=spread)) for spread in (0.5, 2.0, 5.0, 10.0, 20.0)
    ]
    assert chances == sorted(chances)
