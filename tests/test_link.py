"""Margins and arcs of good settings against budgets written out place by place and dense scans."""

from __future__ import annotations

import math

import numpy as np
import pytest

from geoskew import constants, link, receiver
from geoskew.link import Response, carrier_to_noise

KINDS = ("plain", "phasors", "neighbours", "uplink", "empty crossed")
COUNT = 120


def test_boltzmann():
    # −10·log10 of k = 1.380649e-23 J/K, exact by the SI of 2019.
    assert pytest.approx(-10.0 * math.log10(1.380649e-23), abs=1e-6) == constants.BOLTZMANN_DB


def test_worked_carrier_to_noise():
    # cn-1, worked by hand: 50 dBW over 38 000 km at 12 GHz (205.6271 dB), 0.12 dB of gas, G/T 22.745 dB/K:
    # C/N0 95.597 dBHz, C/N 21.204 dB at 27.5 Mbaud.
    loss = receiver.free_space_loss(38_000.0, frequency_ghz=12.0) + 0.12
    ratio = carrier_to_noise(50.0, losses_db=loss, figure_of_merit_db=22.745, symbol_rate_mbaud=27.5)
    assert float(ratio) == pytest.approx(21.204, abs=6e-4)
    assert float(ratio) + 10.0 * math.log10(27.5e6) == pytest.approx(95.597, abs=6e-4)


def test_no_coverage_gives_no_value():
    values = carrier_to_noise([50.0, np.nan], losses_db=205.0, figure_of_merit_db=20.0, symbol_rate_mbaud=8.0)
    assert np.isnan(values).tolist() == [False, True]
    assert link.inverse(None) == 0.0
    assert float(link.inverse(20.0)) == pytest.approx(0.01)


def make(kind, seed=1):
    rng = np.random.default_rng(seed)
    phasors = kind == "phasors"
    isolation = rng.uniform(12.0, 30.0, COUNT)
    more = {}
    if kind == "neighbours":
        power, apart = rng.uniform(0.0, 0.2, COUNT), rng.uniform(-np.pi, np.pi, COUNT)
        more = {
            "neighbour_even": 0.52 * power,
            "neighbour_cosine": 0.48 * power * np.cos(apart),
            "neighbour_sine": 0.48 * power * np.sin(apart),
        }
    return Response(
        suits=rng.uniform(-90.0, 90.0, COUNT),
        noise=10.0 ** (-rng.uniform(4.0, 25.0, COUNT) / 10.0),
        crossed=np.asarray(0.0 if kind == "empty crossed" else 10.0 ** rng.uniform(-1.0, 0.3)),
        leak=10.0 ** (-isolation / (20.0 if phasors else 10.0)),
        uplink=np.asarray(10.0 ** (-2.0) if kind == "uplink" else 0.0),
        required_db=5.0,
        phasors=phasors,
        **more,
    )


def at(value, index):
    return float(np.broadcast_to(value, (COUNT,))[index])


def margin_by_hand(one, index, setting):
    """The margin of one place from powers, with the conventions' formulas and nothing else."""
    d = math.radians(setting - at(one.suits, index))
    leak = at(one.leak, index)
    if one.phasors:
        wanted = max(0.0, abs(math.cos(d)) - leak * abs(math.sin(d))) ** 2
        crossed = (abs(math.sin(d)) + leak * abs(math.cos(d))) ** 2
    else:
        wanted = math.cos(d) ** 2 + leak * math.sin(d) ** 2
        crossed = math.sin(d) ** 2 + leak * math.cos(d) ** 2
    if wanted == 0.0:
        return -math.inf
    interference = at(one.crossed, index) * crossed + at(one.neighbour_even, index)
    interference += at(one.neighbour_cosine, index) * math.cos(2.0 * d)
    interference += at(one.neighbour_sine, index) * math.sin(2.0 * d)
    total = at(one.uplink, index) + (at(one.noise, index) + interference) / wanted
    return -10.0 * math.log10(total) - one.required_db


@pytest.mark.parametrize("kind", KINDS)
def test_margin_against_a_plain_loop(kind):
    one = make(kind)
    settings = np.random.default_rng(2).uniform(-400.0, 400.0, COUNT)
    margins = one.margin(settings)
    for index, setting in enumerate(settings):
        expected = margin_by_hand(one, index, setting)
        if math.isinf(expected):
            # Nothing is left of the wanted carrier: a margin that is a number, and hopeless.
            assert margins[index] < -90.0
        else:
            assert margins[index] == pytest.approx(expected, abs=1e-8)


@pytest.mark.parametrize("kind", KINDS)
@pytest.mark.parametrize("level", [-35.0, -15.0, -3.0, 0.0, 1.0, 6.0, 14.0])
def test_arc_against_a_dense_scan(kind, level):
    one = make(kind, seed=3)
    middle, half = one.arc(level)
    offsets = np.arange(-90.0, 90.0, 0.05)
    column = {
        key: np.broadcast_to(getattr(one, key), (COUNT,))[:, None] for key in ("suits", "noise", "leak")
    }
    neighbours = {
        key: np.broadcast_to(getattr(one, key), (COUNT,))[:, None]
        for key in ("neighbour_even", "neighbour_cosine", "neighbour_sine")
    }
    wide = Response(
        **column, **neighbours, crossed=one.crossed, uplink=one.uplink, required_db=5.0, phasors=one.phasors
    )
    good = wide.margin(middle[:, None] + offsets) >= level
    # Up to the scan's step, the arc is what is good.
    assert np.all(good[np.abs(offsets)[None, :] <= half[:, None] - 0.051])
    assert not np.any(good[np.abs(offsets)[None, :] >= half[:, None] + 0.051])
    assert np.array_equal(half >= link.WHOLE_CIRCLE, good.all(axis=1))
    # At the ends of an arc the margin is the level.
    ends = (half > 0.0) & (half < link.WHOLE_CIRCLE)
    for side in (-1.0, 1.0):
        np.testing.assert_allclose(one.margin(middle + side * half)[ends], level, atol=1e-6)


def test_scans_see_every_kind_of_arc():
    halves = np.concatenate([make("plain", seed=3).arc(level)[1] for level in (-35.0, -3.0, 1.0, 14.0)])
    assert np.any(halves < 0.0)
    assert np.any(halves >= link.WHOLE_CIRCLE)
    assert np.any((halves > 1.0) & (halves < 89.0))


@pytest.mark.parametrize("kind", KINDS)
def test_no_setting_is_better_than_the_bound(kind):
    one = make(kind, seed=4)
    best = np.max([one.margin(one.suits + offset) for offset in np.arange(-90.0, 90.0, 0.5)], axis=0)
    assert np.all(best <= one.best_bound() + 1e-9)
    if kind != "neighbours":
        np.testing.assert_allclose(best, one.best_bound(), atol=1e-9)
    assert np.all(one.arc(one.best_bound() + 1e-6)[1] < 0.0)


@pytest.mark.parametrize("fixed", [0.0, 45.0])
def test_circular_polarisation(fixed):
    one = Response(
        suits=np.array([10.0, np.nan]),
        noise=np.array([0.05, 0.05]),
        crossed=np.ones(()),
        leak=np.asarray(0.004),
        uplink=np.zeros(()),
        required_db=5.0,
        fixed=fixed,
    )
    margins = np.array([one.margin(setting) for setting in (-70.0, 0.0, 33.0)])
    assert np.ptp(margins[:, 0]) == 0.0
    assert np.isnan(margins[:, 1]).all()
    # Circular into circular: isolation alone; linear into circular: half of both carriers.
    factor, crossed = (1.0, 0.004) if fixed == 0.0 else (0.502, 0.502)
    assert margins[0, 0] == pytest.approx(-10.0 * math.log10((0.05 + crossed) / factor) - 5.0, abs=1e-9)
    assert one.arc(margins[0, 0] - 0.1)[1].tolist()[0] >= link.WHOLE_CIRCLE
    assert one.arc(margins[0, 0] + 0.1)[1].tolist()[0] < 0.0
    assert np.isnan(one.arc(0.0)[1][1])


def test_a_circular_carrier_without_coverage_has_no_arc():
    one = Response(
        suits=np.array([10.0]),
        noise=np.array([np.nan]),
        crossed=np.ones(()),
        leak=np.asarray(0.004),
        uplink=np.zeros(()),
        required_db=5.0,
        fixed=0.0,
    )
    assert np.isnan(one.arc(0.0)[1][0])
    assert np.isnan(one.margin(0.0)[0])


def test_uplink_noise_does_not_change_with_the_setting():
    # Uplink alone, 20 dB: a feed that is off leaves the ratio as it is.
    one = Response(
        suits=np.zeros(1),
        noise=np.zeros(1),
        crossed=np.zeros(()),
        leak=np.asarray(0.004),
        uplink=np.asarray(0.01),
        required_db=5.0,
    )
    np.testing.assert_allclose(one.margin(np.array([0.0, 30.0, 80.0])), 15.0, atol=1e-12)


@pytest.mark.parametrize("kind", KINDS)
def test_room_for_noise(kind):
    one = make(kind, seed=6)
    settings = np.random.default_rng(7).uniform(-90.0, 90.0, COUNT)
    room = one.room_for_noise(1.0, settings)
    some = room > 0.0
    assert some.any()
    grown = Response(
        suits=one.suits,
        noise=one.noise * room,
        crossed=one.crossed,
        leak=one.leak,
        uplink=one.uplink,
        required_db=one.required_db,
        phasors=one.phasors,
        neighbour_even=one.neighbour_even * room,
        neighbour_cosine=one.neighbour_cosine * room,
        neighbour_sine=one.neighbour_sine * room,
    )
    np.testing.assert_allclose(grown.margin(settings)[some], 1.0, atol=1e-7)


def test_arcs_about_one_middle_are_one():
    suits = np.array([0.0, 20.0])
    terms = {"crossed": np.ones(()), "leak": np.asarray(0.004), "uplink": np.zeros(())}
    strong = Response(suits=suits, noise=np.array([0.02, 0.1]), required_db=5.0, **terms)
    weak = Response(suits=suits, noise=np.array([0.05, 0.05]), required_db=5.0, **terms)
    other = Response(suits=suits + 90.0, noise=np.array([0.05, 0.05]), required_db=5.0, **terms)
    arcs = link.merged_arcs([strong, weak, other], [strong.allowed(1.0)] * 3)
    assert len(arcs) == 2
    np.testing.assert_array_equal(arcs[0][1], np.minimum(strong.arc(1.0)[1], weak.arc(1.0)[1]))
    np.testing.assert_array_equal(arcs[1][1], other.arc(1.0)[1])
