"""Zones against an exhaustive search on small cases, closed forms on even ones, and every cell one by one."""

from __future__ import annotations

from itertools import combinations
from math import ceil, floor

import numpy as np
import pytest

from geoskew.fieldwork.zones import NO_DISTRICT, NO_ZONE, partition

HAIR = 1e-7


def apart(one, other):
    """Angle between two settings modulo 180, written out anew."""
    difference = np.abs(np.mod(one - other, 180.0))
    return np.minimum(difference, 180.0 - difference)


def fewest(values, tolerance):
    """The fewest settings, by trying all sets: a band may always be slid until a place lies on its edge."""
    candidates = np.mod(values + tolerance, 180.0)
    for count in range(1, len(values) + 1):
        for chosen in combinations(candidates, count):
            near = [apart(values, one) <= tolerance + 1e-9 for one in chosen]
            if np.logical_or.reduce(near).all():
                return count
    raise AssertionError("every place alone is a solution")


@pytest.mark.parametrize("seed", range(60))
def test_fewest_zones_against_all_sets(seed):
    rng = np.random.default_rng(seed)
    values = rng.uniform(-90.0, 90.0, rng.integers(1, 9)) * rng.choice([1.0, 0.3])
    tolerance = rng.uniform(2.0, 40.0)
    found = partition(values, tolerance)
    assert len(found.settings) == fewest(values, tolerance)
    assert found.needed_at_least <= len(found.settings) <= found.needed_at_least + 1


@pytest.mark.parametrize("seed", range(20))
def test_every_place_once_and_within_the_tolerance(seed):
    rng = np.random.default_rng(100 + seed)
    values = rng.normal(rng.uniform(-90, 90), rng.uniform(1, 80), (40, 50))
    values[rng.random(values.shape) < 0.1] = np.nan
    tolerance = rng.uniform(0.3, 20.0)
    found = partition(values, tolerance)
    assert found.labels.shape == values.shape
    assert np.array_equal(found.labels == NO_ZONE, np.isnan(values))
    known = found.labels != NO_ZONE
    assert apart(values[known], found.settings[found.labels[known]]).max() <= tolerance + HAIR
    assert np.array_equal(np.unique(found.labels[known]), np.arange(len(found.settings)))
    np.testing.assert_allclose(
        found.deviation(values)[known], apart(values, found.settings[found.labels])[known], atol=1e-9
    )


@pytest.mark.parametrize(("tolerance", "step"), [(2.0, 0.25), (2.5, 0.1), (1.0, 0.3), (5.0, 0.7)])
def test_even_ladder_in_closed_form(tolerance, step):
    # N values a step apart: a band of 2t holds floor(2t/step) + 1 of them.
    values = -30.0 + step * np.arange(200)
    values = values[values <= 45.0]
    held = floor(2.0 * tolerance / step + 1e-9) + 1
    found = partition(values, tolerance)
    assert len(found.settings) == ceil(len(values) / held)
    assert len(found.settings) == found.needed_at_least
    # A simple bound: K bands of at most 2t and K − 1 steps between them reach over the extent.
    extent = values[-1] - values[0]
    assert len(found.settings) >= ceil((extent + step) / (2.0 * tolerance + step) - 1e-9)


def test_whole_circle():
    # All around, closely: 180/2t bands, and one more where that is no whole number.
    values = np.arange(-90.0, 90.0, 0.01)
    for tolerance in (10.0, 7.0, 22.5, 4.4):
        found = partition(values, tolerance)
        assert len(found.settings) == ceil((180.0 - 0.01) / (2.0 * tolerance + 0.01) - 1e-9)
        assert found.deviation(values).max() <= tolerance + HAIR


def test_a_band_across_the_wrap_is_one_zone():
    found = partition([88.0, -89.0, 89.5], 2.0)
    assert len(found.settings) == 1
    assert apart(found.settings[0], 89.5) < 0.01  # the middle of 88 and 91


def test_worst_deviation_is_evened_out():
    # 0 to 30 with t = 10 takes two zones; both can do with 7.5.
    found = partition(np.linspace(0.0, 30.0, 3001), 10.0)
    assert len(found.settings) == 2
    assert found.deviation(np.linspace(0.0, 30.0, 3001)).max() == pytest.approx(7.5, abs=0.02)


@pytest.mark.parametrize("seed", range(20))
def test_districts_stay_whole_unless_too_wide(seed):
    rng = np.random.default_rng(200 + seed)
    districts = rng.integers(-1, 6, 60)
    middles = rng.uniform(-90.0, 90.0, 6)
    widths = rng.uniform(0.5, 12.0, 6)
    values = np.where(
        districts == NO_DISTRICT,
        rng.uniform(-90.0, 90.0, 60),
        middles[districts] + widths[districts] * rng.uniform(-0.5, 0.5, 60),
    )
    tolerance = 4.0
    found = partition(values, tolerance, districts=districts)
    assert apart(values, found.settings[found.labels]).max() <= tolerance + HAIR
    for number in range(6):
        here = districts == number
        if not here.any():
            continue
        offsets = np.mod(values[here] - middles[number] + 90.0, 180.0) - 90.0
        if np.ptp(offsets) > 2.0 * tolerance:
            assert number in found.split
        else:
            assert number not in found.split
            assert len(np.unique(found.labels[here])) == 1
    assert len(found.settings) >= len(partition(values, tolerance).settings)
    assert found.needed_at_least <= len(found.settings) <= found.needed_at_least + 1


@pytest.mark.parametrize("seed", range(30))
def test_fewest_zones_of_districts_against_all_sets(seed):
    rng = np.random.default_rng(300 + seed)
    count, tolerance = 6, 12.0
    low = rng.uniform(-90.0, 90.0, count)
    high = low + rng.uniform(0.0, 2.0 * tolerance, count)
    values = np.stack([low, high], axis=1)
    districts = np.broadcast_to(np.arange(count)[:, None], values.shape)
    found = partition(values, tolerance, districts=districts)
    assert found.split == ()
    candidates = low + tolerance
    for fewest_count in range(1, count + 1):
        sets = combinations(candidates, fewest_count)
        if any(
            np.logical_or.reduce(
                [np.all(apart(values, one) <= tolerance + 1e-7, axis=1) for one in chosen]
            ).all()
            for chosen in sets
        ):
            break
    assert len(found.settings) == fewest_count


def test_nothing_to_part():
    with pytest.raises(ValueError, match="no place has a value"):
        partition([np.nan, np.nan], 2.0)
    with pytest.raises(ValueError, match="not above 0"):
        partition([1.0], 0.0)
