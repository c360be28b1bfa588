"""Compiled loops give what the plain formulas give; numpy and these formulas are the reference here.

The plain formulas themselves are tested against outside authorities in test_geometry and test_polarisation.
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
import pytest
from numpy.typing import NDArray

from geoskew import geometry, polarisation
from geoskew.angles import fold
from geoskew.geometry import Array

pytest.importorskip("numba")

from geoskew.kernels import elementary  # after the check above
from geoskew.kernels.compiling import compiled
from geoskew.kernels.sights import NOT_WANTED, NOT_WANTED_SINGLE, ground, look, look_across

TOLERANCE_DEG = 1e-4
RANDOM = np.random.default_rng(7)


class Satellite(NamedTuple):
    longitude: float
    latitude: float
    tilt: float
    aim: tuple[float, float] | None

    @property
    def position(self) -> Array:
        return geometry.satellite_position(self.longitude, self.latitude)

    @property
    def beam(self) -> polarisation.BeamFrame:
        return polarisation.beam_frame(self.position, self.aim)

    @property
    def frame(self) -> Array:
        angle = np.deg2rad(self.tilt)
        return np.array([np.cos(angle) * self.beam.top - np.sin(angle) * self.beam.right, self.beam.axis])


AMERICA = (Satellite(-66.2, 0.0, 21.0, (-64.0, -36.5)), Satellite(-66.2, 0.0, 0.0, (-62.5, -31.0)))
PACIFIC = (Satellite(169.8, 0.0, -5.5, (178.0, -17.0)), Satellite(169.2, 0.0, 2.5, (178.0, -17.0)))
INCLINED = (Satellite(10.0, 1.5, 3.0, None), Satellite(13.0, 0.0, -89.0, None))


def grid(west: float, south: float, east: float, north: float) -> tuple[Array, Array, Array]:
    return (
        np.linspace(west, east, 61)[np.newaxis, :],
        np.linspace(north, south, 47)[:, np.newaxis],
        np.zeros((1, 1)),
    )


def scattered(height: bool) -> tuple[Array, Array, Array]:
    longitude = RANDOM.uniform(-180.0, 180.0, (23, 57))
    latitude = RANDOM.uniform(-90.0, 90.0, (23, 57))
    return longitude, latitude, RANDOM.uniform(-400.0, 8000.0, (23, 57)) if height else np.zeros((1, 1))


CASES = {
    "region of the first demo": (AMERICA, grid(-76.0, -56.0, -53.0, -17.0)),
    "region of the second demo, across 180": (PACIFIC, grid(166.0, -24.0, 192.0, -8.0)),
    "the whole Earth, poles and below the horizon": (AMERICA, grid(-180.0, -90.0, 180.0, 90.0)),
    "around and at the sub-satellite point": (AMERICA, grid(-66.2 - 3e-6, -2e-6, -66.2 + 3e-6, 2e-6)),
    "around the sub-satellite point": (PACIFIC, grid(168.8, -1.0, 170.8, 1.0)),
    "inclined, wide slots": (INCLINED, grid(-20.0, -60.0, 40.0, 60.0)),
    "scattered places": (INCLINED, scattered(False)),
    "scattered places with heights": (AMERICA, scattered(True)),
}


@pytest.fixture(params=CASES.values(), ids=list(CASES))
def case(request: pytest.FixtureRequest) -> tuple[tuple[Satellite, Satellite], tuple[Array, Array, Array]]:
    return request.param  # type: ignore[no-any-return]


def turned(first: NDArray[np.floating], second: Array, period: float) -> float:
    """Largest difference of two angles that close on themselves."""
    return float(np.abs(np.mod(first - second + period / 2.0, period) - period / 2.0).max())


def test_look(case: tuple[tuple[Satellite, Satellite], tuple[Array, Array, Array]]) -> None:
    for satellite in case[0]:
        longitude, latitude, height = case[1]
        shape = np.broadcast_shapes(longitude.shape, latitude.shape)
        azimuth, elevation, km, degrees = np.empty((4, *shape), dtype=np.float32)
        distance, sine, skew = np.empty((3, *shape))
        look(
            *ground(longitude, latitude, height),
            satellite.position,
            satellite.frame,
            azimuth,
            elevation,
            km,
            degrees,
            distance,
            sine,
            skew,
        )
        sight = geometry.line_of_sight(longitude, latitude, height, satellite.position)
        meant = polarisation.skew(satellite.beam, satellite.tilt, sight.direction, longitude, latitude)
        # Within a metre of the sub-satellite point an azimuth is a matter of rounding.
        level = np.hypot(sight.direction.east, sight.direction.north) * sight.range_m
        steady = (level > 10.0) | geometry.at_zenith(sight.direction)
        assert turned(azimuth[steady], geometry.azimuth(sight.direction)[steady], 360.0) < TOLERANCE_DEG
        assert azimuth.min() >= 0.0
        assert azimuth.max() < 360.0
        assert np.abs(elevation - geometry.elevation(sight.direction)).max() < TOLERANCE_DEG
        assert np.abs(distance - sight.range_m).max() < 1e-3
        assert np.abs(km - sight.range_m / 1000.0).max() < 0.005
        assert np.abs(sine - sight.direction.up).max() < 1e-12
        for given in (np.rad2deg(skew), degrees):
            assert turned(given[steady], meant[steady], 180.0) < TOLERANCE_DEG
            assert given.min() > -90.0
            assert given.max() <= 90.0


def test_look_across(case: tuple[tuple[Satellite, Satellite], tuple[Array, Array, Array]]) -> None:
    dish, other = case[0]
    longitude, latitude, height = case[1]
    seen, apart = np.empty((2, *np.broadcast_shapes(longitude.shape, latitude.shape)))
    tables = ground(longitude, latitude, height)
    look_across(*tables, dish.position, other.position, other.frame, seen, apart)
    here = geometry.line_of_sight(longitude, latitude, height, dish.position)
    there = geometry.line_of_sight(longitude, latitude, height, other.position)
    arriving = polarisation.vertical_axis(other.beam, other.tilt, there.direction, longitude, latitude)
    meant = polarisation.seen_in_dish(arriving, there.direction, here.direction)
    level = np.hypot(here.direction.east, here.direction.north) * here.range_m
    steady = (level > 10.0) | geometry.at_zenith(here.direction)
    assert turned(np.rad2deg(seen)[steady], meant[steady], 180.0) < TOLERANCE_DEG
    assert np.abs(np.rad2deg(apart) - geometry.separation(here.direction, there.direction)).max() < 1e-8


def test_only_what_is_wanted_is_touched() -> None:
    longitude, latitude, height = grid(-76.0, -56.0, -53.0, -17.0)
    azimuth = np.empty((47, 61), dtype=np.float32)
    rest = (NOT_WANTED_SINGLE,) * 3 + (NOT_WANTED,) * 3
    look(*ground(longitude, latitude, height), AMERICA[0].position, AMERICA[0].frame, azimuth, *rest)
    sight = geometry.line_of_sight(longitude, latitude, height, AMERICA[0].position)
    assert turned(azimuth, geometry.azimuth(sight.direction), 360.0) < TOLERANCE_DEG
    assert (NOT_WANTED.size, NOT_WANTED_SINGLE.size) == (0, 0)


@compiled
def each(function, x, out):  # type: ignore[no-untyped-def]
    for i in range(x.size):
        out[i] = function(x[i])


@compiled
def each_of_two(function, y, x, out):  # type: ignore[no-untyped-def]
    for i in range(x.size):
        out[i] = function(y[i], x[i])


QUARTER = RANDOM.uniform(-np.pi / 2.0, np.pi / 2.0, 10_001)


@pytest.mark.parametrize(
    ("function", "reference", "x", "relative", "absolute"),
    [
        (elementary.sine, np.sin, QUARTER, 0.0, 1e-14),
        (elementary.cosine, np.cos, QUARTER, 0.0, 1e-13),
        (elementary.arctan_unit, np.arctan, RANDOM.uniform(0.0, 1.0, 10_001), 0.0, 1e-10),
        (elementary.power_of_two, np.exp2, RANDOM.uniform(-90.0, 90.0, 10_001), 1e-11, 0.0),
        (elementary.logarithm, np.log, np.exp(RANDOM.uniform(-90.0, 90.0, 10_001)), 0.0, 1e-11),
        (elementary.decibels, lambda x: 10.0 * np.log10(x), RANDOM.uniform(1e-9, 1e3, 10_001), 0.0, 1e-10),
        (elementary.ratio, lambda x: 10.0 ** (x / 10.0), RANDOM.uniform(-90.0, 90.0, 10_001), 1e-11, 0.0),
    ],
    ids=lambda value: getattr(value, "__name__", ""),
)
def test_elementary_functions(
    function: object, reference: object, x: Array, relative: float, absolute: float
) -> None:
    out = np.empty_like(x)
    each(function, x, out)
    np.testing.assert_allclose(out, reference(x), rtol=relative, atol=absolute)  # type: ignore[operator]


def test_arc_tangents() -> None:
    y, x = RANDOM.normal(size=(2, 10_001))
    y[:6], x[:6] = (0.0, 1.0, -1.0, 0.0, 0.0, 1.0), (0.0, 0.0, 0.0, 1.0, -1.0, 1.0)
    out = np.empty_like(x)
    each_of_two(elementary.arctan_full, y, x, out)
    np.testing.assert_allclose(out, np.arctan2(y, x), atol=1e-10)
    each_of_two(elementary.arctan_ratio, y, x, out)
    np.testing.assert_allclose(fold(np.rad2deg(out)), fold(np.rad2deg(np.arctan2(y, x))), atol=1e-8)
    single = np.empty_like(x)
    each_of_two(elementary.arctan_ratio_single, y.astype(np.float32), x.astype(np.float32), single)
    np.testing.assert_allclose(single, out, atol=5e-7)


@pytest.mark.parametrize(
    "function", [elementary.power_of_two, elementary.logarithm, elementary.decibels, elementary.ratio]
)
def test_no_value_stays_no_value(function: object) -> None:
    out = np.zeros(9)
    each(function, np.full(9, np.nan), out)
    assert np.isnan(out).all()
