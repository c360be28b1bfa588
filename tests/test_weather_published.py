"""Weather formulas and maps against the validation cases of ITU-R Study Group 3 and published bounds."""

from __future__ import annotations

import csv
from pathlib import Path

import numpy as np
import pytest

from geoskew import weather
from geoskew.weather import cloud, depolarisation, gas, maps, rain, scintillation
from geoskew.weather.zenith import ZenithGas

REFERENCE = Path(__file__).parent / "reference"


def read_cases(name):
    with (REFERENCE / f"weather_{name}.csv").open(encoding="utf-8", newline="") as file:
        return [
            {
                key: text if key in ("case", "map", "source", "how") else float(text)
                for key, text in row.items()
            }
            for row in csv.DictReader(file)
        ]


def cases(name):
    return pytest.mark.parametrize("row", read_cases(name), ids=lambda row: row["case"])


def near(row, key="expected_db"):
    return pytest.approx(row[key], abs=row["tolerance"])


@cases("rain")
def test_rain_attenuation_of_the_validation_cases(row):
    longitude, latitude, elevation, tilt, rate, height = (
        np.asarray(row[key])
        for key in ("longitude", "latitude", "elevation", "tilt", "rain_rate", "height_km")
    )
    depth = maps.rain_height(longitude, latitude) - height
    at_001 = rain.attenuation_001(rate, depth, latitude, elevation, tilt, frequency_ghz=row["frequency_ghz"])
    value = rain.at_percentage(at_001, latitude, elevation, percentage=row["percentage"])
    assert float(value) == pytest.approx(row["expected_db"], abs=1e-8)  # the digits that are printed


@cases("specific")
def test_specific_attenuation(row):
    value = rain.specific_attenuation(
        row["rain_rate"], row["elevation"], row["tilt"], frequency_ghz=row["frequency_ghz"]
    )
    assert float(value) == pytest.approx(row["expected_db_km"], rel=row["tolerance"])


@cases("gas")
def test_gas_of_the_validation_cases(row):
    surface = (row["frequency_ghz"], row["pressure_hpa"], row["density"], row["temperature_k"])
    zenith = gas.zenith_oxygen(*surface)
    zenith = zenith + gas.zenith_vapour(row["frequency_ghz"], row["column"], row["height_km"])
    assert float(gas.slant(zenith, row["elevation"])) == near(row)


@cases("cloud")
def test_cloud_of_the_validation_cases(row):
    longitude, latitude = np.asarray(row["longitude"]), np.asarray(row["latitude"])
    column = maps.cloud_liquid(longitude, latitude, percentage=row["percentage"])
    zenith = column * cloud.liquid_coefficient(row["frequency_ghz"])
    assert float(gas.slant(zenith, row["elevation"])) == near(row)


@cases("scintillation")
def test_scintillation_of_the_validation_cases(row):
    deviation = scintillation.deviation(
        np.asarray(row["elevation"]),
        np.asarray(row["wet_refractivity"]),
        frequency_ghz=row["frequency_ghz"],
        diameter_m=row["diameter_m"],
        efficiency=row["efficiency"],
    )
    assert float(deviation * scintillation.time_factor(row["percentage"])) == near(row)


@cases("total")
def test_combining_formula_with_the_one_percent_values_of_edition_13(row):
    value = weather.combined(row["gas_db"], row["rain_db"], row["cloud_db"], row["scintillation_db"])
    assert float(value) == near(row)


@cases("depolarisation")
def test_discrimination(row):
    value = weather.discrimination(
        row["rain_db"],
        row["elevation"],
        row["tilt"],
        frequency_ghz=row["frequency_ghz"],
        percentage=row["percentage"],
    )
    assert float(value) == near(row)


@cases("maps")
def test_map(row):
    look_up = getattr(maps, row["map"])
    value = look_up(np.asarray(row["longitude"]), np.asarray(row["latitude"]))
    assert float(value) == near(row, "expected")


def test_greatest_improvement_by_linear_polarisation():
    # P.618-14 §4.1 step 3 prints a maximum of 15 dB at 0° and 90°, and 0 at 45°.
    assert depolarisation.polarisation_term(0.0) == pytest.approx(15.0, abs=0.06)
    assert depolarisation.polarisation_term(90.0) == pytest.approx(15.0, abs=0.06)
    assert depolarisation.polarisation_term(45.0) == pytest.approx(-10.0 * np.log10(1.0), abs=1e-12)


def test_canting_is_tabulated_and_between_the_steps_linear_in_the_logarithm():
    # P.618-14 §4.1 step 5.
    tabulated = {1.0: 0.0, 0.1: 5.0, 0.01: 10.0, 0.001: 15.0}
    for percentage, degrees in tabulated.items():
        assert depolarisation.canting(percentage) == pytest.approx(degrees)
    assert depolarisation.canting(np.sqrt(0.1 * 0.01)) == pytest.approx(7.5)
    assert depolarisation.canting(5.0) == 0.0


def test_scintillation_keeps_its_value_below_a_hundredth_of_a_percent():
    assert scintillation.time_factor(0.001) == scintillation.time_factor(0.01)
    # P.618-14 eq. (48) at 1 %: all logarithms vanish.
    assert scintillation.time_factor(1.0) == 3.0


def test_reference_atmosphere_at_sea_level():
    # P.835-6 §1.1: 1013.25 hPa at the surface, 226.3226 hPa at 11 km of geopotential height.
    assert float(gas.standard_pressure(0.0)) == pytest.approx(1013.25)
    eleven = 6356.766 * 11.0 / (6356.766 - 11.0)
    assert float(gas.standard_pressure(eleven)) == pytest.approx(226.3226, abs=1e-2)


@pytest.mark.parametrize(("frequency", "tolerance"), [(3.9, 2e-5), (11.7, 2e-5), (29.5, 2e-5), (50.0, 2e-4)])
def test_polynomials_stand_for_the_line_by_line_model(frequency, tolerance):
    generator = np.random.default_rng(676)
    height, temperature, density, column = (
        generator.uniform(*ends, 2000) for ends in ((-0.5, 6.9), (231.0, 309.0), (0.1, 34.0), (0.1, 99.0))
    )
    (result,) = ZenithGas.at(frequency).attenuation(height, temperature, [(density, column)])
    pressure = gas.standard_pressure(height)
    expected = gas.zenith_oxygen(frequency, pressure, density, temperature)
    expected = expected + gas.zenith_vapour(frequency, column, height)
    np.testing.assert_allclose(result, expected, rtol=0, atol=tolerance)
