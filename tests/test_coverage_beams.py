"""Elliptical beams against the published patterns (tests/reference/beams.csv)."""

from __future__ import annotations

import csv
from pathlib import Path

import numpy as np
import pytest

from geoskew.coverage import beams
from geoskew.errors import InputError

REFERENCE = Path(__file__).parent / "reference" / "beams.csv"
ELLIPSE = {"major_deg": 3.2, "minor_deg": 1.6, "orientation_deg": 15.0}


def read_cases():
    lines = [line for line in REFERENCE.read_text(encoding="utf-8").splitlines() if not line.startswith("#")]
    return list(csv.DictReader(lines))


@pytest.mark.parametrize("row", read_cases(), ids=lambda row: f"{row['latitude']}N")
def test_published_gain(row):
    off_axis, width = float(row["off_axis"]), float(row["width"])
    # The angles carry four decimals; 0.0001° of 0.69° moves the gain by 0.0007 dB, in the steep part of the
    # fast roll-off by some 0.01.
    assert float(beams.gaussian_gain(off_axis, width)) == pytest.approx(float(row["gaussian"]), abs=1.5e-3)
    assert float(beams.fast_roll_off_gain(off_axis, width)) == pytest.approx(
        float(row["fast_roll_off"]), abs=1.5e-2
    )
    if row["position_angle"]:
        angle = float(row["position_angle"])
        assert float(beams.half_power_width(angle, **ELLIPSE)) == pytest.approx(width, abs=2e-4)
        gain = beams.relative_gain(off_axis, angle, **ELLIPSE)
        assert float(gain) == pytest.approx(float(row["gaussian"]), abs=2e-3)


def test_gain_on_the_axis():
    # 44.45 − 10·log10(3.2·1.6) = 37.3573 dBi, Resolution 553 (WRC-15) Figure 1; the Appendix 30 form
    # 27 843/(a·b) agrees within its rounding.
    assert beams.on_axis_gain(3.2, 1.6) == pytest.approx(37.3573, abs=5e-5)
    assert beams.on_axis_gain(3.2, 1.6) == pytest.approx(10 * np.log10(27843 / (3.2 * 1.6)), abs=0.01)


def test_half_power_on_the_ellipse():
    around = np.linspace(-180.0, 180.0, 73)
    radius = beams.half_power_width(around, **ELLIPSE) / 2
    gain = beams.relative_gain(radius, around, pattern="gaussian", **ELLIPSE)
    np.testing.assert_allclose(gain, -3.0, atol=1e-12)
    # The radius of an ellipse: (x/1.6)² + (y/0.8)² = 1 in the axes of the ellipse.
    turned = np.deg2rad(around - 15.0)
    on_ellipse = (radius * np.cos(turned) / 1.6) ** 2 + (radius * np.sin(turned) / 0.8) ** 2
    np.testing.assert_allclose(on_ellipse, 1.0, atol=1e-12)


def test_appendix_30_limits():
    # RR Appendix 30, Annex 5, Regions 1 and 3 (from memory): main lobe to 1.58, shelf −30 dB to 3.16,
    # −(17.5 + 25 log) beyond; the pieces meet within the rounding of 1.58 and 3.16.
    ratio = np.array([0.5, 1.5799, 1.5801, 3.1599, 3.1601, 10.0])
    expected = [-3.0, -29.95, -30.0, -30.0, -29.99, -42.5]
    np.testing.assert_allclose(beams.appendix30_gain(ratio, 1.0), expected, atol=0.01)


def test_fast_roll_off_is_continuous():
    ratio = np.linspace(0.0, 4.0, 400_001)
    gain = beams.fast_roll_off_gain(ratio * 1.2, 1.2)
    assert np.abs(np.diff(gain)).max() < 0.015
    assert gain[-1] == pytest.approx(-(22 + 20 * np.log10(4.0)))


def test_cross_polar_limits():
    # RR Appendix 30, Annex 5 (from memory): −40 dB on the axis, −33 from 0.33 to 1.67, −40 at 2.
    ratio = np.array([0.0, 0.33, 1.0, 1.67, 2.0, 11.0])
    expected = [-40.0, -33.04, -33.0, -33.0, -40.0, -80.0]
    np.testing.assert_allclose(beams.cross_polar_gain(ratio, 1.0), expected, atol=0.01)


def test_no_gain_below_isotropic():
    for pattern in (*beams.PATTERNS, "cross-polar"):
        gain = beams.relative_gain(80.0, 0.0, pattern=pattern, **ELLIPSE)
        assert float(gain) >= -beams.on_axis_gain(3.2, 1.6)


def test_isolation_falls_off_the_axis():
    isolation = beams.beam_isolation([0.0, 0.8, 1.6], 15.0, **ELLIPSE)
    # Along the major axis φ/φ0 = 0, 0.25, 0.5: 40; 35.00 − 0.75; 33 − 3.
    expected = [40.0, 40 + 40 * np.log10(0.75) - 0.75, 30.0]
    np.testing.assert_allclose(isolation, expected, atol=1e-9)


def test_strongest_beam_serves():
    one = beams.beam_eirp([0.0, 2.0, np.nan], 0.0, peak_dbw=50.0, major_deg=2.0, minor_deg=2.0)
    two = beams.beam_eirp([2.0, 0.0, np.nan], 0.0, peak_dbw=53.0, major_deg=2.0, minor_deg=2.0)
    eirp, number = beams.strongest([one, two])
    np.testing.assert_allclose(eirp, [50.0, 53.0, np.nan])
    assert number.tolist() == [0, 1, -1]


def test_wrong_beams_are_refused():
    with pytest.raises(InputError, match=r"minor_deg 0.4 is below 0.6"):
        beams.beam_eirp(0, 0, peak_dbw=50, major_deg=1.0, minor_deg=0.4, pattern="fast-roll-off")
    with pytest.raises(InputError, match=r"no beam pattern 'square'.*gaussian"):
        beams.beam_eirp(0, 0, peak_dbw=50, major_deg=1.0, minor_deg=0.4, pattern="square")
