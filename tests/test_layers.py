"""Every layer of the registry against one contract, for a point, a list and a grid."""

from __future__ import annotations

from functools import cache

import numpy as np
import pytest
from scenes import scenario

from geoskew import layers
from geoskew.errors import InputError
from geoskew.evaluate import NO_CLASS, available, chosen, evaluate
from geoskew.layers import REGISTRY, UNITS
from geoskew.places import Places
from geoskew.ramps import RAMPS

# Values exist only where a window of good settings does.
WITH_A_WINDOW = {"window_low", "window_high", "tolerance_low", "tolerance_high"}

# Least and greatest value that a layer may have, by the beginning of its name.
BOUNDS = {
    "azimuth": (0.0, 360.0),
    "elevation": (-90.0, 90.0),
    "range": (35_786.0, 48_543.0),
    "skew": (-90.0, 90.0),
    "seen": (-90.0, 90.0),
    "setting": (-90.0, 90.0),
    "turn": (-90.0, 90.0),
    "window": (-270.0, 270.0),
    "tolerance": (0.0, 180.0),
    "spread": (0.0, 45.0),
    "mismatch": (0.0, 40.0),
    "discrimination": (-40.0, 60.0),
    "eirp": (30.0, 75.0),
    "rain": (0.0, 150.0),
    "cn": (-60.0, 40.0),
    "margin": (-200.0, 40.0),
    "fail": (0.0, 100.0),
    "outage": (0.0, 8766.0),
    "action": (0.0, 5.0),
    "below": (0.0, 1.0),
}

# Latitudes and longitudes from which both, one or none of the satellites is above the lowest elevation;
# 180° is crossed, the equator, a pole and a sub-satellite point are among them.
LATITUDE = np.array([-78.0, -54.3, -31.0, 0.0, 12.5, 44.0, 90.0])
LONGITUDE = np.array([-185.0, -140.0, -95.5, -66.2, -58.0, -20.0, 3.0, 40.0])


@cache
def scene(kind: str):
    changes = {
        "plain": {},
        "slots": {"incoming": {"longitude_deg": -60.5, "latitude_deg": 1.2}},
        "weather": {"weather": {"availability_percent": 99.7}, "incoming": {"longitude_deg": -67.0}},
        "phasors": {"decision": {"addition": "phasor"}, "incoming": {"longitude_deg": -66.9}},
        "several": {
            "carrier": [
                {**CARRIER, "name": "one", "polarisation": "V"},
                {
                    **CARRIER,
                    "name": "two",
                    "polarisation": "H",
                    "uplink_cn_db": 22.0,
                    "required_es_n0_db": 4.0,
                },
            ],
            "neighbour": [{"longitude_deg": -63.2, "eirp_dbw": 49.0, "polarisation": "H", "name": "near"}],
            "terminal": {"pointing_error_deg": 0.2},
        },
        "spread": {"incoming": {"eirp_spread_db": 0.5, "longitude_deg": -64.0}},
    }
    return scenario(**changes[kind])


CARRIER = {"frequency_ghz": 11.95, "symbol_rate_mbaud": 27.5, "required_es_n0_db": 7.9}
SCENES = ("plain", "slots", "weather", "phasors", "several", "spread")


@cache
def grid_values(kind: str):
    return evaluate(scene(kind), Places.of(LONGITUDE[None, :], LATITUDE[:, None]))


@cache
def list_values(kind: str):
    longitude, latitude = np.meshgrid(LONGITUDE, LATITUDE)
    return evaluate(scene(kind), Places.of(longitude.ravel(), latitude.ravel()))


def missing(values):
    return values == NO_CLASS if values.dtype == np.uint8 else np.isnan(values)


def assert_same(name, one, other, exact=False):
    """Compare values of one layer; settings are found to a tolerance by a search over all places at once."""
    assert np.array_equal(missing(one), missing(other)), name
    record = REGISTRY[name]
    if record.is_class:
        assert np.array_equal(one, other), name
        return
    here, there = one[~missing(one)], other[~missing(other)]
    apart = here - there
    if record.kind == "circular":
        apart = np.mod(apart + 0.5 * record.period, record.period) - 0.5 * record.period
    np.testing.assert_allclose(apart, 0.0, atol=2e-5 * max(1.0, np.abs(here).max(initial=0.0)), err_msg=name)


@pytest.mark.parametrize("name", REGISTRY)
def test_record(name):
    record = REGISTRY[name]
    assert record.name == name
    assert record.unit in UNITS
    assert record.ramp in RAMPS
    assert record.limits[0] < record.limits[1]
    assert record.contour_step >= 0.0
    assert len(record.description) > 10
    assert not record.description.endswith(".")
    assert record.of <= {"before", "after"}
    assert record.needs <= {"weather", "terrain"}
    assert name.split("_")[0] in BOUNDS or record.needs == {"terrain"}
    if record.kind == "category":
        assert len(record.classes) > 1
    if record.unit:
        assert record.title.endswith(f"({record.unit})")


def test_a_layer_is_registered_once():
    with pytest.raises(RuntimeError, match="registered twice"):
        layers.layer(unit="deg", description="Skew again", ramp="signed", limits=(-1.0, 1.0))(
            REGISTRY["skew_before"].compute
        )


@pytest.mark.parametrize(
    ("changes", "message"),
    [
        ({"ramp": "rainbow"}, "ramp 'rainbow'"),
        ({"unit": "feet"}, "unit 'feet'"),
        ({"kind": "circular"}, "period"),
        ({"period": 180.0}, "period"),
    ],
)
def test_wrong_records_are_refused(changes, message):
    keys = {"unit": "deg", "description": "Nothing to see", "ramp": "signed", "limits": (-1.0, 1.0)}

    def never_registered(situation):
        raise AssertionError(situation)

    with pytest.raises(RuntimeError, match=message):
        layers.layer(**{**keys, **changes})(never_registered)
    assert "never_registered" not in REGISTRY


def test_every_layer_of_the_registry_is_swept():
    swept = set().union(*(available(scene(kind)) for kind in SCENES))
    rest = {name for name in REGISTRY if name not in swept}
    assert all("terrain" in REGISTRY[name].needs for name in rest)


@pytest.mark.parametrize("kind", SCENES)
def test_shapes_and_types(kind):
    for places in (Places.of(-60.0, -30.0), Places.of([-60.0, -61.0, 100.0], [-30.0, -31.0, 10.0])):
        for name, values in evaluate(scene(kind), places).items():
            assert values.shape == places.shape, name
            assert values.dtype == (np.uint8 if REGISTRY[name].is_class else np.float64), name
    for name, values in grid_values(kind).items():
        assert values.shape == (LATITUDE.size, LONGITUDE.size), name


@pytest.mark.parametrize("kind", SCENES)
def test_values_exist_exactly_where_the_satellites_serve(kind):
    values = grid_values(kind)
    lowest = scene(kind).lowest_elevation_deg
    serves = {moment: values[f"elevation_{moment}"] >= lowest for moment in ("before", "after")}
    assert serves["before"].any()
    assert not serves["before"].all()
    assert not missing(values["action"]).any()
    for name, array in values.items():
        wanted = np.logical_and.reduce(
            [np.ones_like(serves["before"]), *(serves[one] for one in REGISTRY[name].of)]
        )
        gone = missing(array)
        assert gone[~wanted].all(), name
        if name not in WITH_A_WINDOW:
            assert not gone[wanted].any(), name
        assert np.all(np.isfinite(array[~gone])), name


def test_what_each_layer_needs():
    # Geometry and the action keep their values below the lowest elevation; the policies need both satellites.
    needs = {name: set(record.of) for name, record in REGISTRY.items()}
    for moment in ("before", "after"):
        for quantity in ("azimuth", "elevation", "range"):
            assert needs[f"{quantity}_{moment}"] == set()
        for quantity in ("skew", "eirp", "rain", "cn", "below_reserve"):
            assert needs[f"{quantity}_{moment}"] == {moment}
    assert needs["action"] == set()
    assert needs["margin_before"] == {"before"}
    assert needs["margin_realigned"] == {"after"}
    assert needs["setting_realigned"] == {"after"}
    both = [
        *("seen_after", "setting_shared", "turn_shared", "turn_realigned", "window_low", "window_high"),
        *(name for name in needs if name.startswith(("mismatch_", "discrimination_", "margin_shared"))),
        *("margin_untouched", "margin_reversed", "fail_probability"),
    ]
    assert all(needs[name] == {"before", "after"} for name in both)


@pytest.mark.parametrize("kind", SCENES)
def test_values_are_within_bounds(kind):
    for name, array in grid_values(kind).items():
        low, high = BOUNDS[name.split("_")[0]]
        there = array[~missing(array)].astype(float)
        assert np.all((there >= low) & (there <= high)), (name, there.min(), there.max())
        if REGISTRY[name].kind == "circular" and REGISTRY[name].period == 180.0:
            assert np.all(there > -90.0), name
        if name.startswith("azimuth"):
            assert np.all(there < 360.0), name


@pytest.mark.parametrize("kind", SCENES)
def test_grid_cell_equals_site_row(kind):
    rows = list_values(kind)
    for name, cells in grid_values(kind).items():
        assert_same(name, cells.ravel(), rows[name])


@pytest.mark.parametrize("kind", SCENES)
def test_list_equals_points(kind):
    rows = list_values(kind)
    longitude, latitude = (array.ravel() for array in np.meshgrid(LONGITUDE, LATITUDE))
    for index in (3, 19, 20, 35, 37, 51):
        alone = evaluate(scene(kind), Places.of(longitude[index], latitude[index]))
        for name, value in alone.items():
            assert_same(name, rows[name][index : index + 1], value.reshape(1))


@pytest.mark.parametrize("kind", SCENES)
def test_order_of_sites_does_not_matter(kind):
    rows = list_values(kind)
    longitude, latitude = (array.ravel() for array in np.meshgrid(LONGITUDE, LATITUDE))
    order = np.random.default_rng(1).permutation(longitude.size)
    mixed = evaluate(scene(kind), Places.of(longitude[order], latitude[order]))
    for name, values in mixed.items():
        assert_same(name, rows[name][order], values)


def test_longitudes_a_turn_apart_are_the_same_place():
    names = ("skew_before", "margin_untouched", "turn_shared", "azimuth_after", "action")
    here = evaluate(scene("slots"), Places.of([-60.0, -20.0, -95.5], [-30.0, 44.0, 0.0]), names)
    round_the_world = evaluate(scene("slots"), Places.of([300.0, 340.0, 264.5], [-30.0, 44.0, 0.0]), names)
    for name in names:
        assert_same(name, here[name], round_the_world[name])


def test_outside_the_outline_nothing_has_a_value():
    inside = np.array([True, False, True])
    values = evaluate(scene("plain"), Places.of([-60.0, -60.0, 100.0], [-30.0, -30.0, -30.0], inside=inside))
    for name, array in values.items():
        assert missing(array)[1], name
    assert not missing(values["azimuth_before"])[2]
    assert not missing(values["action"])[2]
    assert not any(missing(array)[0] for array in values.values())


def test_unknown_and_missing_layers():
    with pytest.raises(InputError, match="did you mean skew_before"):
        chosen(scene("plain"), ["skew_befor"])
    with pytest.raises(InputError, match=r"needs \[weather\]"):
        chosen(scene("plain"), ["rain_before"])
    sites_only = next(
        name for name, record in REGISTRY.items() if record.where == "sites" and not record.needs
    )
    with pytest.raises(InputError, match="site lists only"):
        chosen(scene("plain"), [sites_only], sites=False)
    assert chosen(scene("plain"), ["skew_after", "skew_after"]) == ("skew_after",)
    assert chosen(scene("plain"), None) == available(scene("plain"))
