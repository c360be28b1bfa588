"""Part of a year in which a margin is lost, against closed forms and published rain cases."""

from __future__ import annotations

import numpy as np
import pytest

from geoskew import weather

LADDER = np.array(weather.PERCENTAGES)


def power_law(scale, exponent, percentages=LADDER):
    """Attenuation of a closed form whose inverse is known: scale · p^−exponent."""
    return np.asarray(scale) * percentages.reshape(-1, *(1,) * np.ndim(scale)) ** -np.asarray(exponent)


@pytest.mark.parametrize("exponent", [0.35, 0.55, 0.75])
def test_power_law_is_inverted(exponent):
    thresholds = np.geomspace(1.01 * 5.0**-exponent, 0.99 * 0.001**-exponent, 400)
    crossing = weather.percentage_where(-power_law(1.0, exponent), threshold=-thresholds)
    expected = thresholds ** (-1.0 / exponent)
    assert not crossing.below.any()
    assert not crossing.above.any()
    # Far below what the statistics of a year can bear.
    np.testing.assert_allclose(crossing.percentage, expected, rtol=0.015)


def test_quadratic_in_the_logarithms_like_the_rain_method():
    # The exponent of P.618-14 eq. (8) is linear in the logarithm of the percentage.
    def fade(p):
        return 8.0 * (p / 0.01) ** -(0.655 + 0.033 * np.log(p) - 0.045 * np.log(8.0))

    percentages = np.geomspace(0.0011, 4.9, 300)
    values = -fade(LADDER)[:, None] + np.zeros(300)
    crossing = weather.percentage_where(values, threshold=-fade(percentages))
    np.testing.assert_allclose(crossing.percentage, percentages, rtol=0.01)


def test_straight_line_in_the_logarithm_is_exact():
    values = 3.0 * np.log10(LADDER)
    crossing = weather.percentage_where(values, threshold=[-8.0, -4.4, 0.0, 1.7])
    np.testing.assert_allclose(crossing.percentage, 10.0 ** (np.array([-8.0, -4.4, 0.0, 1.7]) / 3.0))


def test_steps_of_the_ladder_are_met_exactly():
    values = -power_law(1.0, 0.6)
    crossing = weather.percentage_where(values, threshold=values)
    np.testing.assert_allclose(crossing.percentage, LADDER)
    assert not (crossing.below | crossing.above).any()


def test_beyond_the_ladder_is_flagged_at_its_ends():
    values = np.stack([LADDER - 10.0, LADDER + 1.0, LADDER - 1.0], axis=1)
    crossing = weather.percentage_where(values)
    np.testing.assert_allclose(crossing.percentage, [5.0, 0.001, 1.0])
    np.testing.assert_array_equal(crossing.above, [True, False, False])
    np.testing.assert_array_equal(crossing.below, [False, True, False])


def test_missing_values_have_no_percentage_and_no_flag():
    values = np.stack([LADDER - 1.0, LADDER - 1.0], axis=1)
    values[4, 1] = np.nan
    crossing = weather.percentage_where(values)
    assert float(crossing.percentage[0]) == pytest.approx(1.0)
    assert np.isnan(crossing.percentage[1])
    assert not crossing.below[1]
    assert not crossing.above[1]


def test_falling_and_flat_steps_keep_the_answer_monotone():
    values = np.array([-5, -4, -4, -4.2, -3, -2, -2, -1, 0, 0.1, 0.1, 0.2, 1, 2, 1.5, 3])
    thresholds = np.linspace(-5.5, 3.5, 200)
    crossing = weather.percentage_where(values, threshold=thresholds)
    assert np.all(np.isfinite(crossing.percentage))
    assert np.all(np.diff(crossing.percentage) >= -1e-12)


def test_shapes_of_grids_and_points():
    values = LADDER[:, None, None] - np.linspace(0.5, 3.0, 12).reshape(3, 4)
    crossing = weather.percentage_where(values)
    np.testing.assert_allclose(crossing.percentage, np.linspace(0.5, 3.0, 12).reshape(3, 4), rtol=0.03)
    assert weather.percentage_where(LADDER - 1.0).percentage.shape == ()


@pytest.mark.parametrize(
    ("values", "percentages"),
    [([1.0, 2.0], [0.1]), ([1.0, 2.0], [1.0, 0.1]), ([1.0], [1.0]), (1.0, [0.1, 1.0])],
)
def test_ladders_that_cannot_be_inverted_are_refused(values, percentages):
    with pytest.raises(ValueError, match="one value per percentage"):
        weather.percentage_where(values, percentages)


def test_hours_of_an_average_year():
    # 365.25 days of 24 h; the ends of the ladder are the bounds that outages are reported against.
    assert float(weather.hours(100.0)) == 8766.0
    assert float(weather.hours(0.001)) == pytest.approx(0.08766)
    assert float(weather.hours(5.0)) == pytest.approx(438.3)


def test_attenuation_of_a_place_is_inverted_back_to_its_percentage():
    climate = weather.climate(12.49, 41.9, 46.1, frequency_ghz=14.25)
    dish = {"diameter_m": 1.0, "efficiency": 0.65}
    steps = weather.ladder(climate, 40.232036, 0.0, **dish)
    values = -np.stack([step.total for step in steps])
    for percentage in (0.0015, 0.03, 0.07, 0.3, 1.5, 3.5):
        total = weather.attenuation(climate, 40.232036, 0.0, percentage=percentage, **dish).total
        crossing = weather.percentage_where(values, threshold=-total)
        assert float(crossing.percentage) == pytest.approx(percentage, rel=0.015)
