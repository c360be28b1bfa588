"""The shared setting and its window against dense scans over all settings, and the rules of ties and reserve."""

from __future__ import annotations

from dataclasses import fields, replace

import numpy as np
import pytest

from geoskew import policies
from geoskew.angles import fold
from geoskew.link import Response
from geoskew.policies import Curve, held_to, shared_setting

RESERVE, ALLOWED = 1.0, 0.5
MANY, FEW = 1000, 250
TERMS = ("noise", "crossed", "uplink", "neighbour_even", "neighbour_cosine", "neighbour_sine")


def response(suits, noise_db, *, isolation_db=23.0, crossed=1.0, uplink_db=26.0, required_db=6.0, **more):
    phasors = more.get("phasors", False)
    leak = 10.0 ** (-np.asarray(isolation_db) / (20.0 if phasors else 10.0))
    suits = np.asarray(suits, dtype=float)
    return Response(
        suits=suits,
        noise=10.0 ** (-np.asarray(noise_db) / 10.0) + 0.0 * suits,
        crossed=np.asarray(crossed),
        leak=leak,
        uplink=10.0 ** (-np.asarray(uplink_db) / 10.0),
        required_db=required_db,
        **more,
    )


def curves_of(responses, groups):
    """Curves held to the reserve or to the best margin of their moment; `groups` says which moment each is of."""
    curves = []
    for moment in sorted(set(groups)):
        here = [one for one, group in zip(responses, groups, strict=True) if group == moment]
        best = np.minimum.reduce(np.broadcast_arrays(*(one.margin(here[0].suits) for one in here)))
        held = held_to(best, reserve_db=RESERVE, allowed_loss_db=ALLOWED)
        curves += [Curve(one, held) for one in here]
    return curves


def plain_excess(curves, settings):
    """The least excess at settings (places, settings), from nothing but each curve's margin formula written out."""
    least = np.full(settings.shape, np.inf)
    for one, held in curves:
        d = np.deg2rad(settings - np.broadcast_to(one.suits, held.shape)[:, None])
        leak = np.broadcast_to(one.leak, held.shape)[:, None]
        if one.fixed is not None:
            d = np.full_like(d, np.deg2rad(one.fixed))
        if one.phasors:
            wanted = np.maximum(0.0, np.abs(np.cos(d)) - leak * np.abs(np.sin(d))) ** 2
            crossed = (np.abs(np.sin(d)) + leak * np.abs(np.cos(d))) ** 2
        else:
            wanted = np.cos(d) ** 2 + leak * np.sin(d) ** 2
            crossed = np.sin(d) ** 2 + leak * np.cos(d) ** 2
        noise, offset, uplink, even, cosine, sine = (
            np.broadcast_to(np.asarray(getattr(one, name), dtype=float), held.shape)[:, None]
            for name in TERMS
        )
        others = even + cosine * np.cos(2.0 * d) + sine * np.sin(2.0 * d)
        with np.errstate(divide="ignore"):
            total = uplink + (noise + offset * crossed + others) / wanted
            least = np.minimum(least, -10.0 * np.log10(total) - one.required_db - held[:, None])
    return least


def scan(curves, count):
    """All settings in steps of 0.1°, and the three best peaks refined in steps of 0.001°; with their excess."""
    coarse = np.broadcast_to(np.arange(-90.0, 90.0, 0.1), (count, 1800))
    excess = plain_excess(curves, coarse)
    peak = (excess >= np.roll(excess, 1, axis=1)) & (excess >= np.roll(excess, -1, axis=1))
    best = np.argsort(np.where(peak, excess, -np.inf), axis=1)[:, -3:]
    fine = (np.take_along_axis(coarse, best, axis=1)[:, :, None] + np.arange(-0.11, 0.11, 0.001)).reshape(
        count, -1
    )
    excess = plain_excess(curves, fine)
    at = np.argmax(excess, axis=1)[:, None]
    return np.take_along_axis(fine, at, axis=1)[:, 0], np.take_along_axis(excess, at, axis=1)[:, 0]


def assert_is_the_best(curves, present, *, degrees=0.01):
    shared = shared_setting(curves, present)
    assert np.all(np.isfinite(shared.turn))
    assert np.all((shared.turn > -90.0) & (shared.turn <= 90.0))
    setting, excess = scan(curves, present.size)
    ours = plain_excess(curves, (present + shared.turn)[:, None])[:, 0]
    np.testing.assert_allclose(ours, shared.excess, atol=1e-9)
    # Nothing in the scan is better than ours by more than rounding.
    assert np.all(ours >= excess - 1e-7)
    # Where the scan's best is elsewhere, it must be a tie of another place on the circle.
    apart = np.abs(fold(setting - present - shared.turn))
    elsewhere = apart > degrees
    assert np.all(np.abs(ours - excess)[elsewhere] < 1e-4)
    assert elsewhere.mean() < 0.02
    assert_window(curves, present, shared)
    return shared


def assert_window(curves, present, shared):
    """The window is the stretch of good settings about ours, step by step of 0.01°."""
    excess = plain_excess(curves, (present + shared.turn)[:, None])[:, 0]
    assert np.array_equal(np.isfinite(shared.low), excess >= 0.0) or np.all(
        np.abs(excess[np.isfinite(shared.low) != (excess >= 0.0)]) < 1e-7
    )
    has = np.isfinite(shared.low)
    assert np.array_equal(has, np.isfinite(shared.high))
    assert np.all(shared.low[has] <= shared.turn[has])
    assert np.all(shared.turn[has] <= shared.high[has])
    steps = np.arange(0.0, 180.0, 0.01)
    for index in np.flatnonzero(has)[:25]:
        one = [Curve(pick(curve.response, index), curve.held_to[index : index + 1]) for curve in curves]
        for side, end in ((-1.0, shared.low[index]), (1.0, shared.high[index])):
            good = (
                plain_excess(one, (present[index] + shared.turn[index] + side * steps)[None, :])[0] >= -1e-9
            )
            if good.all():
                assert end == 90.0 * side
            else:
                found = steps[int(np.argmin(good))]
                assert abs(end - shared.turn[index]) == pytest.approx(found - 0.005, abs=0.0101)


def pick(one, index):
    """The response of one place."""
    keys = (
        "suits",
        "noise",
        "crossed",
        "leak",
        "uplink",
        "neighbour_even",
        "neighbour_cosine",
        "neighbour_sine",
    )
    chosen = {}
    for key in keys:
        value = np.asarray(getattr(one, key), dtype=float)
        chosen[key] = value[index : index + 1] if value.ndim else value
    return replace(one, **chosen)


def two_moments(seed, *, widest=90.0, count=FEW, **more):
    rng = np.random.default_rng(seed)
    before = fold(rng.uniform(-90.0, 90.0, count))
    after = fold(before + rng.uniform(-widest, widest, count))
    noise = rng.uniform(6.0, 20.0, (2, count))
    isolation = rng.uniform(12.0, 28.0, (2, count))
    return (
        before,
        after,
        [
            response(before, noise[0], isolation_db=isolation[0], **more),
            response(after, noise[1], isolation_db=isolation[1], crossed=0.4, **more),
        ],
    )


def test_shared_setting_on_random_places():
    before, _, responses = two_moments(1, count=MANY)
    shared = assert_is_the_best(curves_of(responses, (0, 1)), before)
    # The sample holds windows, places without one, and kinks between the two.
    assert 0.05 < np.isfinite(shared.low).mean() < 0.95


def test_measured_present_setting():
    before, _, responses = two_moments(2)
    measured = fold(before + np.random.default_rng(3).normal(0.0, 15.0, FEW))
    assert_is_the_best(curves_of(responses, (0, 1)), measured)


def test_several_carriers():
    rng = np.random.default_rng(4)
    before, after, responses = two_moments(5, widest=60.0)
    # A second carrier a moment with another threshold; after the changeover on the other port of a single feed.
    more = [
        response(before, rng.uniform(8.0, 22.0, FEW), required_db=3.0, uplink_db=18.0),
        response(fold(after + 90.0), rng.uniform(14.0, 22.0, FEW), required_db=1.0),
    ]
    assert_is_the_best(curves_of([responses[0], more[0], responses[1], more[1]], (0, 0, 1, 1)), before)


def test_carriers_that_suit_alike():
    # Equal angles that are not one array, and rounded apart by a hair: rounding must not lose the places.
    before, after, responses = two_moments(6, widest=60.0)
    twins = [
        response(fold(before + 180.0), 15.0),
        response(after.copy(), 14.0),
        response(fold(after - 180.0), 13.0),
    ]
    assert_is_the_best(curves_of([responses[0], twins[0], responses[1], *twins[1:]], (0, 0, 1, 1, 1)), before)


def test_worst_phasors():
    before, _, responses = two_moments(7, widest=70.0, phasors=True)
    assert_is_the_best(curves_of(responses, (0, 1)), before)


def test_polarised_neighbours():
    rng = np.random.default_rng(8)
    before, _, responses = two_moments(9, widest=60.0)
    with_neighbours = []
    for one in responses:
        power, apart = rng.uniform(0.0, 0.08, FEW), rng.uniform(0.0, 2.0 * np.pi, FEW)
        with_neighbours.append(
            replace(
                one,
                neighbour_even=0.55 * power,
                neighbour_cosine=0.45 * power * np.cos(apart),
                neighbour_sine=0.45 * power * np.sin(apart),
            )
        )
    assert_is_the_best(curves_of(with_neighbours, (0, 1)), before)


def test_circular_carrier_that_binds():
    # One carrier is circular and the weakest: a whole part of the circle is best, and the smallest turn is taken.
    before = np.linspace(-80.0, 80.0, 9)
    linear = response(before, 16.0)
    later = response(fold(before + 20.0), 16.0)
    circular = response(before, 7.5, fixed=0.0)
    level = np.zeros(9)
    curves = [Curve(one, level) for one in (linear, circular, later)]
    bound = circular.margin(0.0)
    shared = shared_setting(curves, before)
    np.testing.assert_allclose(shared.excess, bound, atol=1e-7)
    # Where the present setting is among the best, nothing is turned.
    assert np.all(plain_excess([curves[0], curves[2]], before[:, None])[:, 0] > bound)
    np.testing.assert_allclose(shared.turn, 0.0, atol=1e-9)
    # From a present setting that is not, the turn goes to the nearest of the best and no further.
    far = fold(before - 55.0)
    shared = shared_setting(curves, far)
    np.testing.assert_allclose(shared.excess, bound, atol=1e-7)
    short = plain_excess(curves, (far + shared.turn - 0.01 * np.sign(shared.turn))[:, None])[:, 0]
    assert np.all(short < bound - 1e-5)


def test_settings_that_are_all_alike():
    # Every setting keeps what the circular carrier allows: turn 0, window from −90° to 90°.
    circular = response(np.zeros(3), -20.0, fixed=0.0)
    linear = response(np.array([0.0, 30.0, -70.0]), 25.0, isolation_db=6.0)
    shared = shared_setting([Curve(linear, np.full(3, -40.0)), Curve(circular, np.full(3, -40.0))], 12.0)
    assert shared.turn.tolist() == [0.0, 0.0, 0.0]
    assert shared.low.tolist() == [-90.0] * 3
    assert shared.high.tolist() == [90.0] * 3


def test_half_way_with_equal_margins():
    # Common practice, no source: with equal margins and isolations the shared setting is half-way.
    apart = np.linspace(-88.0, 88.0, 45)
    present = np.full(apart.shape, 17.0)
    both = [response(present, 14.0), response(fold(present + apart), 14.0)]
    shared = shared_setting(curves_of(both, (0, 1)), present)
    np.testing.assert_allclose(shared.turn, apart / 2.0, atol=1e-5)


def test_wrong_way_is_one_and_a_half():
    # Common practice, no source: the shared turn of half the difference, made the wrong way, leaves one and a
    # half of it: 26° apart, 13° to turn, 39° off.
    present = np.array([4.0])
    both = [response(present, 14.0), response(present + 26.0, 14.0)]
    turn = shared_setting(curves_of(both, (0, 1)), present).turn
    assert float(turn[0]) == pytest.approx(13.0, abs=1e-5)
    wrong = present - turn
    assert float(fold(wrong - (present + 26.0))[0]) == pytest.approx(-39.0, abs=1e-5)


def test_ties_go_to_the_smaller_turn():
    # 90° apart there are two half-ways, 45° to either side of the aligned setting.
    aligned = np.zeros(2)
    both = [response(aligned, 14.0), response(aligned + 90.0, 14.0)]
    shared = shared_setting(curves_of(both, (0, 1)), np.array([-10.0, 10.0]))
    np.testing.assert_allclose(shared.turn, [-35.0, 35.0], atol=1e-5)


def test_then_clockwise():
    aligned = np.array([0.0, 25.0, -80.0])
    both = [response(aligned, 14.0), response(fold(aligned + 90.0), 14.0)]
    shared = shared_setting(curves_of(both, (0, 1)), aligned)
    np.testing.assert_allclose(shared.turn, 45.0, atol=1e-5)


def test_optimum_on_a_kink():
    # The old carrier has little to spare and the new one much: the setting stays near the old one, exactly where
    # both excesses are equal.
    present = np.zeros(1)
    both = [response(present, 9.0), response(present + 30.0, 18.0)]
    curves = curves_of(both, (0, 1))
    shared = shared_setting(curves, present)
    old, new = (curve.response.margin(shared.turn) - curve.held_to for curve in curves)
    assert float(old[0]) == pytest.approx(float(new[0]), abs=1e-6)
    assert 0.0 < float(shared.turn[0]) < 15.0


def test_optimum_on_a_peak():
    # The old carrier is far better than the new one: the best setting is the new one's own.
    present = np.zeros(1)
    both = [response(present, 25.0, uplink_db=40.0), response(present + 8.0, 9.0)]
    shared = shared_setting(curves_of(both, (0, 1)), present)
    assert float(shared.turn[0]) == pytest.approx(8.0, abs=0.005)


def test_everything_good():
    # Isolations so poor and thresholds so low that no setting misses anything.
    easy = {"isolation_db": 3.0, "required_db": -12.0}
    both = [response(np.zeros(2), 20.0, **easy), response(np.full(2, 40.0), 20.0, **easy)]
    shared = shared_setting(curves_of(both, (0, 1)), np.array([0.0, -30.0]))
    assert shared.low.tolist() == [-90.0, -90.0]
    assert shared.high.tolist() == [90.0, 90.0]
    assert np.all(np.isfinite(shared.turn))


def test_window_beyond_a_right_angle_is_not_folded():
    # A turn of 80° with 20° to spare on either side: the window ends beyond 90° and does not come back at −80°.
    present = np.array([-40.0])
    both = [response(np.array([40.0]), 14.0), response(np.array([40.0]), 14.0)]
    shared = shared_setting(curves_of(both, (0, 1)), present)
    assert float(shared.turn[0]) == pytest.approx(80.0, abs=0.005)
    assert shared.low[0] < 80.0 < 90.0 < shared.high[0]


def test_no_good_setting():
    # The window loses its values, the setting keeps its own.
    both = [response(np.zeros(1), 8.5), response(np.full(1, 70.0), 8.5)]
    shared = shared_setting(curves_of(both, (0, 1)), np.zeros(1))
    assert np.isnan(shared.low[0])
    assert np.isnan(shared.high[0])
    assert float(shared.turn[0]) == pytest.approx(35.0, abs=1e-5)
    assert shared.excess[0] < 0.0


def test_places_without_a_satellite():
    suits = np.array([0.0, np.nan, 10.0])
    noise = np.array([14.0, 14.0, np.nan])
    shared = shared_setting(
        curves_of([response(np.zeros(3), 14.0), response(suits, noise)], (0, 1)), np.zeros(3)
    )
    for values in shared.__dict__.values():
        assert np.isnan(values).tolist() == [False, True, True]


def test_nothing_to_lose_and_nothing_allowed():
    # One angle suits both, neither keeps the reserve and no loss is allowed: that angle is the window.
    both = [response(np.full(1, 5.0), 6.5), response(np.full(1, 5.0), 6.2)]
    curves = [
        Curve(one, held_to(one.margin(one.suits), reserve_db=RESERVE, allowed_loss_db=0.0)) for one in both
    ]
    shared = shared_setting(curves, np.zeros(1))
    assert shared.low[0] <= shared.turn[0] <= shared.high[0]
    assert float(shared.turn[0]) == pytest.approx(5.0, abs=0.01)


def test_what_a_moment_is_held_to():
    best = np.array([3.0, 1.0, 0.9, -5.0, np.nan])
    held = held_to(best, reserve_db=1.0, allowed_loss_db=0.5)
    np.testing.assert_allclose(held, [1.0, 1.0, 0.4, -5.5, np.nan])


def test_grid_equals_list():
    before, _, responses = two_moments(11)
    curves = curves_of(responses, (0, 1))
    flat = shared_setting(curves, before)
    shape = (10, 25)

    def folded_up(one):
        arrays = {f.name: getattr(one, f.name) for f in fields(one) if np.ndim(getattr(one, f.name)) == 1}
        return replace(one, **{name: array.reshape(shape) for name, array in arrays.items()})

    grid = shared_setting(
        [Curve(folded_up(one), held.reshape(shape)) for one, held in curves], before.reshape(shape)
    )
    for key, values in flat.__dict__.items():
        assert np.array_equal(grid.__dict__[key].ravel(), values, equal_nan=True)


def test_order_of_places_does_not_matter():
    before, _, responses = two_moments(12)
    order = np.random.default_rng(13).permutation(FEW)
    flat = shared_setting(curves_of(responses, (0, 1)), before)
    mixed = shared_setting(curves_of([reorder(one, order) for one in responses], (0, 1)), before[order])
    # The search ends for all places together, so that digits beyond its tolerance may differ.
    np.testing.assert_allclose(mixed.turn, flat.turn[order], atol=1e-6)


def reorder(one, order):
    arrays = {f.name: getattr(one, f.name) for f in fields(one) if np.ndim(getattr(one, f.name)) == 1}
    return replace(one, **{name: array[order] for name, array in arrays.items()})


def test_policies_module_speaks_of_excess_alike():
    _, _, responses = two_moments(14)
    curves = curves_of(responses, (0, 1))
    settings = np.random.default_rng(15).uniform(-300.0, 300.0, FEW)
    np.testing.assert_allclose(
        policies.least_excess(curves, settings), plain_excess(curves, settings[:, None])[:, 0], atol=1e-10
    )
