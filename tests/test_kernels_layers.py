"""Layers out of compiled loops against the plain numpy path, which is the reference, on both demos and beyond."""

from __future__ import annotations

import subprocess
import sys
from typing import Any

import numpy as np
import pytest

from geoskew.evaluate import available, evaluate
from geoskew.layers import REGISTRY
from geoskew.places import Places
from geoskew.region import Grid, Window
from geoskew.resources import demo_scenario
from geoskew.scenario import Scenario, load
from geoskew.situation import Inputs, prepare

pytest.importorskip("numba")

TOLERANCE = {"deg": 1e-4, "dB": 1e-4, "dBW": 1e-4, "km": 0.005, "percent": 1e-3}


@pytest.fixture(scope="module")
def cone() -> tuple[Scenario, Inputs]:
    scenario = load(demo_scenario("southern-cone"))
    return scenario, prepare(scenario)


@pytest.fixture(scope="module")
def islands() -> tuple[Scenario, Inputs]:
    scenario = load(demo_scenario("slot-change"))
    return scenario, prepare(scenario)


def changed(scenario: Scenario, part: str, **values: Any) -> Scenario:
    return scenario.model_copy(update={part: getattr(scenario, part).model_copy(update=values)})


def in_clear_sky(scenario: Scenario) -> Scenario:
    return scenario.model_copy(update={"weather": None})


def region(west: float, north: float, step: float, columns: int = 40, rows: int = 30) -> Places:
    return Grid("EPSG:4326", west, north, step, columns, rows).block(Window(0, 0, rows, columns))


def hold(scenario: Scenario, places: Places, inputs: Inputs, names: list[str] | None = None) -> None:
    """Both paths give the same layers, with values at the same places."""
    wanted = names or [name for name in available(scenario, sites=False) if not name.startswith("outage")]
    plain = evaluate(scenario, places, wanted, inputs=inputs)
    fast = evaluate(scenario, places, wanted, inputs=inputs, compiled=True)
    valued = 0
    for name in wanted:
        record, meant, given = REGISTRY[name], plain[name], fast[name]
        assert given.shape == meant.shape == places.shape
        if record.is_class:
            assert given.dtype == np.uint8
            assert (given == meant).all(), name
            valued += int((meant != 255).sum())
            continue
        assert (np.isnan(given) == np.isnan(meant)).all(), name
        known = ~np.isnan(meant)
        apart = np.abs(given[known].astype(np.float64) - meant[known])
        if record.period:
            apart = np.minimum(apart, record.period - apart)
        assert apart.max(initial=0.0) <= TOLERANCE[record.unit], (name, apart.max())
        valued += int(known.sum())
    assert valued > 0


REGIONS = {
    "the demo's region": region(-76.0, -17.0, 0.9, 26, 43),
    "the rim of visibility and beyond": region(-160.0, 80.0, 5.0, 38, 32),
    "a pole": region(-180.0, -80.0, 9.0, 40, 2),
    "around the sub-satellite point": region(-67.2, 1.0, 0.05),
    "one row": region(-70.0, -30.0, 0.1, 40, 1),
}


@pytest.mark.parametrize("places", REGIONS.values(), ids=list(REGIONS))
@pytest.mark.parametrize("weather", [True, False], ids=["rain", "clear"])
def test_same_slot(cone: tuple[Scenario, Inputs], places: Places, weather: bool) -> None:
    scenario, inputs = cone
    hold(scenario if weather else in_clear_sky(scenario), places, inputs)


@pytest.mark.parametrize("weather", [True, False], ids=["rain", "clear"])
def test_slots_that_differ_across_180(islands: tuple[Scenario, Inputs], weather: bool) -> None:
    scenario, inputs = islands
    places = region(166.0, -8.0, 0.6, 43, 27)
    hold(scenario if weather else in_clear_sky(scenario), places, inputs)


def test_slots_a_degree_and_more_apart(islands: tuple[Scenario, Inputs]) -> None:
    scenario, inputs = islands
    for longitude in (171.0, 174.5, -175.0):
        moved = in_clear_sky(changed(scenario, "incoming", longitude_deg=longitude, eirp_dbw=60.0, beams=()))
        hold(moved, region(166.0, -8.0, 0.6, 43, 27), inputs)


@pytest.mark.parametrize("tilt", [0.0, 20.999, 44.0, 69.0, -69.0, 89.0])
def test_any_turn(cone: tuple[Scenario, Inputs], tilt: float) -> None:
    """Gaps of polarisation from none to a right angle; margins from good to hopeless."""
    scenario, inputs = cone
    turned = in_clear_sky(changed(scenario, "incoming", tilt_deg=tilt))
    hold(turned, REGIONS["the demo's region"], inputs)
    hold(changed(turned, "decision", reserve_db=6.0), REGIONS["the demo's region"], inputs)


def test_projected_grid_and_outside_of_the_outline(cone: tuple[Scenario, Inputs]) -> None:
    scenario, inputs = cone
    longitude, latitude = np.meshgrid(np.linspace(-75.0, -54.0, 33), np.linspace(-18.0, -55.0, 27))
    longitude = longitude + 0.1 * latitude
    longitude[0, 0] = latitude[0, 0] = np.nan
    inside = (latitude > -50.0) & ~np.isnan(latitude)
    places = Places(longitude, latitude, np.full((1, 1), np.nan), inside)
    hold(in_clear_sky(scenario), places, inputs)


def test_what_the_loops_do_not_cover_comes_out_as_always(
    cone: tuple[Scenario, Inputs], islands: tuple[Scenario, Inputs]
) -> None:
    places = REGIONS["the demo's region"]
    scenario, inputs = in_clear_sky(cone[0]), cone[1]
    hold(changed(scenario, "decision", addition="phasor"), places, inputs)
    circular = tuple(one.model_copy(update={"polarisation": "L"}) for one in scenario.carriers_after)
    hold(scenario.model_copy(update={"carriers_after": circular}), places, inputs)
    crossed = tuple(
        one.model_copy(update={"polarisation": other})
        for one, other in zip(scenario.carriers_after, "HV", strict=True)
    )
    hold(scenario.model_copy(update={"carriers_after": crossed}), places, inputs)
    same_port = tuple(one.model_copy(update={"polarisation": "V"}) for one in scenario.carriers_before)
    other_port = tuple(one.model_copy(update={"polarisation": "H"}) for one in scenario.carriers_before)
    hold(
        scenario.model_copy(update={"carriers_before": same_port, "carriers_after": other_port}),
        places,
        inputs,
    )


def test_a_single_wanted_layer_needs_no_other(cone: tuple[Scenario, Inputs]) -> None:
    scenario, inputs = cone
    for name in ("azimuth_after", "skew_before", "seen_after", "mismatch_untouched", "turn_shared", "action"):
        hold(scenario, region(-76.0, -17.0, 0.9, 26, 43), inputs, [name])


SMALL = """
import sys
from geoskew.engine import pending_blocks
from geoskew.resources import demo_scenario
from geoskew.scenario import load
from geoskew.situation import prepare
from geoskew.region import Grid
import geoskew.study.core
scenario = load(demo_scenario("slot-change"))
grid = Grid("EPSG:4326", 166.0, -8.0, 0.6, 43, 27)
for _, make in pending_blocks(scenario, prepare(scenario), grid, ["margin_untouched", "action"]):
    make()
print("numba" in sys.modules)
"""


def test_a_small_grid_never_loads_the_compiler() -> None:
    done = subprocess.run([sys.executable, "-c", SMALL], capture_output=True, text=True, check=False)
    assert done.returncode == 0, done.stderr
    assert done.stdout.strip() == "False"


def test_a_large_grid_takes_the_loops(
    monkeypatch: pytest.MonkeyPatch, islands: tuple[Scenario, Inputs]
) -> None:
    from geoskew.engine import blocks

    scenario, inputs = islands
    grid = Grid("EPSG:4326", 166.0, -8.0, 0.6, 43, 27)
    taken = []

    def watched(*arguments: Any, compiled: bool, **more: Any) -> Any:
        taken.append(compiled)
        return evaluate(*arguments, compiled=compiled, **more)

    monkeypatch.setattr(blocks, "evaluate", watched)
    # All rows in one strip, so that each block is one call.
    monkeypatch.setattr(blocks, "STRIP_ROWS", 27)
    whole = Window(0, 0, 27, 43)
    _, plain = blocks.compute_block(scenario, inputs, grid, whole, ["skew_after", "action"])
    monkeypatch.setattr(blocks, "COMPILED_FROM_CELLS", 1)
    for given in (scenario, in_clear_sky(scenario)):
        _, fast = blocks.compute_block(given, inputs, grid, whole, ["skew_after", "action"])
        assert np.abs(fast["skew_after"] - plain["skew_after"]).max() < 1e-4
    assert taken == [False, True, True]


def test_without_numba_the_plain_path_runs_and_says_so(
    monkeypatch: pytest.MonkeyPatch, caplog: pytest.LogCaptureFixture
) -> None:
    from geoskew import kernels

    kernels.ready.cache_clear()
    monkeypatch.setitem(sys.modules, "numba", None)
    with caplog.at_level("WARNING"):
        assert not kernels.ready()
        assert not kernels.ready()
    kernels.ready.cache_clear()
    assert len(caplog.records) == 1
    assert "numba" in caplog.text
