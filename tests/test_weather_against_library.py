"""Weather at scattered places against the general-purpose library `itur`, called one place at a time.

The library is of edition P.618-13; each contribution is the same in P.618-14. Gas and cloud are asked
for at 5 %, which is what edition 14 holds them at.
"""

from __future__ import annotations

import warnings

import numpy as np
import pytest

from geoskew import weather
from geoskew.weather import gas, maps

PLACES = 50
DIAMETER_M, EFFICIENCY = 0.9, 0.65


@pytest.fixture(scope="module")
def itur():
    """The library, with the warnings of its own imports and of its validity ranges left to itself."""
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")
        import itur.models.itu453
        import itur.models.itu618

        yield itur


@pytest.fixture(scope="module")
def places():
    """Longitude, latitude, elevation, tilt and height (NaN at every third place), both hemispheres."""
    generator = np.random.default_rng(618)
    height = generator.uniform(0.0, 3000.0, PLACES)
    height[::3] = np.nan
    return {
        "longitude": generator.uniform(-180.0, 180.0, PLACES),
        "latitude": generator.uniform(-70.0, 70.0, PLACES),
        "height": height,
        "elevation": generator.uniform(5.0, 89.0, PLACES),
        "tilt": generator.uniform(0.0, 180.0, PLACES),
    }


def climate_of(places, frequency, **more):
    return weather.climate(
        places["longitude"], places["latitude"], places["height"], frequency_ghz=frequency, **more
    )


def attenuation_of(places, climate, percentage):
    return weather.attenuation(
        climate,
        places["elevation"],
        places["tilt"],
        percentage=percentage,
        diameter_m=DIAMETER_M,
        efficiency=EFFICIENCY,
    )


def one_by_one(places, climate, function):
    values = []
    with warnings.catch_warnings():
        # The library computes branches that it then does not use, and they overflow below 5 GHz.
        warnings.simplefilter("ignore", RuntimeWarning)
        for i in range(PLACES):
            place = (float(places[key][i]) for key in ("latitude", "longitude", "elevation", "tilt"))
            values.append(float(function(*place, float(climate.height[i])).value))
    return np.array(values)


@pytest.mark.parametrize("frequency", [3.9, 11.7, 19.7])
@pytest.mark.parametrize("percentage", [0.001, 0.01, 0.3, 1.0, 5.0])
def test_rain_with_each_places_own_tilt(itur, places, frequency, percentage):
    climate = climate_of(places, frequency)
    expected = one_by_one(
        places,
        climate,
        lambda lat, lon, el, tau, hs: itur.models.itu618.rain_attenuation(
            lat, lon, frequency, el, hs, percentage, None, tau
        ),
    )
    np.testing.assert_allclose(attenuation_of(places, climate, percentage).rain, expected, rtol=0, atol=1e-6)


@pytest.mark.parametrize(("frequency", "tolerance"), [(3.9, 1e-4), (11.7, 1e-4), (19.7, 5e-4), (29.5, 1e-3)])
@pytest.mark.parametrize("percentage", [5.0, 50.0, 12.0])
def test_gas(itur, places, frequency, tolerance, percentage):
    def slant_gas(lat, lon, el, tau, hs):
        return itur.gaseous_attenuation_slant_path(
            frequency,
            el,
            itur.surface_water_vapour_density(lat, lon, percentage, hs),
            itur.standard_pressure(hs),
            itur.surface_mean_temperature(lat, lon),
            itur.total_water_vapour_content(lat, lon, percentage, hs),
            hs,
        )

    climate = climate_of(places, frequency, percentage=percentage)
    expected = one_by_one(places, climate, slant_gas)
    # The polynomials in place of the spectral lines are allowed a ten-thousandth of a decibel at Ku.
    result = attenuation_of(places, climate, percentage).gas
    np.testing.assert_allclose(result, expected, rtol=0, atol=tolerance)
    if percentage == weather.CLEAR_PERCENTAGE:
        np.testing.assert_allclose(
            weather.clear_sky_gas(climate, places["elevation"]), expected, rtol=0, atol=tolerance
        )


@pytest.mark.parametrize("frequency", [11.7, 29.5])
@pytest.mark.parametrize("percentage", [5.0, 12.0])
def test_cloud(itur, places, frequency, percentage):
    climate = climate_of(places, frequency, percentage=percentage)
    expected = one_by_one(
        places,
        climate,
        lambda lat, lon, el, tau, hs: itur.cloud_attenuation(lat, lon, el, frequency, percentage),
    )
    np.testing.assert_allclose(attenuation_of(places, climate, percentage).cloud, expected, rtol=0, atol=1e-6)


@pytest.mark.parametrize("percentage", [0.01, 0.3, 5.0])
def test_scintillation(itur, places, percentage):
    climate = climate_of(places, 11.7)
    expected = one_by_one(
        places,
        climate,
        lambda lat, lon, el, tau, hs: itur.scintillation_attenuation(
            lat, lon, 11.7, el, percentage, DIAMETER_M, EFFICIENCY
        ),
    )
    result = attenuation_of(places, climate, percentage).scintillation
    np.testing.assert_allclose(result, expected, rtol=0, atol=1e-6)


@pytest.mark.parametrize("frequency", [4.2, 6.5, 11.7, 19.7, 29.5, 45.0])
@pytest.mark.parametrize("percentage", [0.001, 0.01, 0.1, 1.0])
def test_discrimination(itur, places, frequency, percentage):
    elevation = np.minimum(places["elevation"], 60.0)
    fade = np.linspace(0.1, 20.0, PLACES)
    expected = [
        float(
            itur.models.itu618.rain_cross_polarization_discrimination(
                float(fade[i]), frequency, float(elevation[i]), percentage, float(places["tilt"][i])
            ).value
        )
        for i in range(PLACES)
    ]
    result = weather.discrimination(
        fade, places["elevation"], places["tilt"], frequency_ghz=frequency, percentage=percentage
    )
    np.testing.assert_allclose(result, expected, rtol=0, atol=1e-6)


def test_topography(itur, places):
    expected = [
        float(itur.topographic_altitude(float(lat), float(lon)).value)
        for lat, lon in zip(places["latitude"], places["longitude"], strict=True)
    ]
    result = maps.topography(places["longitude"], places["latitude"])
    # The library takes the step of 1/12° from nodes that are rounded to eight digits, which shifts its
    # look-ups by up to 1e-4 of a step: less than a metre of height on the steepest slopes.
    np.testing.assert_allclose(result, expected, rtol=0, atol=1e-3)


def test_gas_towards_the_zenith_of_the_line_by_line_model(itur):
    # Specific attenuation of the library at the surface of the mean annual reference atmosphere.
    for frequency in (4.0, 12.0, 22.0, 30.0, 50.0):
        ours = gas.oxygen_specific_attenuation(frequency, 1013.25, 7.5, 288.15)
        ours = ours + gas.vapour_specific_attenuation(frequency, 1013.25, 7.5, 288.15)
        theirs = itur.models.itu676.gamma_exact(frequency, 1013.25, 7.5, 288.15).value
        assert float(ours) == pytest.approx(float(theirs), rel=1e-9)


def test_a_thousand_places_of_a_grid_against_direct_evaluation(itur):
    """A grid's layers, cell by cell, against the library's formulas at a thousand of its cells."""
    generator = np.random.default_rng(14)
    longitude = np.linspace(-12.0, 40.0, 700)[None, :]
    latitude = np.linspace(62.0, -36.0, 900)[:, None]
    elevation = 80.0 - np.abs(latitude) - 0.4 * np.abs(longitude - 10.0)
    tilt = 60.0 + 0.7 * longitude + 0.2 * latitude
    frequency, percentage = 11.7, 0.1
    climate = weather.climate(longitude, latitude, np.nan, frequency_ghz=frequency)
    result = weather.attenuation(
        climate, elevation, tilt, percentage=percentage, diameter_m=DIAMETER_M, efficiency=EFFICIENCY
    )
    visible = np.argwhere(elevation >= 5.0)
    chosen = visible[generator.choice(len(visible), 1000, replace=False)]
    row, column = chosen.T
    lat, lon, el = latitude[row, 0], longitude[0, column], elevation[row, column]
    height = itur.topographic_altitude(lat, lon).value
    wet = itur.total_water_vapour_content(lat, lon, 5.0, height).value
    density = itur.surface_water_vapour_density(lat, lon, 5.0, height).value
    temperature = itur.surface_mean_temperature(lat, lon).value
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")
        air = itur.gaseous_attenuation_slant_path(
            frequency, el, density, itur.standard_pressure(height).value, temperature, wet, height
        ).value
        water = itur.cloud_attenuation(lat, lon, el, frequency, 5.0).value
        fade = itur.scintillation_attenuation(
            lat, lon, frequency, el, percentage, DIAMETER_M, EFFICIENCY
        ).value
        drops = np.array(
            [
                itur.models.itu618.rain_attenuation(
                    *arguments[:2], frequency, *arguments[2:4], percentage, None, arguments[4]
                ).value
                for arguments in zip(
                    lat.tolist(),
                    lon.tolist(),
                    el.tolist(),
                    height.tolist(),
                    np.broadcast_to(tilt, elevation.shape)[row, column].tolist(),
                    strict=True,
                )
            ],
            dtype=float,
        ).ravel()
    expected = weather.combined(air, drops, water, fade)
    # The bar is 0.03 dB in all; what is reached leaves the topography's half metre and the gas.
    np.testing.assert_allclose(result.total[row, column], expected, rtol=0, atol=1e-3)
    np.testing.assert_allclose(result.rain[row, column], drops, rtol=0, atol=1e-3)
    np.testing.assert_allclose(result.gas[row, column], air, rtol=0, atol=1e-3)
    np.testing.assert_allclose(result.scintillation[row, column], fade, rtol=0, atol=1e-5)
