"""Directions to a satellite against independent libraries, published values and closed forms."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from published import by_case, cases

from geoskew import constants, geometry

# Every angle here is held to 1e-6°: on the ground that is a decimetre.
DEGREES = 1e-6


def look(longitude, latitude, height, satellite):
    sight = geometry.line_of_sight(longitude, latitude, height, satellite)
    direction = sight.direction
    return geometry.azimuth(direction), geometry.elevation(direction), sight.range_m


def lattice():
    """Places all over the world, poles and ±180° among them, at three heights, and four satellites."""
    longitude, latitude, height = np.meshgrid(
        np.linspace(-180.0, 180.0, 19), np.linspace(-90.0, 90.0, 13), [-400.0, 0.0, 5300.0], indexing="ij"
    )
    places = [array.ravel() for array in (longitude, latitude, height)]
    return places, [(-66.2, 0.0), (180.0, 0.0), (0.0, 5.0), (169.2, -3.5)]


def assert_same_direction(azimuth, elevation, expected_azimuth, expected_elevation):
    """Compare as directions: near the zenith an azimuth is worth cos(elevation) of an angle."""
    apart = np.mod(azimuth - expected_azimuth + 180.0, 360.0) - 180.0
    np.testing.assert_allclose(apart * np.cos(np.deg2rad(expected_elevation)), 0.0, atol=DEGREES)
    np.testing.assert_allclose(elevation, expected_elevation, atol=DEGREES)


@pytest.mark.parametrize("row", cases("look_angles.csv"), ids=by_case)
def test_published_look_angles(row):
    satellite = geometry.satellite_position(row["sat_lon_deg"])
    azimuth, elevation, range_m = look(row["lon_deg"], row["lat_deg"], row["height_m"], satellite)
    # Six decimals are given.
    assert float(elevation) == pytest.approx(row["el_deg"], abs=5.1e-7)
    assert float(range_m) / 1000.0 == pytest.approx(row["range_km"], abs=1e-6)
    if row["az_deg"] is not None:
        assert float(azimuth) == pytest.approx(row["az_deg"], abs=5.1e-7)


def test_radius_of_the_geostationary_circle():
    # Kepler's third law with GM of WGS 84 and the sidereal day.
    radius = (3.986004418e14 * 86_164.0905**2 / (4.0 * np.pi**2)) ** (1.0 / 3.0)
    assert pytest.approx(radius, abs=1.0) == constants.GEOSTATIONARY_RADIUS_M


def test_latitudes_of_the_horizon():
    # WGS 84, on the satellite's meridian, no refraction; found with a root finder outside of this project.
    satellite = geometry.satellite_position(0.0)
    _, elevation, _ = look(0.0, np.array([81.328246, 76.361709, 71.461791]), 0.0, satellite)
    np.testing.assert_allclose(elevation, [0.0, 5.0, 10.0], atol=2e-5)


def test_textbook_look_angles():
    # Roddy, Satellite Communications, 4th ed., Examples 3.1 and 3.2 (Earth of 6371 km): 35° N 100° W, satellite at
    # 90° W: azimuth 162.9°, range 37 215 km, elevation about 48°. The ellipsoid moves them by what is allowed here.
    azimuth, elevation, range_m = look(-100.0, 35.0, 0.0, geometry.satellite_position(-90.0))
    assert float(azimuth) == pytest.approx(162.9, abs=0.06)
    assert float(elevation) == pytest.approx(48.0, abs=0.6)
    assert float(range_m) / 1000.0 == pytest.approx(37_215.0, abs=15.0)


def test_against_pyproj():
    from pyproj import Transformer

    places, satellites = lattice()
    for where in satellites:
        satellite = geometry.satellite_position(*where)
        azimuth, elevation, range_m = look(*places, satellite)
        expected = []
        for longitude, latitude, height in zip(*places, strict=True):
            # The parameters of topocentric are constants of the operation: one pipeline a place.
            pipeline = Transformer.from_pipeline(
                f"+proj=topocentric +ellps=WGS84 +lon_0={longitude:.17g} +lat_0={latitude:.17g} +h_0={height:.17g}"
            )
            expected.append(pipeline.transform(*satellite))
        east, north, up = np.array(expected).T
        level = np.hypot(east, north)
        assert_same_direction(
            azimuth, elevation, np.rad2deg(np.arctan2(east, north)), np.rad2deg(np.arctan2(up, level))
        )
        np.testing.assert_allclose(range_m, np.hypot(level, up), atol=1e-3)


def test_against_astropy():
    from astropy import units
    from astropy.coordinates import ITRS, AltAz, CartesianRepresentation, EarthLocation
    from astropy.time import Time

    places, satellites = lattice()
    location = EarthLocation.from_geodetic(places[0], places[1], places[2] * units.m, ellipsoid="WGS84")
    # Any moment of the built-in tables does: the transformation is of two Earth-fixed frames.
    moment = Time("2020-03-20T00:00:00")
    for where in satellites:
        satellite = geometry.satellite_position(*where)
        azimuth, elevation, range_m = look(*places, satellite)
        site = np.array([location.x.value, location.y.value, location.z.value])
        # Topocentric, with the location set: a geocentric vector would be led through the sky and aberrated.
        vector = CartesianRepresentation(*(satellite[:, None] - site), unit=units.m)
        seen = ITRS(vector, obstime=moment, location=location).transform_to(
            AltAz(obstime=moment, location=location)
        )
        assert_same_direction(azimuth, elevation, seen.az.deg, seen.alt.deg)
        np.testing.assert_allclose(range_m, seen.distance.to_value("m"), atol=1e-3)


def test_against_skyfield():
    from skyfield.api import load, wgs84
    from skyfield.positionlib import ITRF_to_GCRS2, build_position

    places, satellites = lattice()
    moment = load.timescale(builtin=True).utc(2020, 3, 20)
    astronomical_unit = 149_597_870_700.0  # metres, IAU 2012
    # One object a site: a sample of the lattice keeps the test short.
    chosen = np.random.default_rng(5).choice(places[0].size, 60, replace=False)
    for where in satellites:
        satellite = geometry.satellite_position(*where)
        azimuth, elevation, range_m = look(*(array[chosen] for array in places), satellite)
        position, _ = ITRF_to_GCRS2(moment, satellite / astronomical_unit, np.zeros(3))
        for number, index in enumerate(chosen):
            site = wgs84.latlon(places[1][index], places[0][index], elevation_m=places[2][index])
            apart = build_position(position - site.at(moment).position.au, t=moment, center=site)
            altitude, bearing, distance = apart.altaz()
            assert_same_direction(azimuth[number], elevation[number], bearing.degrees, altitude.degrees)
            assert range_m[number] == pytest.approx(distance.m, abs=1e-2)


@pytest.mark.parametrize("row", cases("separation.csv"), ids=by_case)
def test_published_separation(row):
    directions = [
        geometry.line_of_sight(
            row["lon_deg"], row["lat_deg"], 0.0, geometry.satellite_position(row[key])
        ).direction
        for key in ("sat1_lon_deg", "sat2_lon_deg")
    ]
    # Five decimals at least, four in the first case.
    assert float(geometry.separation(*directions)) == pytest.approx(row["separation_deg"], abs=2.1e-5)


def test_separation_by_the_law_of_cosines():
    rng = np.random.default_rng(8)
    longitude, latitude = rng.uniform(-50.0, 50.0, 200), rng.uniform(-60.0, 60.0, 200)
    for apart in (1e-3, 0.6, 30.0):
        sights = [
            geometry.line_of_sight(longitude, latitude, 0.0, geometry.satellite_position(slot))
            for slot in (0.0, apart)
        ]
        one, other = (sight.range_m for sight in sights)
        chord = 2.0 * constants.GEOSTATIONARY_RADIUS_M * np.sin(np.deg2rad(apart) / 2.0)
        # Half-angle form of cos a = (d1² + d2² − c²)/(2 d1 d2), exact for small angles as well.
        half = np.sqrt((chord**2 - (one - other) ** 2) / (4.0 * one * other))
        expected = np.rad2deg(2.0 * np.arcsin(half))
        np.testing.assert_allclose(
            geometry.separation(sights[0].direction, sights[1].direction), expected, rtol=1e-7, atol=1e-9
        )


@pytest.mark.parametrize("row", cases("inclined.csv"), ids=by_case)
def test_inclined_satellite(row):
    inclination, u = np.deg2rad(row["inclination_deg"]), np.deg2rad(row["u_deg"])
    # Sub-satellite point of a circular orbit of one turn a day (spherical trigonometry).
    latitude = np.rad2deg(np.arcsin(np.sin(inclination) * np.sin(u)))
    drift = np.rad2deg(np.arctan2(np.cos(inclination) * np.sin(u), np.cos(u)) - u)
    assert latitude == pytest.approx(row["sat_lat_deg"], abs=6e-6)
    assert drift == pytest.approx(row["sat_dlon_deg"], abs=6e-6)
    site = (row["lon_deg"], row["lat_deg"], 0.0)
    level = look(*site, geometry.satellite_position(row["sat_lon_deg"]))
    moved = look(*site, geometry.satellite_position(row["sat_lon_deg"] + drift, latitude))
    assert float(moved[0] - level[0]) == pytest.approx(row["d_az_deg"], abs=1e-5)
    assert float(moved[1] - level[1]) == pytest.approx(row["d_el_deg"], abs=1e-5)
    assert float(moved[2] - level[2]) / 1000.0 == pytest.approx(row["d_range_km"], abs=0.1)


@pytest.mark.parametrize("longitude", np.arange(-180.0, 180.1, 7.3))
def test_sub_satellite_point(longitude):
    azimuth, elevation, range_m = look(longitude, 0.0, 0.0, geometry.satellite_position(longitude))
    # Azimuth has no meaning at the zenith; it is 0 by convention, whatever rounding says.
    assert float(azimuth) == 0.0
    assert float(elevation) == pytest.approx(90.0, abs=1e-9)
    assert float(range_m) == pytest.approx(42_164_170.0 - 6_378_137.0, abs=1e-6)


def test_equator():
    longitude = np.array([-75.0, -10.0, 10.0, 75.0])
    azimuth, elevation, _ = look(longitude, 0.0, 0.0, geometry.satellite_position(0.0))
    assert azimuth.tolist() == pytest.approx([90.0, 90.0, 270.0, 270.0], abs=1e-12)
    # Plane trigonometry on the equator's circle.
    ratio = constants.EARTH_EQUATORIAL_RADIUS_M / constants.GEOSTATIONARY_RADIUS_M
    angle = np.deg2rad(np.abs(longitude))
    expected = np.rad2deg(np.arctan2(np.cos(angle) - ratio, np.sin(angle)))
    np.testing.assert_allclose(elevation, expected, atol=1e-10)


def test_poles():
    # From a pole the satellite stands at one elevation, below the horizon, whatever the longitude.
    polar = constants.EARTH_EQUATORIAL_RADIUS_M * (1.0 - constants.EARTH_FLATTENING)
    expected = np.rad2deg(np.arctan2(-polar, constants.GEOSTATIONARY_RADIUS_M))
    for latitude in (-90.0, 90.0):
        azimuth, elevation, _ = look(
            np.linspace(-180.0, 180.0, 9), latitude, 0.0, geometry.satellite_position(25.0)
        )
        np.testing.assert_allclose(elevation, expected, atol=1e-9)
        assert np.all(np.isfinite(azimuth))


def test_both_names_of_the_antimeridian():
    for slot in (170.0, -170.0, 180.0, -180.0):
        satellite = geometry.satellite_position(slot)
        west, east = (look(longitude, [-40.0, 0.0, 65.0], 0.0, satellite) for longitude in (-180.0, 180.0))
        for one, other in zip(west, east, strict=True):
            np.testing.assert_allclose(one, other, rtol=1e-12, atol=1e-9)


def test_below_the_horizon():
    azimuth, elevation, range_m = look(
        [100.0, 180.0, -120.0], [10.0, 0.0, -45.0], 0.0, geometry.satellite_position(0.0)
    )
    assert np.all(elevation < 0.0)
    assert elevation[1] == pytest.approx(-90.0, abs=1e-9)
    assert np.all(np.isfinite(azimuth))
    assert range_m[1] == pytest.approx(42_164_170.0 + 6_378_137.0, abs=1e-6)


@settings(max_examples=60, deadline=None)
@given(st.floats(-89.9, 89.9), st.floats(0.01, 179.0), st.floats(-180.0, 180.0), st.floats(0.0, 9000.0))
def test_mirrors(latitude, east_of_it, slot, height):
    satellite = geometry.satellite_position(slot)
    azimuth, elevation, range_m = look(slot + east_of_it, latitude, height, satellite)
    in_meridian = look(slot - east_of_it, latitude, height, satellite)
    in_equator = look(slot + east_of_it, -latitude, height, satellite)
    for mirrored in (in_meridian, in_equator):
        assert float(mirrored[1]) == pytest.approx(float(elevation), abs=1e-8)
        assert float(mirrored[2]) == pytest.approx(float(range_m), rel=1e-12)
    sine, cosine = np.sin(np.deg2rad(azimuth)), np.cos(np.deg2rad(azimuth))
    for mirrored, signs in ((in_meridian, (-1.0, 1.0)), (in_equator, (1.0, -1.0))):
        turned = np.deg2rad(mirrored[0])
        assert np.sin(turned) == pytest.approx(signs[0] * sine, abs=1e-9)
        assert np.cos(turned) == pytest.approx(signs[1] * cosine, abs=1e-9)


def test_grid_equals_list_equals_point():
    satellite = geometry.satellite_position(-66.2, 1.5)
    longitude, latitude = np.linspace(-80.0, -50.0, 7), np.linspace(-60.0, 20.0, 5)
    grid = look(longitude[None, :], latitude[:, None], 0.0, satellite)
    x, y = np.meshgrid(longitude, latitude)
    flat = look(x.ravel(), y.ravel(), np.zeros(x.size), satellite)
    for on_grid, in_list in zip(grid, flat, strict=True):
        assert on_grid.shape == (5, 7)
        assert np.array_equal(on_grid.ravel(), in_list)
    one = look(longitude[3], latitude[2], 0.0, satellite)
    for on_grid, at_point in zip(grid, one, strict=True):
        assert np.shape(at_point) == ()
        assert float(at_point) == on_grid[2, 3]


def test_position_angle_as_seen_from_the_satellite():
    # Seen from the satellite with north up: a place to the north is at 90°, one to the east at 0°, and so on.
    from geoskew import polarisation

    satellite = geometry.satellite_position(20.0)
    frame = polarisation.beam_frame(satellite)
    where = (np.array([20.0, 40.0, 20.0, 0.0]), np.array([30.0, 0.0, -30.0, 0.0]))
    direction = geometry.line_of_sight(*where, 0.0, satellite).direction
    travel = geometry.Local(-direction.east, -direction.north, -direction.up)
    axes = [geometry.in_local_frame(one, *where) for one in (frame.axis, frame.right, frame.top)]
    off_axis, position = geometry.off_axis_and_position_angle(*axes, travel)
    np.testing.assert_allclose(position, [90.0, 0.0, -90.0, 180.0], atol=1e-9)
    # Plane trigonometry on the equator: the angle at the satellite between centre and place.
    ratio = constants.EARTH_EQUATORIAL_RADIUS_M / constants.GEOSTATIONARY_RADIUS_M
    turned = np.deg2rad(20.0)
    expected = np.rad2deg(np.arctan2(ratio * np.sin(turned), 1.0 - ratio * np.cos(turned)))
    np.testing.assert_allclose(off_axis[[1, 3]], expected, atol=1e-9)
