"""Contours against synthetic fields that are known exactly, cut into lines by an independent library."""

from __future__ import annotations

import pickle
from functools import lru_cache
from itertools import pairwise

import contourpy
import numpy as np
import pytest
import shapely

from geoskew.coverage import contours
from geoskew.errors import InputError

EARTH, GEO = 6378.137, 42164.17  # km; a sphere does for a synthetic beam


def satellite_angles(longitude, latitude, satellite=13.0):
    """Directions seen from the satellite, degrees east and north of its nadir."""
    lon, lat = np.deg2rad(longitude - satellite), np.deg2rad(latitude)
    x = EARTH * np.cos(lat) * np.sin(lon)
    y = EARTH * np.sin(lat) + 0.0 * x
    z = GEO - EARTH * np.cos(lat) * np.cos(lon)
    return np.rad2deg(np.arctan2(x, z)), np.rad2deg(np.arctan2(y, np.hypot(x, z)))


def elliptical(longitude, latitude):
    x, y = satellite_angles(longitude, latitude)
    x0, y0 = satellite_angles(np.float64(12.0), np.float64(46.0))
    u = (x - x0) * np.cos(0.35) + (y - y0) * np.sin(0.35)
    v = -(x - x0) * np.sin(0.35) + (y - y0) * np.cos(0.35)
    return 52.0 - 12.0 * ((u / 3.0) ** 2 + (v / 1.3) ** 2)


def two_humps(longitude, latitude):
    x, y = satellite_angles(longitude, latitude)
    total = 0.0
    for peak, east, north, width in ((51.0, -2.0, 5.9, 1.9), (49.6, 1.0, 6.5, 1.5)):
        total = total + 10 ** ((peak - 12.0 * ((x - east) ** 2 + (y - north) ** 2) / width**2) / 10)
    return 10.0 * np.log10(total)


LONGITUDES, LATITUDES = np.arange(-30.0, 55.0, 0.1), np.arange(25.0, 70.0, 0.1)
FIELDS = {"elliptical": (elliptical, tuple(range(42, 52))), "two humps": (two_humps, tuple(range(40, 51)))}


def cut(field, levels, longitudes=LONGITUDES, latitudes=LATITUDES):
    generator = contourpy.contour_generator(
        longitudes, latitudes, field(longitudes[None, :], latitudes[:, None])
    )
    lines = [(shapely.LineString(line), level) for level in levels for line in generator.lines(level)]
    return [line for line, _ in lines], [level for _, level in lines]


@lru_cache
def fitted(name):
    field, levels = FIELDS[name]
    return contours.fit(*cut(field, levels))


@pytest.mark.parametrize("name", FIELDS)
@pytest.mark.parametrize("step", [0.07, 0.43, 2.3])
def test_known_field_comes_back_at_any_resolution(name, step, record_property):
    field, levels = FIELDS[name]
    longitude, latitude = np.arange(-29.9, 54.8, step)[None, :], np.arange(25.1, 69.8, step)[:, None]
    truth = field(longitude, latitude)
    error = fitted(name).eirp(longitude, latitude) - truth
    between = (truth > levels[0]) & (truth < levels[-1])
    assert np.sqrt(np.mean(error[between] ** 2)) < 0.15
    assert np.abs(error[between]).max() < 0.5
    inside = truth >= levels[-1]
    record_property("worst inside the innermost contour, dB", float(np.abs(error[inside]).max(initial=0.0)))


@pytest.mark.parametrize("name", FIELDS)
def test_levels_are_met(name):
    field, levels = FIELDS[name]
    for line, level in zip(*cut(field, levels), strict=True):
        points = shapely.get_coordinates(line)
        # A drawn line is a chain of chords; 0.02 dB is a fiftieth of the step.
        np.testing.assert_allclose(fitted(name).eirp(points[:, 0], points[:, 1]), level, atol=0.02)


@pytest.mark.parametrize("name", FIELDS)
def test_stays_between_neighbouring_levels(name):
    field, levels = FIELDS[name]
    longitude, latitude = np.arange(-29.9, 54.8, 0.2)[None, :], np.arange(25.1, 69.8, 0.2)[:, None]
    truth, values = field(longitude, latitude), fitted(name).eirp(longitude, latitude)
    for low, high in pairwise(levels):
        band = values[(truth > low + 0.02) & (truth < high - 0.02)]
        assert band.min() > low - 0.02
        assert band.max() < high + 0.02


def cone(radius_to_level):
    """Contours as circles on the equator, by radius in degrees."""
    around = np.linspace(0.0, 2 * np.pi, 241)
    circles = [
        shapely.LineString(np.column_stack([radius * np.cos(around), radius * np.sin(around)]))
        for radius in radius_to_level
    ]
    return circles, list(radius_to_level.values())


@pytest.mark.parametrize(
    "circles",
    [
        {20: 40.0, 16: 43.0, 12: 46.0, 8: 49.0, 5: 50.0, 2: 51.0},
        {20: 44.0, 19: 45.0, 18: 46.0, 8: 47.0, 7: 48.0, 6: 49.0},
        {20: 44.0, 12: 45.0, 10.5: 48.0, 4: 49.0},
    ],
    ids=["even slope", "two cliffs", "shelf"],
)
def test_falls_steadily_from_the_middle(circles):
    field = contours.fit(*cone(circles))
    for angle in np.linspace(0.0, 2 * np.pi, 13):
        radius = np.linspace(0.0, 20.0, 2001)
        values = field.eirp(radius * np.cos(angle), radius * np.sin(angle))
        # Rises against the fall stay below a hundredth of the smallest step.
        assert np.all(values - np.minimum.accumulate(values) < 0.02)


def test_no_terrace_and_no_kink_at_the_levels():
    # A Gaussian of revolution: the slope must be the exact one at each level, from both sides.
    radii = {18.0 * np.sqrt((52 - level) / 12): float(level) for level in range(42, 52)}
    field = contours.fit(*cone(radii))
    for radius, level in radii.items():
        if level in (42.0, 51.0):
            continue
        slope = -24.0 * radius / 18.0**2
        here = [field.eirp(radius + shift, 0.3) for shift in (-0.1, 0.0, 0.1)]
        assert (here[1] - here[0]) / 0.1 == pytest.approx(slope, rel=0.03)
        assert (here[2] - here[1]) / 0.1 == pytest.approx(slope, rel=0.03)


def test_rise_above_the_highest_level():
    circles = {18.0 * np.sqrt((52 - level) / 12): float(level) for level in range(44, 52)}
    lines, levels = cone(circles)
    radius = np.linspace(0.0, min(circles), 300)
    plain = contours.fit(lines, levels).eirp(radius, 0.0)
    assert 51.3 < plain.max() <= 51.5 * 1.0002  # half of the step of 1 dB
    for peak in (51.3, 52.0, 53.0):
        stated = contours.fit(lines, levels, peak=peak).eirp(radius, 0.0)
        assert stated.max() == pytest.approx(peak, abs=0.03)
        assert np.all(np.diff(stated) < 0.005)
        assert stated[0] == pytest.approx(peak, abs=0.03)


def test_extrapolation_outside_is_bounded():
    circles = {18.0 * np.sqrt((52 - level) / 12): float(level) for level in range(44, 52)}
    field = contours.fit(*cone(circles))
    outermost = max(circles)
    radius = np.linspace(outermost, 60.0, 5000)
    values = field.eirp(radius, 0.0)
    known = np.isfinite(values)
    assert values[known].min() >= 43.0
    assert np.all(np.diff(values[known]) < 0.0)
    last = radius[known].max()
    assert np.all(known[radius <= last])
    assert outermost < last <= outermost + field.reach_deg + 1e-6
    # The stated distance: one and a half times the gap between the two lowest levels.
    gap = outermost - sorted(circles)[-2]
    assert field.reach_deg == pytest.approx(1.5 * gap, rel=0.05)
    assert np.all(np.isnan(field.eirp([120.0, -170.0, 0.0], [0.0, 30.0, 80.0])))


def test_polygons_mean_the_same_as_lines():
    lines, levels = cut(elliptical, range(46, 52))
    areas = [shapely.Polygon(line) for line in lines]
    bands = [
        area.difference(areas[number + 1]) if number + 1 < len(areas) else area
        for number, area in enumerate(areas)
    ]
    longitude, latitude = np.linspace(-10, 35, 91)[None, :], np.linspace(33, 60, 60)[:, None]
    expected = contours.fit(lines, levels).eirp(longitude, latitude)
    assert np.isfinite(expected).sum() > 1000
    for drawn in (areas, bands):
        np.testing.assert_allclose(
            # The lattice of the fit follows from the lines and falls a little differently.
            contours.fit(drawn, levels).eirp(longitude, latitude),
            expected,
            atol=0.02,
        )


def test_open_lines_cut_by_the_edge_of_the_map():
    longitudes, latitudes = np.arange(-30.0, 13.0, 0.1), np.arange(40.0, 70.0, 0.1)
    lines, levels = cut(elliptical, range(42, 52), longitudes, latitudes)
    assert not all(line.is_closed for line in lines)
    field = contours.fit(lines, levels)
    longitude, latitude = np.arange(-29.9, 12.9, 0.2)[None, :], np.arange(40.1, 69.0, 0.2)[:, None]
    truth = elliptical(longitude, latitude)
    between = (truth > 42) & (truth < 51)
    error = (field.eirp(longitude, latitude) - truth)[between]
    assert np.sqrt(np.mean(error**2)) < 0.15
    assert np.abs(error).max() < 0.5


def test_a_hollow_is_kept():
    circles = {20: 47.0, 15: 48.0, 11: 49.0, 7: 49.0, 3.5: 48.0}
    lines, levels = cone(circles)
    field = contours.fit(lines, levels)
    assert 49.0 < float(field.eirp(9.0, 0.0)) <= 49.51
    assert 47.49 <= float(field.eirp(0.0, 0.0)) < 48.0


@pytest.mark.parametrize("turn", ["past 180", "jumping", "wrapped pieces"])
def test_across_the_antimeridian(turn):
    lines, levels = cut(elliptical, range(46, 52))
    shifted = [shapely.transform(line, lambda xy: xy + [170.0, 0.0]) for line in lines]
    if turn == "jumping":
        shifted = [
            shapely.transform(line, lambda xy: np.column_stack([(xy[:, 0] + 180) % 360 - 180, xy[:, 1]]))
            for line in shifted
        ]
    if turn == "wrapped pieces":
        west, east = shapely.box(0, -90, 180, 90), shapely.box(180, -90, 360, 90)
        shifted = [
            shapely.multilinestrings(
                [
                    *shapely.get_parts(line.intersection(west)),
                    *shapely.get_parts(
                        shapely.transform(line.intersection(east), lambda xy: xy - [360.0, 0.0])
                    ),
                ]
            )
            for line in shifted
        ]
    longitude, latitude = np.linspace(-10, 35, 91), np.linspace(33, 60, 91)
    expected = contours.fit(lines, levels).eirp(longitude, latitude)
    found = contours.fit(shifted, levels).eirp((longitude + 170 + 180) % 360 - 180, latitude)
    np.testing.assert_allclose(found, expected, atol=2e-3)


def square(size, middle=0.0):
    return shapely.box(middle - size, -size, middle + size, size)


@pytest.mark.parametrize(
    ("geometries", "levels", "message"),
    [
        (
            [square(9), square(6), square(3, 5.0)],
            [47, 48, 49],
            r"feature 2 \(48 dBW\) and feature 3 \(49 dBW\)",
        ),
        ([square(9).exterior, square(6).exterior, square(3, 5.0).exterior], [47, 48, 49], "meet near"),
        ([square(9), square(6), square(3)], [47, 46, 48], r"feature 2 \(46 dBW\) lies within feature 1"),
        ([square(9).exterior, square(6).exterior, square(3).exterior], [47, 46, 48], "levels out of order"),
        (
            [square(9).exterior, square(6).exterior, square(3).exterior],
            [47, 49, 48],
            "without a contour of 48",
        ),
        ([square(9), square(6)], [47, float("nan")], "feature 2: level nan is not a number"),
        ([square(9), shapely.Polygon([(0, 0), (1, 1), (2, 2)])], [47, 48], "feature 2.*encloses no area"),
        ([square(9), shapely.Polygon([(0, 0), (2, 2), (2, 0), (0, 3)])], [47, 48], "not a clean polygon"),
        (
            [square(9), shapely.box(4e5, 5e6, 5e5, 6e6)],
            [47, 48],
            r"feature 2.*not a longitude and a latitude",
        ),
        ([square(9), shapely.Point(0, 0)], [47, 48], "feature 2.*is a Point"),
        ([square(9), None], [47, 48], "feature 2.*no geometry"),
        ([square(9), square(6)], [47, 47], "at least two levels"),
    ],
)
def test_wrong_contours_name_the_feature(geometries, levels, message):
    with pytest.raises(InputError, match=message):
        contours.fit(geometries, levels)


def test_unclosed_lines_name_the_feature():
    circles, levels = cone({9: 47.0, 6: 48.0, 3: 49.0})
    for kept in (slice(None, -1), slice(None, -12)):
        broken = shapely.LineString(shapely.get_coordinates(circles[1])[kept])
        with pytest.raises(InputError, match=r"feature 2 \(48 dBW\) is not closed"):
            contours.fit([circles[0], broken, circles[2]], levels)
    half = shapely.LineString(shapely.get_coordinates(circles[1])[:120])
    with pytest.raises(InputError, match=r"feature 2 \(48 dBW\) ends inside the map"):
        contours.fit([circles[0], half, circles[2]], levels)


def test_peak_below_the_contours_is_refused():
    with pytest.raises(InputError, match=r"peak 48 dBW is not above the highest contour, 48 dBW"):
        contours.fit([square(9), square(6)], [47, 48], peak=48.0)


def test_field_is_the_same_for_grid_sites_and_point_and_survives_pickling():
    field = pickle.loads(pickle.dumps(fitted("elliptical")))
    longitude, latitude = np.linspace(-20, 40, 31), np.linspace(30, 60, 21)
    grid = field.eirp(longitude[None, :], latitude[:, None])
    sites = field.eirp(*(part.ravel() for part in np.meshgrid(longitude, latitude)))
    np.testing.assert_allclose(sites.reshape(grid.shape), grid, atol=1e-10)
    assert field.eirp(longitude[7], latitude[9]).shape == ()
    assert float(field.eirp(longitude[15], latitude[9])) == pytest.approx(grid[9, 15], abs=1e-10)
    assert np.isnan(field.eirp(np.nan, 46.0))
    assert np.isnan(field.eirp(12.0, np.nan))
