"""The receiving terminal against published formulas and values (tests/reference/receiver.csv)."""

from __future__ import annotations

import csv
from pathlib import Path

import numpy as np
import pytest

from geoskew import receiver

REFERENCE = Path(__file__).parent / "reference" / "receiver.csv"


def read_cases():
    lines = [line for line in REFERENCE.read_text(encoding="utf-8").splitlines() if not line.startswith("#")]
    return list(csv.DictReader(lines))


def evaluate(row):
    quantity = row["quantity"]
    value = float(row["x"]) if row["x"] else None
    keys = {key: float(row[key]) for key in ("diameter_m", "frequency_ghz") if row[key]}
    function = getattr(receiver, quantity)
    if quantity == "antenna_gain":
        return function(keys["diameter_m"], efficiency=value, frequency_ghz=keys["frequency_ghz"])
    if quantity == "half_power_beamwidth":
        return function(keys["diameter_m"], frequency_ghz=keys["frequency_ghz"])
    if quantity.startswith("bo1213"):
        keys["peak_dbi"] = 35.5
    return function(value, **keys)


@pytest.mark.parametrize("row", read_cases(), ids=lambda row: f"{row['case']}-{row['quantity']}")
def test_published_value(row):
    half_last_digit = 0.5 * 10.0 ** -int(row["digits"])
    assert float(evaluate(row)) == pytest.approx(float(row["expected"]), abs=half_last_digit * 1.01)


def test_worked_figure_of_merit():
    # Hand-computed: 1.2 m, 12 GHz, NF 0.7 dB, feed loss 0.1 dB, ground 10 K. Clear sky 0.12 dB with the
    # medium at a surface of 288.15 K (P.618-14 eq. 70); then 5 dB of rain on top with the medium at 275 K.
    terminal = {"noise_figure_db": 0.7, "feed_loss_db": 0.1, "ground_noise_k": 10.0}
    clear = receiver.system_noise_temperature(0.12, medium_k=receiver.medium_temperature(288.15), **terminal)
    rain = receiver.system_noise_temperature(5.12, **terminal)
    gain = receiver.antenna_gain(1.2, efficiency=0.65, frequency_ghz=12.0)
    assert float(clear) == pytest.approx(76.871, abs=1e-3)
    assert float(rain) == pytest.approx(253.979, abs=2e-3)
    assert float(receiver.figure_of_merit(gain, system_noise=clear, feed_loss_db=0.1)) == pytest.approx(
        22.745, abs=6e-4
    )
    assert 5.0 + 10 * np.log10(rain / clear) == pytest.approx(10.190, abs=6e-4)


def test_worked_carrier_to_noise():
    # Hand-computed: 50 dBW over 38 000 km at 12 GHz into G/T 22.745 dB/K with 0.12 dB of gas gives
    # 95.597 dBHz; 27.5 Mbaud then 21.204 dB.
    loss = receiver.free_space_loss(38000.0, frequency_ghz=12.0)
    density = 50.0 - loss - 0.12 + 22.745 + 228.599
    assert float(density) == pytest.approx(95.597, abs=6e-4)
    assert float(density) - 10 * np.log10(27.5e6) == pytest.approx(21.204, abs=1e-3)


def test_radome_takes_its_loss_off():
    plain = receiver.figure_of_merit(40.0, system_noise=100.0)
    assert float(plain) == pytest.approx(20.0)
    covered = receiver.figure_of_merit(40.0, 100.0, radome_loss_db=0.4)
    assert float(covered) == pytest.approx(19.6)


def test_half_power_at_half_the_width():
    width = receiver.half_power_beamwidth(0.9, frequency_ghz=11.7)
    assert float(receiver.pointing_loss(width / 2, diameter_m=0.9, frequency_ghz=11.7)) == pytest.approx(3.0)


def test_pointing_loss_is_held_at_40_db():
    assert float(receiver.pointing_loss(20.0, diameter_m=1.2, frequency_ghz=12.0)) == 40.0


def test_mask_of_a_frequency():
    # The band of BO.1213-1 and no other.
    names = [receiver.mask_name(value) for value in (11.69, 11.7, 12.75, 12.76, 4.0)]
    assert names == ["S.465", "BO.1213", "BO.1213", "S.465", "S.465"]


def test_s465_gives_no_value_inside_its_smallest_angle():
    # D/λ = 48.03: max(2°, 114·48.03^−1.09 = 1.675°) = 2°; D/λ = 148: max(1°, 100/148) = 1°.
    small = receiver.s465([1.999, 2.001], diameter_m=1.2, frequency_ghz=12.0)
    large = receiver.s465([0.999, 1.001], diameter_m=3.7, frequency_ghz=12.0)
    for pair in (small, large):
        assert np.isnan(pair[0])
        assert np.isfinite(pair[1])


@pytest.mark.parametrize("mask", receiver.MASKS)
@pytest.mark.parametrize("diameter", [0.3, 0.6, 0.9, 1.2, 2.4, 3.7])
@pytest.mark.parametrize("frequency", [4.0, 12.2])
def test_loss_of_the_wanted_carrier_has_no_step(mask, diameter, frequency):
    angle = np.linspace(0.0, 45.0, 200_001)
    loss = receiver.wanted_gain_loss(
        angle, diameter_m=diameter, efficiency=0.65, frequency_ghz=frequency, mask=mask
    )
    width = float(receiver.half_power_beamwidth(diameter, frequency_ghz=frequency))
    # The steepest slope is the parabola's at 40 dB: 2·12·1.83/θ₃ dB per degree.
    steepest = 2 * 12 * np.sqrt(40 / 12) / width * (angle[1] - angle[0])
    steps = np.abs(np.diff(loss))
    # S.580's own step at 20° (29 − 25·log 20 = −3.526 against −3.5) is 0.026 dB.
    assert steps.max() <= max(steepest, 0.03 if mask == "S.580" else 0.0) * 1.001
    assert loss.min() == 0.0
    in_lobe = angle < 0.5 * width
    parabola = receiver.pointing_loss(angle[in_lobe], diameter_m=diameter, frequency_ghz=frequency)
    assert np.all(loss[in_lobe] <= parabola)
    if diameter * frequency > 7:  # D/λ above 23: the mask's shelf lies well below the half-power level
        np.testing.assert_allclose(loss[in_lobe], parabola, atol=1e-12)


def test_beyond_the_main_lobe_the_mask_carries_the_wanted_carrier():
    # 1.2 m at 12 GHz, 5°: 29 − 25·log10(5) = 11.526 dBi (BO.1213-1), peak 41.703 dBi.
    loss = receiver.wanted_gain_loss(5.0, diameter_m=1.2, efficiency=0.65, frequency_ghz=12.0)
    assert float(loss) == pytest.approx(41.703 - 11.526, abs=1.1e-3)


def test_interference_inside_the_smallest_angle_is_the_main_lobe():
    dish = {"diameter_m": 1.2, "efficiency": 0.65, "frequency_ghz": 4.0}
    on_axis = receiver.antenna_gain(1.2, efficiency=0.65, frequency_ghz=4.0)
    half = receiver.half_power_beamwidth(1.2, frequency_ghz=4.0) / 2
    assert float(receiver.interference_gain(0.0, **dish)) == pytest.approx(float(on_axis))
    assert float(receiver.interference_gain(half, **dish)) == pytest.approx(float(on_axis) - 3.0)
    angle = np.linspace(0.0, 40.0, 100_001)
    assert np.abs(np.diff(receiver.interference_gain(angle, **dish))).max() < 0.01


def test_cross_polar_gain_never_exceeds_the_co_polar_one():
    angle = np.linspace(0.0, 180.0, 5001)
    for frequency in (4.0, 12.2):
        for diameter in (0.6, 1.2, 3.7):
            dish = {"diameter_m": diameter, "efficiency": 0.65, "frequency_ghz": frequency}
            co = receiver.interference_gain(angle, **dish)
            cross = receiver.interference_gain_cross(angle, **dish)
            assert np.all(cross <= co + 1e-9)


def test_isolation_falls_as_the_recommendation_does():
    dish = {"diameter_m": 0.6, "frequency_ghz": 12.1}
    angle = np.array([0.0, 0.25 * 2.8609, 2.0, 3.0])
    isolation = receiver.isolation_off_axis(angle, isolation_db=30.0, **dish)
    np.testing.assert_allclose(isolation[:2], 30.0, atol=1e-3)
    # BO.1213-1: 25 − 0.75 dB at a quarter of φ0; with 35.5 dBi co and cross at 2°: 29.635 − 18.500.
    assert isolation[2] == pytest.approx(30.0 - (24.25 - (29.635 - 18.5)), abs=2e-3)
    assert isolation[3] < isolation[2]
    wide = receiver.isolation_off_axis(np.linspace(0, 180, 3001), isolation_db=12.0, **dish)
    assert wide.min() == 0.0
    assert wide.max() == 12.0


@pytest.mark.parametrize("shape", [(), (3,), (2, 3)])
def test_shapes_broadcast_and_missing_values_stay(shape):
    angle = np.full(shape, 1.0)
    if angle.size > 1:
        angle[..., 0] = np.nan
    sizes = np.full(shape[-1:], 1.2)
    dish = {"diameter_m": sizes, "frequency_ghz": 12.0}
    for result in (
        receiver.pointing_loss(angle, **dish),
        receiver.wanted_gain_loss(angle, efficiency=0.65, **dish),
        receiver.interference_gain(angle, efficiency=0.65, **dish),
        receiver.interference_gain_cross(angle, efficiency=0.65, mask="S.465", **dish),
        receiver.isolation_off_axis(angle, isolation_db=25.0, **dish),
        receiver.sky_noise(angle),
    ):
        assert result.shape == shape
        np.testing.assert_array_equal(np.isnan(result), np.isnan(angle))


def test_unknown_mask_is_named():
    with pytest.raises(ValueError, match=r"S\.999.*BO\.1213"):
        receiver.wanted_gain_loss(1.0, diameter_m=1, efficiency=0.6, frequency_ghz=4.0, mask="S.999")
