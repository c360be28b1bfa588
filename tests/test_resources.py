"""The base map decoder and the bundled files."""

from __future__ import annotations

import math

import numpy as np
import pyogrio
import pytest
import shapely

from geoskew import resources
from geoskew.errors import InputError

WORLD = (-180.0, -90.0, 180.0, 90.0)


def _on_land(longitude: float, latitude: float, bounds: tuple[float, float, float, float] = WORLD) -> bool:
    return bool(resources.outline("land", bounds).covers(shapely.Point(longitude, latitude)))


@pytest.mark.parametrize(
    ("longitude", "latitude", "expected"),
    [
        # Places on a map of the world; general knowledge, no source needed.
        (-64.2, -31.4, True),  # Córdoba, Argentina
        (-40.0, -40.0, False),  # South Atlantic
        (-175.0, 66.8, True),  # Chukotka, east of 180°
        (175.0, 67.5, True),  # Chukotka, west of 180°
        (0.0, -85.0, True),  # Antarctica
        (0.0, -60.0, False),
        (178.0, -17.8, True),  # Viti Levu
        (50.5, 42.0, False),  # Caspian Sea
    ],
)
def test_land_is_where_a_map_has_it(longitude: float, latitude: float, expected: bool) -> None:
    assert _on_land(longitude, latitude) is expected


def test_land_area_of_the_world() -> None:
    # Land without Antarctica: 148.94 − 14.2 million km² (The World Factbook, "World" and "Antarctica";
    # the latter with ice shelves, which the map has not). Small islands are missing and the ellipsoid
    # is taken as a sphere, hence 1 %.
    land = resources.outline("land", (-180.0, -60.0, 180.0, 90.0))
    radius = 6371.0072  # authalic radius of WGS 84, km
    # Lambert's cylindrical equal-area projection makes a planar area a true one.
    flat = shapely.transform(
        shapely.segmentize(land, 0.5),
        lambda xy: np.column_stack([np.radians(xy[:, 0]) * radius, radius * np.sin(np.radians(xy[:, 1]))]),
    )
    assert flat.area == pytest.approx(134.74e6, rel=0.01)


def test_decoder_agrees_with_gdal() -> None:
    # GDAL's TopoJSON driver reads the same file; Brazil does not touch 180°, so both must agree.
    path = resources.data_folder() / "natural-earth" / "countries-50m.json"
    countries = pyogrio.read_dataframe(path, layer="countries")
    brazil = shapely.make_valid(countries.loc[countries["name"] == "Brazil", "geometry"].iloc[0])
    bounds = (-53.5, -30.0, -36.0, -8.0)
    window = shapely.box(*bounds)
    ours = resources.outline("land", bounds).intersection(shapely.box(-45.0, -30.0, -36.0, -8.0))
    theirs = brazil.intersection(window).intersection(shapely.box(-45.0, -30.0, -36.0, -8.0))
    assert ours.symmetric_difference(theirs).area < 1e-6 * theirs.area


@pytest.mark.parametrize("kind", ["land", "coast", "borders"])
@pytest.mark.parametrize("bounds", [(170.0, -25.0, -170.0, 72.0), (170.0, -25.0, 190.0, 72.0)])
def test_across_180_runs_on_without_a_jump(
    kind: resources.OutlineKind, bounds: tuple[float, float, float, float]
) -> None:
    found = resources.outline(kind, bounds)
    assert found.is_valid
    if kind == "borders":
        assert found.is_empty  # no border between two countries there
        return
    west, _, east, _ = found.bounds
    assert west >= 170.0
    assert east <= 190.0
    # Nothing of the seam is left: no line runs along 180°, and a point on it inside land is inside.
    if kind == "coast":
        assert found.intersection(shapely.LineString([(180.0, -25.0), (180.0, 72.0)])).length == 0.0
    else:
        assert found.contains(shapely.Point(180.0, 67.5))
    halves = [
        resources.outline(kind, (170.0, -25.0, 180.0, 72.0)),
        resources.outline(kind, (-180.0, -25.0, -170.0, 72.0)),
    ]
    measure = "area" if kind == "land" else "length"
    assert math.isclose(sum(getattr(half, measure) for half in halves), getattr(found, measure), rel_tol=1e-9)


def test_borders_are_shared_by_two_countries() -> None:
    # The 49th parallel between Canada and the United States is a border and no coast.
    strip = (-115.0, 48.5, -105.0, 49.5)
    assert resources.outline("borders", strip).length == pytest.approx(10.0, rel=0.01)
    assert resources.outline("coast", strip).is_empty
    assert resources.outline("land", strip).area == pytest.approx(10.0)


@pytest.mark.parametrize("bounds", [(0.0, 10.0, 5.0, 10.0), (0.0, 20.0, 5.0, 10.0), (-700.0, 0.0, 0.0, 1.0)])
def test_bounds_without_area_are_refused(bounds: tuple[float, float, float, float]) -> None:
    with pytest.raises(InputError, match="south below north"):
        resources.outline("land", bounds)


def test_unknown_demonstration_lists_the_known() -> None:
    with pytest.raises(InputError, match="southern-cone"):
        resources.demo_scenario("nowhere")
