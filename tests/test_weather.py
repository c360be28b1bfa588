"""Laws of the weather: shapes, places without a value, limits of the methods, loading of the maps."""

from __future__ import annotations

import subprocess
import sys
from concurrent.futures import ThreadPoolExecutor

import numpy as np
import pytest

from geoskew import weather
from geoskew.errors import GeoskewError
from geoskew.weather import maps
from geoskew.weather.strips import STRIP_CELLS, in_strips

LONGITUDE, LATITUDE, ELEVATION, TILT = 12.5, 41.9, 40.0, 70.0
DISH = {"diameter_m": 0.9, "efficiency": 0.65}
FIELDS = ("rain", "gas", "cloud", "scintillation", "total", "total_without_scintillation")


def evaluate(longitude, latitude, height, elevation, tilt, *, frequency_ghz=11.7, percentage=0.1, dish=DISH):
    climate = weather.climate(longitude, latitude, height, frequency_ghz=frequency_ghz)
    return weather.attenuation(climate, elevation, tilt, percentage=percentage, **dish)


def grid(rows=70, columns=150):
    """A grid of more than one strip, with a height and a tilt of its own in every cell."""
    longitude = np.linspace(-5.0, 25.0, columns)[None, :]
    latitude = np.linspace(55.0, 30.0, rows)[:, None]
    height = 400.0 + 10.0 * longitude + 5.0 * latitude
    assert rows * columns > STRIP_CELLS
    return longitude, latitude, height, 70.0 - latitude + 0.1 * longitude, 80.0 - longitude + 0.3 * latitude


@pytest.mark.parametrize("name", FIELDS)
def test_point_list_and_grid_agree(name):
    arrays = grid()
    whole = getattr(evaluate(*arrays), name)
    assert whole.shape == (70, 150)
    rows, columns = np.array([0, 3, 35, 69]), np.array([149, 0, 77, 12])
    listed = [np.broadcast_to(array, whole.shape)[rows, columns] for array in arrays]
    as_list = getattr(evaluate(*listed), name)
    assert as_list.shape == (4,)
    # Large arrays take the scintillation from a table that is right to 1e-6 dB.
    tolerance = 1e-6 if name in ("scintillation", "total") else 1e-12
    np.testing.assert_allclose(whole[rows, columns], as_list, rtol=0, atol=tolerance)
    for index in range(4):
        point = getattr(evaluate(*(float(array[index]) for array in listed)), name)
        assert point.shape == ()
        assert float(point) == pytest.approx(float(as_list[index]), abs=1e-12)


def test_projected_grid_agrees_with_the_separable_one():
    longitude, latitude, height, elevation, tilt = grid()
    full = np.broadcast_arrays(longitude, latitude)
    separable = evaluate(longitude, latitude, height, elevation, tilt)
    np.testing.assert_allclose(evaluate(*full, height, elevation, tilt).total, separable.total, atol=1e-9)


def test_missing_coordinates_have_no_value_and_leave_the_others_alone():
    longitude = np.array([LONGITUDE, np.nan, LONGITUDE, LONGITUDE])
    latitude = np.array([LATITUDE, LATITUDE, np.nan, LATITUDE])
    elevation = np.array([ELEVATION, ELEVATION, ELEVATION, np.nan])
    result = evaluate(longitude, latitude, np.nan, elevation, TILT)
    for name in FIELDS:
        np.testing.assert_array_equal(np.isnan(getattr(result, name)), [False, True, True, True])
    assert float(result.total[0]) == pytest.approx(
        float(evaluate(LONGITUDE, LATITUDE, np.nan, ELEVATION, TILT).total)
    )


def test_turns_of_longitude_do_not_matter_and_the_antimeridian_has_no_seam():
    longitude = np.array([-170.0, 190.0, 550.0])
    result = evaluate(longitude, -17.0, np.nan, ELEVATION, TILT)
    np.testing.assert_allclose(result.total, result.total[0], rtol=1e-12)
    across = weather.climate(
        np.array([[179.9999, 180.0, 180.0001]]), np.array([[-17.0]]), 0.0, frequency_ghz=12.0
    )
    assert np.ptp(across.rain_rate) < 0.01
    assert np.ptp(across.zenith_gas) < 1e-4


def test_height_of_the_map_only_where_none_is_given():
    longitude, latitude = np.array([7.0, 7.0, 7.0]), np.array([46.0, 46.0, 46.0])
    climate = weather.climate(longitude, latitude, np.array([np.nan, 0.0, 2500.0]), frequency_ghz=12.0)
    mapped = float(maps.topography(np.array(7.0), np.array(46.0)))
    np.testing.assert_allclose(climate.height, [mapped, 0.0, 2.5])
    result = weather.attenuation(climate, 35.0, 80.0, percentage=0.01, **DISH)
    # Less rain and less air above a higher place.
    assert result.rain[2] < result.rain[0] < result.rain[1]
    assert result.gas[2] < result.gas[0] < result.gas[1]


def test_no_rain_above_the_rain_height():
    result = evaluate(7.0, 46.0, 5000.0, 35.0, 80.0)
    assert float(result.rain) == 0.0
    assert float(result.total) > 0.0


def test_below_five_degrees_only_the_rain_has_a_value():
    result = evaluate(LONGITUDE, LATITUDE, 0.0, np.array([5.0, 4.0, 0.0, -3.0]), TILT)
    np.testing.assert_array_equal(np.isnan(result.total), [False, True, True, True])
    np.testing.assert_array_equal(np.isnan(result.rain), [False, False, True, True])
    assert result.rain[1] > result.rain[0]
    climate = weather.climate(LONGITUDE, LATITUDE, 0.0, frequency_ghz=12.0)
    np.testing.assert_array_equal(np.isnan(weather.clear_sky_gas(climate, [5.0, 4.9])), [False, True])


def test_above_five_percent_there_is_no_rain_and_the_climate_must_fit():
    climate = weather.climate(LONGITUDE, LATITUDE, 0.0, frequency_ghz=12.0, percentage=10.0)
    result = weather.attenuation(climate, ELEVATION, TILT, percentage=10.0, **DISH)
    assert float(result.rain) == 0.0
    expected = weather.combined(result.gas, 0.0, result.cloud, result.scintillation)
    assert float(result.total) == pytest.approx(float(expected))
    with pytest.raises(ValueError, match=r"percentage 1\.0.*look the climate up for 1\.0 %"):
        weather.attenuation(climate, ELEVATION, TILT, percentage=1.0, **DISH)


def test_clear_air_is_drier_than_the_air_of_the_worst_twentieth_of_a_year():
    climate = weather.climate(*grid()[:3], frequency_ghz=20.0)
    assert np.all(climate.zenith_gas_clear < climate.zenith_gas)


def test_several_frequencies_at_once_equal_one_at_a_time():
    several = weather.climates(LONGITUDE, LATITUDE, np.nan, frequencies_ghz=(3.9, 12.0))
    for one in several:
        alone = weather.climate(LONGITUDE, LATITUDE, np.nan, frequency_ghz=one.frequency_ghz)
        assert float(one.zenith_gas) == float(alone.zenith_gas)
        assert float(one.rain_rate) == float(alone.rain_rate)


def test_ladder_equals_one_percentage_at_a_time_and_falls_with_it():
    climate = weather.climate(LONGITUDE, LATITUDE, np.nan, frequency_ghz=12.0)
    steps = weather.ladder(climate, ELEVATION, TILT, **DISH)
    for step, percentage in zip(steps, weather.PERCENTAGES, strict=True):
        alone = weather.attenuation(climate, ELEVATION, TILT, percentage=percentage, **DISH)
        assert float(step.total) == float(alone.total)
    assert np.all(np.diff([float(step.total) for step in steps]) < 0.0)


def test_c_band_depolarisation_starts_from_the_rain_at_six_gigahertz():
    place = (LONGITUDE, LATITUDE, 0.0, ELEVATION, TILT)
    low = evaluate(*place, frequency_ghz=4.5, percentage=0.01)
    assert float(low.depolarising_rain) == pytest.approx(
        float(evaluate(*place, frequency_ghz=6.0, percentage=0.01).rain)
    )
    high = evaluate(*place, percentage=0.01)
    assert float(high.depolarising_rain) == float(high.rain)


def test_without_rain_nothing_is_depolarised():
    value = weather.discrimination([0.0, 2.0, np.nan], 30.0, 45.0, frequency_ghz=12.0, percentage=0.01)
    assert value[0] == np.inf
    assert np.isfinite(value[1])
    assert np.isnan(value[2])


def test_depolarisation_holds_the_elevation_to_sixty_degrees():
    keys = {"frequency_ghz": 12.0, "percentage": 0.01}
    at_sixty = weather.discrimination(3.0, 60.0, 20.0, **keys)
    assert float(weather.discrimination(3.0, 90.0, 20.0, **keys)) == pytest.approx(float(at_sixty))


@pytest.mark.parametrize("frequency", [3.9, 56.0, np.nan])
def test_depolarisation_refuses_frequencies_outside_of_its_range(frequency):
    with pytest.raises(ValueError, match="4 to 55 GHz only"):
        weather.discrimination(3.0, 30.0, 20.0, frequency_ghz=frequency, percentage=0.01)


@pytest.mark.parametrize("percentage", [0.0, 0.0009, 51.0, np.nan])
def test_percentages_outside_of_the_method_are_refused(percentage):
    with pytest.raises(ValueError, match=r"0\.001 to 50 %.*availability of 50 to 99\.999 %"):
        weather.climate(LONGITUDE, LATITUDE, 0.0, frequency_ghz=12.0, percentage=percentage)


@pytest.mark.parametrize("frequency", [0.5, 60.0, np.nan])
def test_frequencies_outside_of_the_method_are_refused(frequency):
    with pytest.raises(ValueError, match="up to 55 GHz"):
        weather.climate(LONGITUDE, LATITUDE, 0.0, frequency_ghz=frequency)


def test_dishes_of_their_own_per_place():
    diameters = np.array([0.6, 0.9, 2.4])
    dish = {"diameter_m": diameters, "efficiency": np.array([0.6, 0.65, 0.7])}
    place = (np.full(3, LONGITUDE), LATITUDE, 0.0, 10.0, TILT)
    fades = evaluate(*place, dish=dish).scintillation
    # A larger dish averages the turbulence.
    assert fades[0] > fades[1] > fades[2] > 0.0


def test_scintillation_of_many_places_equals_that_of_each():
    elevation = np.linspace(5.0, 90.0, 5000)
    many = evaluate(LONGITUDE, LATITUDE, 0.0, elevation, TILT, percentage=0.01).scintillation
    each = [
        float(evaluate(LONGITUDE, LATITUDE, 0.0, value, TILT, percentage=0.01).scintillation)
        for value in elevation[::500]
    ]
    np.testing.assert_allclose(many[::500], each, rtol=0, atol=1e-6)


def test_a_missing_map_is_named_with_the_remedy(monkeypatch):
    monkeypatch.setattr(maps, "find_spec", lambda name: None)
    maps.data_file.cache_clear()
    try:
        with pytest.raises(GeoskewError, match=r"837/v7_r001\.npz.*pip install"):
            maps.data_file("837/v7_r001.npz")
    finally:
        maps.data_file.cache_clear()


def test_a_map_of_another_shape_is_refused(monkeypatch):
    monkeypatch.setitem(maps._LAYOUTS, "839/v4_esa0height", (5, 5, True, -90.0, 0.0, 1.0, 0.0))
    with pytest.raises(GeoskewError, match=r"\(121, 241\) nodes, not \(5, 5\)"):
        maps._read("839/v4_esa0height", "839/v4_esa0height")


def test_maps_are_read_once_by_many_threads(monkeypatch):
    monkeypatch.setattr(maps, "_LOADED", {})
    reads = []
    read = maps._read
    monkeypatch.setattr(maps, "_read", lambda key, name: reads.append(key) or read(key, name))
    with ThreadPoolExecutor(8) as pool:
        results = list(pool.map(lambda _: maps.rain_height(np.array(10.0), np.array(45.0)), range(32)))
    assert reads == ["839/v4_esa0height"]
    assert len({float(result) for result in results}) == 1


def test_the_library_itself_is_never_imported():
    script = (
        "import sys; from geoskew import weather\n"
        "c = weather.climate(10.0, 45.0, float('nan'), frequency_ghz=12.0)\n"
        "weather.attenuation(c, 37.0, 80.0, percentage=0.1, diameter_m=0.9, efficiency=0.65)\n"
        "print({'itur', 'astropy', 'scipy'} & set(sys.modules))"
    )
    done = subprocess.run([sys.executable, "-c", script], capture_output=True, text=True, check=True)
    assert done.stdout.strip() == "set()"


def test_strips_put_a_function_of_broadcast_arrays_together():
    rows, columns = np.arange(300.0)[:, None], np.arange(200.0)[None, :]
    total, product = in_strips(lambda a, b: [a + b, a * b], (rows, columns))
    np.testing.assert_array_equal(total, rows + columns)
    np.testing.assert_array_equal(product, rows * columns)


def test_editions_name_every_recommendation_in_use():
    text = " ".join(weather.EDITIONS)
    for name in ("P.618-14", "P.676-12", "P.836-6", "P.837-7", "P.838-3", "P.839-4", "P.840-8", "P.1511-2"):
        assert name in text
    assert "average year" in text
