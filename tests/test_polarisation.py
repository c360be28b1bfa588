"""Skew, settings in a dish, mismatch and discrimination against published formulas, values and laws."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from published import by_case, cases

from geoskew import geometry, polarisation
from geoskew.angles import fold

SIZE_RATIO = 6_378_137.0 / 42_164_170.0


def skew(longitude, latitude, *, slot=0.0, slot_latitude=0.0, tilt=0.0, aim=None, height=0.0):
    satellite = geometry.satellite_position(slot, slot_latitude)
    direction = geometry.line_of_sight(longitude, latitude, height, satellite).direction
    return polarisation.skew(polarisation.beam_frame(satellite, aim), tilt, direction, longitude, latitude)


def seen(longitude, latitude, *, dish, slot, tilt=0.0):
    """Setting that suits a satellite at `slot` in a dish that looks at the slot `dish`."""
    satellite = geometry.satellite_position(slot)
    towards = geometry.line_of_sight(longitude, latitude, 0.0, satellite).direction
    axis = geometry.line_of_sight(longitude, latitude, 0.0, geometry.satellite_position(dish)).direction
    frame = polarisation.beam_frame(satellite)
    arriving = polarisation.vertical_axis(frame, tilt, towards, longitude, latitude)
    return polarisation.seen_in_dish(arriving, towards, axis)


def assert_same_angle(values, expected, degrees):
    """Compare polarisation angles, which are alike modulo 180°."""
    np.testing.assert_allclose(fold(np.asarray(values) - np.asarray(expected)), 0.0, atol=degrees)


def visible(step=4.0, lowest=0.0):
    """Places from which a satellite at 0° is above an elevation, none within 1° of its meridian or the equator."""
    longitude, latitude = np.meshgrid(np.arange(-80.0, 80.1, step) + 0.7, np.arange(-80.0, 80.1, step) + 1.3)
    direction = geometry.line_of_sight(longitude, latitude, 0.0, geometry.satellite_position(0.0)).direction
    seen_there = geometry.elevation(direction) > lowest
    away = (np.abs(longitude) > 0.5) & (np.abs(latitude) > 1.0)
    return longitude[seen_there & away], latitude[seen_there & away]


# Textbook formulas; latitude as a textbook takes it, longitude relative to the satellite's.


def simple_formula(dlon, latitude):
    """With tan ψ = sin Δλ / tan φ (Maral & Bousquet, polarisation angle; from memory)."""
    x, y = np.deg2rad(dlon), np.deg2rad(latitude)
    return fold(np.rad2deg(np.arctan2(np.sin(x), np.tan(y))))


def dipole_formula(dlon, latitude):
    """Angle after Roddy, Satellite Communications, 4th ed., eq. (5.9) to (5.16): E = (k × e) × k, e the polar axis.

    cos ψ = sin φ (1 − q c) / (√(1 − c²) √(1 − 2qc + q² cos² φ)), c = cos φ cos Δλ, sign of Δλ.
    """
    x, y = np.deg2rad(dlon), np.deg2rad(latitude)
    c = np.cos(y) * np.cos(x)
    below = np.sqrt(1.0 - c**2) * np.sqrt(1.0 - 2.0 * SIZE_RATIO * c + (SIZE_RATIO * np.cos(y)) ** 2)
    return fold(np.sign(x) * np.rad2deg(np.arccos(np.sin(y) * (1.0 - SIZE_RATIO * c) / below)))


@pytest.fixture
def spherical_earth(monkeypatch):
    """The same code with a flattening of 0, where the textbook formulas are exact."""
    monkeypatch.setattr(geometry, "EARTH_ECCENTRICITY_SQUARED", 0.0)


@pytest.mark.usefixtures("spherical_earth")
def test_simple_formula_is_exact_for_a_nadir_axis_on_a_sphere():
    longitude, latitude = visible()
    assert longitude.size > 500
    assert_same_angle(skew(longitude, latitude), simple_formula(longitude, latitude), 1e-9)


@pytest.mark.usefixtures("spherical_earth")
def test_dipole_formula_is_exact_for_a_beam_at_the_site_on_a_sphere():
    longitude, latitude = visible(step=8.0)
    assert longitude.size > 100
    for x, y in zip(longitude, latitude, strict=True):
        assert_same_angle(skew(x, y, aim=(x, y)), dipole_formula(x, y), 1e-9)


def test_simple_formula_on_the_ellipsoid():
    # With geodetic latitude and a nadir axis the formula holds to 0.03° over the whole visible disk.
    longitude, latitude = visible(step=2.0)
    difference = np.abs(fold(skew(longitude, latitude) - simple_formula(longitude, latitude)))
    assert difference.max() < 0.03
    # It is the flattening that is seen: without it there would be nothing left.
    assert difference.max() > 0.01


def test_printed_textbook_example():
    # Roddy, Satellite Communications, 4th ed., section 5.3: 18° N 73° W, satellite at 105° W, horizontally
    # polarised in the sense of its polar dipole: 58.64° printed. The book's formula unrounded is 58.617°.
    latitude, longitude, slot = 18.0, -73.0, -105.0
    assert float(dipole_formula(longitude - slot, latitude)) == pytest.approx(58.617, abs=6e-4)
    ours = float(skew(longitude, latitude, slot=slot, aim=(longitude, latitude)))
    assert ours == pytest.approx(58.64, abs=0.05)  # rounding within the book 0.023°, its sphere 0.02°


@pytest.mark.parametrize("row", cases("skew.csv"), ids=by_case)
def test_published_skew(row):
    x, y = row["dlon_deg"], row["lat_deg"]
    assert_same_angle(skew(x, y), row["nadir_aim"], 5.1e-5)
    assert_same_angle(skew(x, y, aim=(x, y)), row["site_aim"], 5.1e-5)
    # The formulas of this file are the ones that the table was made with.
    if y != 0.0 and x != 0.0:
        assert_same_angle(simple_formula(x, y), row["simple"], 5.1e-5)
        assert_same_angle(dipole_formula(x, y), row["sphere"], 5.1e-5)


@pytest.mark.parametrize("row", cases("skew_frames.csv"), ids=by_case)
def test_published_frames(row):
    aim = None if row["aim_lat_deg"] is None else (row["aim_lon_deg"], row["aim_lat_deg"])
    # γ counter-clockwise from the equatorial plane; V stands at 90° and a tilt turns it further.
    value = skew(
        row["lon_deg"], row["lat_deg"], slot=row["sat_lon_deg"], tilt=row["gamma_deg"] - 90.0, aim=aim
    )
    assert_same_angle(value, row["skew_deg"], 5.1e-5)


@pytest.mark.parametrize("row", cases("two_satellites.csv"), ids=by_case)
def test_two_angles_between_two_satellites(row):
    x, y, old, new = (row[key] for key in ("lon_deg", "lat_deg", "sat1_lon_deg", "sat2_lon_deg"))
    turn = fold(skew(x, y, slot=new) - skew(x, y, slot=old))
    assert float(turn) == pytest.approx(row["turn_deg"], abs=1e-4)
    in_dish = fold(seen(x, y, dish=old, slot=new) - skew(x, y, slot=old))
    assert float(in_dish) == pytest.approx(row["in_dish_deg"], abs=1e-4)


def test_values_stated_by_the_conventions():
    # 45° S, 10° west of the satellite: +9.86° without tilt, +30.86° with a tilt of +21°.
    assert round(float(skew(-10.0, -45.0)), 2) == 9.86
    assert round(float(skew(-10.0, -45.0, tilt=21.0)), 2) == 30.86


def test_signs_by_quadrant():
    # Negative west of the satellite and positive east of it in the north, the other way round in the south.
    for x, y in ((-20.0, 40.0), (20.0, -40.0)):
        assert float(skew(x, y)) < -1.0
    for x, y in ((20.0, 40.0), (-20.0, -40.0)):
        assert float(skew(x, y)) > 1.0
    assert_same_angle(skew(0.0, [-60.0, -1.0, 1.0, 60.0]), 0.0, 1e-12)


def rotated(vector, axis, angle):
    """Turn a vector about a unit axis (Rodrigues)."""
    return (
        vector * np.cos(angle)
        + np.cross(axis, vector) * np.sin(angle)
        + axis * np.dot(axis, vector) * (1.0 - np.cos(angle))
    )


def carried_by_rotation(vector, start, end):
    """Carry a vector along the great circle between two unit vectors: the rotation that takes one to the other."""
    normal = np.cross(start, end)
    sine = np.linalg.norm(normal)
    if sine < 1e-15:
        return vector
    return rotated(vector, normal / sine, np.arctan2(sine, np.dot(start, end)))


def independent_angles(site, satellite, aim, tilt, dish_satellite):
    """Skew and the setting in a dish on another satellite, from Earth-fixed points alone.

    Nothing of the project is used: points come from PROJ, directions are rotated and never put into a
    local frame, the sense of turning is a triple product.
    """
    from pyproj import Transformer

    to_fixed = Transformer.from_crs("EPSG:4979", "EPSG:4978", always_xy=True)

    def fixed(longitude, latitude, height):
        return np.array(to_fixed.transform(longitude, latitude, height))

    def unit(vector):
        return vector / np.linalg.norm(vector)

    def on_orbit(longitude, latitude):
        x, y = np.deg2rad(longitude), np.deg2rad(latitude)
        return 42_164_170.0 * np.array([np.cos(y) * np.cos(x), np.cos(y) * np.sin(x), np.sin(y)])

    place, above = fixed(*site, 0.0), fixed(*site, 1000.0)
    source, other = on_orbit(*satellite), on_orbit(*dish_satellite)
    beam = unit((np.zeros(3) if aim is None else fixed(*aim, 0.0)) - source)
    # "Look from the satellite along its beam axis, north up": V is what is left of north across the beam.
    north = np.array([0.0, 0.0, 1.0])
    v_axis = unit(north - beam * np.dot(beam, north))
    # Counter-clockwise seen from the satellite, who looks along +beam, is a left-handed turn about the beam.
    v_axis = rotated(v_axis, beam, -np.deg2rad(tilt))
    arriving = carried_by_rotation(v_axis, beam, unit(place - source))

    def measured(vector, look):
        up = unit(above - place)
        vertical = unit(up - look * np.dot(look, up))
        # Clockwise for one who looks along `look` is a right-handed turn about `look`.
        return np.rad2deg(np.arctan2(np.dot(np.cross(vertical, vector), look), np.dot(vertical, vector)))

    towards, dish = unit(source - place), unit(other - place)
    return measured(arriving, towards), measured(carried_by_rotation(arriving, towards, dish), dish)


def test_against_an_independent_derivation():
    rng = np.random.default_rng(12)
    for _ in range(150):
        slot = rng.uniform(-180.0, 180.0)
        site = (slot + rng.uniform(-60.0, 60.0), rng.uniform(-65.0, 65.0))
        aim = None if rng.random() < 0.3 else (slot + rng.uniform(-40.0, 40.0), rng.uniform(-60.0, 60.0))
        satellite, tilt = (slot, rng.uniform(-5.0, 5.0)), rng.uniform(-90.0, 90.0)
        old = (slot + rng.uniform(-20.0, 20.0), rng.uniform(-3.0, 3.0))
        expected, expected_in_dish = independent_angles(site, satellite, aim, tilt, old)

        position = geometry.satellite_position(*satellite)
        towards = geometry.line_of_sight(*site, 0.0, position).direction
        dish = geometry.line_of_sight(*site, 0.0, geometry.satellite_position(*old)).direction
        frame = polarisation.beam_frame(position, aim)
        assert_same_angle(polarisation.skew(frame, tilt, towards, *site), expected, 1e-7)
        arriving = polarisation.vertical_axis(frame, tilt, towards, *site)
        assert_same_angle(polarisation.seen_in_dish(arriving, towards, dish), expected_in_dish, 1e-7)


PLACES = {
    "latitude": st.floats(-80.0, 80.0),
    "east_of_it": st.floats(0.05, 80.0),
    "slot": st.floats(-180.0, 180.0),
}
away_from_equator = settings(max_examples=60, deadline=None)


@away_from_equator
@given(**PLACES, tilt=st.floats(-90.0, 90.0))
def test_mirrors(latitude, east_of_it, slot, tilt):
    here = skew(slot + east_of_it, latitude, slot=slot, tilt=tilt)
    assert_same_angle(skew(slot - east_of_it, latitude, slot=slot, tilt=-tilt), -here, 1e-8)
    assert_same_angle(skew(slot + east_of_it, -latitude, slot=slot, tilt=-tilt), -here, 1e-8)


@away_from_equator
@given(**PLACES, tilt=st.floats(-180.0, 180.0))
def test_a_tilt_adds_to_the_skew_in_both_hemispheres(latitude, east_of_it, slot, tilt):
    for x in (slot + east_of_it, slot - east_of_it):
        here = skew(x, latitude, slot=slot)
        assert_same_angle(skew(x, latitude, slot=slot, tilt=tilt), here + tilt, 1e-8)
        assert_same_angle(skew(x, latitude, slot=slot, tilt=tilt + 180.0), here + tilt, 1e-8)
        assert -90.0 < float(here) <= 90.0


@away_from_equator
@given(**PLACES, shift=st.floats(-180.0, 180.0))
def test_only_the_difference_of_longitudes_counts(latitude, east_of_it, slot, shift):
    here = skew(slot + east_of_it, latitude, slot=slot, aim=(slot - 5.0, 12.0))
    moved = skew(slot + east_of_it + shift, latitude, slot=slot + shift, aim=(slot + shift - 5.0, 12.0))
    assert_same_angle(moved, here, 1e-8)


@away_from_equator
@given(**PLACES, tilt=st.floats(-90.0, 90.0))
def test_with_equal_slots_the_dish_sees_the_skew(latitude, east_of_it, slot, tilt):
    x = slot + east_of_it
    assert_same_angle(
        seen(x, latitude, dish=slot, slot=slot, tilt=tilt), skew(x, latitude, slot=slot, tilt=tilt), 1e-9
    )


def test_attitude_of_an_inclined_satellite():
    # A body held to its orbit normal is turned by i·cos u, which is put into the tilt: at the node all of i.
    inclination = 5.0
    level, turned = (skew(8.0, 50.0, tilt=tilt) for tilt in (0.0, inclination))
    assert float(turned - level) == pytest.approx(5.0, abs=1e-6)


def test_sub_satellite_point():
    # No vertical exists at the zenith: the viewer faces north and leans back, so that the top of the view is south.
    for slot in np.arange(-180.0, 180.1, 11.9):
        assert_same_angle(skew(slot, 0.0, slot=slot), 0.0, 1e-9)
        assert_same_angle(skew(slot, 0.0, slot=slot, tilt=21.0), 21.0, 1e-9)
    # The same as the limit along the meridian.
    assert_same_angle(skew(30.0, [-1e-4, 1e-4], slot=30.0, tilt=21.0), 21.0, 1e-3)


def test_equator_and_poles():
    assert_same_angle(skew([-75.0, -20.0, 20.0, 75.0], 0.0), 90.0, 1e-12)
    for latitude in (-90.0, 90.0):
        assert np.all(np.isfinite(skew(np.linspace(-180.0, 180.0, 9), latitude)))
    # Geometry is defined below the horizon as well.
    assert np.all(np.isfinite(skew(np.array([120.0, 180.0, -150.0]), np.array([10.0, 35.0, -60.0]))))


def test_both_names_of_the_antimeridian():
    latitude = np.array([-50.0, 10.0, 60.0])
    for slot in (172.0, -172.0):
        assert_same_angle(skew(-180.0, latitude, slot=slot), skew(180.0, latitude, slot=slot), 1e-9)


def test_grid_equals_list_equals_point():
    longitude, latitude = np.linspace(-20.0, 30.0, 6), np.linspace(-40.0, 60.0, 5)
    grid = skew(longitude[None, :], latitude[:, None], tilt=7.0, aim=(3.0, 40.0))
    x, y = np.meshgrid(longitude, latitude)
    flat = skew(x.ravel(), y.ravel(), tilt=7.0, aim=(3.0, 40.0))
    assert grid.shape == (5, 6)
    assert np.array_equal(grid.ravel(), flat)
    assert float(skew(longitude[4], latitude[1], tilt=7.0, aim=(3.0, 40.0))) == grid[1, 4]


# Mismatch and discrimination


def isolations(row):
    text = row["isolations_db"]
    return [float(one) for one in str(text).split()] if text is not None else [300.0]


@pytest.mark.parametrize("row", cases("mismatch.csv"), ids=by_case)
def test_published_mismatch(row):
    angle, half_digit = row["delta_deg"], 0.51 * 10.0 ** -int(row["digits"])
    if row["loss_db"] is not None:
        assert float(polarisation.mismatch(angle)) == pytest.approx(row["loss_db"], abs=half_digit)
    # These cases keep the wanted carrier at cos² d: they test the crossed term alone.
    wanted = np.cos(np.deg2rad(angle)) ** 2
    leak = polarisation.power_sum(*isolations(row))
    _, crossed = polarisation.wanted_and_crossed(angle, leak)
    assert 10.0 * np.log10(wanted / crossed) == pytest.approx(row["discrimination_db"], abs=half_digit)
    if row["phasors_db"] is not None:
        amplitudes = polarisation.amplitude_sum(*isolations(row))
        _, crossed = polarisation.wanted_and_crossed_phasors(angle, amplitudes)
        assert 10.0 * np.log10(wanted / crossed) == pytest.approx(row["phasors_db"], abs=half_digit)


def test_closed_forms_over_the_circle():
    angle = np.linspace(-360.0, 360.0, 1441)
    d = np.deg2rad(angle)
    for isolation in (20.0, 24.0, 60.0):
        x, a = 10.0 ** (-isolation / 10.0), 10.0 ** (-isolation / 20.0)
        wanted, crossed = polarisation.wanted_and_crossed(angle, x)
        np.testing.assert_allclose(wanted, np.cos(d) ** 2 + x * np.sin(d) ** 2, atol=1e-15)
        np.testing.assert_allclose(crossed, np.sin(d) ** 2 + x * np.cos(d) ** 2, atol=1e-15)
        np.testing.assert_allclose(wanted + crossed, 1.0 + x, atol=1e-14)
        wanted, crossed = polarisation.wanted_and_crossed_phasors(angle, a)
        np.testing.assert_allclose(
            wanted, np.maximum(0.0, np.abs(np.cos(d)) - a * np.abs(np.sin(d))) ** 2, atol=1e-15
        )
        np.testing.assert_allclose(crossed, (np.abs(np.sin(d)) + a * np.abs(np.cos(d))) ** 2, atol=1e-15)


def test_mismatch_is_never_negative_and_capped():
    loss = polarisation.mismatch(np.linspace(-400.0, 400.0, 8001))
    assert loss.min() == 0.0
    assert loss.max() == pytest.approx(40.0, abs=1e-12)
    assert float(polarisation.mismatch(0.0)) == 0.0
    assert np.isnan(polarisation.mismatch(np.nan))


@settings(deadline=None)
@given(st.floats(-180.0, 180.0), st.floats(10.0, 40.0), st.booleans())
def test_even_and_periodic(angle, isolation, phasors):
    leak = (polarisation.amplitude_sum if phasors else polarisation.power_sum)(isolation, 25.0)
    here = float(polarisation.discrimination(angle, leak, phasors=phasors))
    for same in (-angle, angle + 180.0, angle - 360.0):
        assert float(polarisation.discrimination(same, leak, phasors=phasors)) == pytest.approx(
            here, abs=1e-8
        )
        assert float(polarisation.mismatch(same)) == pytest.approx(
            float(polarisation.mismatch(angle)), abs=1e-8
        )
    assert here <= float(polarisation.discrimination(0.0, leak, phasors=phasors)) + 1e-9


def test_sums_of_isolations():
    # 30 dB and 25 dB: 23.807 dB as powers, 21.1245 dB as worst phasors, worked by hand.
    assert -10.0 * np.log10(polarisation.power_sum(30.0, 25.0)) == pytest.approx(23.807, abs=5.1e-4)
    assert -20.0 * np.log10(polarisation.amplitude_sum(30.0, 25.0)) == pytest.approx(21.1245, abs=5.1e-5)
    # Clear sky: rain leaves an infinite isolation and adds nothing.
    assert float(polarisation.power_sum(30.0, np.inf)) == pytest.approx(1e-3, rel=1e-12)
    assert polarisation.power_sum(30.0, np.full((2, 3), 25.0)).shape == (2, 3)


def test_right_angle():
    # A feed a quarter turn off receives the crossed carrier as it should the wanted one.
    leak = polarisation.power_sum(30.0, 25.0)
    right = float(polarisation.discrimination(0.0, leak))
    assert float(polarisation.discrimination(90.0, leak)) == pytest.approx(-right, abs=1e-9)
    assert float(polarisation.discrimination(45.0, leak)) == pytest.approx(0.0, abs=1e-9)
