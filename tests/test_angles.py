"""Angles that close on themselves."""

from __future__ import annotations

import numpy as np
from hypothesis import given, settings
from hypothesis import strategies as st

from geoskew.angles import fold, wrap_azimuth, wrap_longitude

ANGLES = st.floats(-1e6, 1e6, allow_nan=False)
# Just below and just above a whole number of turns, where a remainder may round up to the period.
EDGES = st.sampled_from([-1e-20, 1e-20, -1e-14, -3e-14, 3e-14, -1e-9, 1e-9, 0.0])

# No example is timed: the machine may be busy.
untimed = settings(deadline=None)


def on_circle(angle, period):
    turned = 2.0 * np.pi * np.asarray(angle) / period
    return np.cos(turned), np.sin(turned)


@untimed
@given(ANGLES)
def test_fold_keeps_the_direction_and_its_interval(angle):
    folded = float(fold(angle))
    assert -90.0 < folded <= 90.0
    np.testing.assert_allclose(on_circle(folded, 180.0), on_circle(angle, 180.0), atol=1e-7)


@untimed
@given(st.integers(-5, 5), EDGES)
def test_fold_at_the_ends(turns, hair):
    for centre in (-90.0, 90.0):
        assert -90.0 < float(fold(centre + 180.0 * turns + hair)) <= 90.0


@untimed
@given(st.integers(-5, 5), EDGES)
def test_wrapping_at_the_ends(turns, hair):
    assert -180.0 <= float(wrap_longitude(-180.0 + 360.0 * turns + hair)) < 180.0
    assert -180.0 <= float(wrap_longitude(180.0 + 360.0 * turns + hair)) < 180.0
    assert 0.0 <= float(wrap_azimuth(360.0 * turns + hair)) < 360.0


@untimed
@given(ANGLES)
def test_wrapping_keeps_the_direction(angle):
    for wrapped in (float(wrap_longitude(angle)), float(wrap_azimuth(angle))):
        np.testing.assert_allclose(on_circle(wrapped, 360.0), on_circle(angle, 360.0), atol=1e-7)


def test_shapes_and_missing_values():
    for function in (fold, wrap_longitude, wrap_azimuth):
        assert function(10.0).shape == ()
        assert function(np.zeros((2, 3))).shape == (2, 3)
        assert np.isnan(function(np.nan))


def test_ends_belong_where_conventions_put_them():
    assert fold([-90.0, 90.0, 270.0]).tolist() == [90.0, 90.0, 90.0]
    assert wrap_longitude([180.0, -180.0, 540.0]).tolist() == [-180.0, -180.0, -180.0]
    assert wrap_azimuth([360.0, 720.0, 0.0]).tolist() == [0.0, 0.0, 0.0]
