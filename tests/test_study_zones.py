"""Zones of a region as files: every cell exactly once, within the tolerance, with what the one number costs."""

from __future__ import annotations

import json
import re
from math import ceil

import geopandas
import numpy as np
import pytest
import shapely

from geoskew.cli import main
from geoskew.evaluate import evaluate
from geoskew.places import Places
from geoskew.region import Window
from geoskew.resources import demo_scenario
from geoskew.study.core import Study
from geoskew.study.zones import WANTED

TOLERANCE = 2.5


@pytest.fixture(scope="module")
def plan(tmp_path_factory):
    """The bundled scenario on a coarser grid, without its sites."""
    source = demo_scenario()
    text = source.read_text(encoding="utf-8")
    text = re.sub(r"step_deg = .*", "step_deg = 0.5", text)
    text = re.sub(r"\[sites\]\nfile = .*\n", "", text)
    text = re.sub(r'file = "(eirp-[^"]+)"', lambda hit: f'file = "{source.parent.as_posix()}/{hit[1]}"', text)
    path = tmp_path_factory.mktemp("zones") / "plan.toml"
    path.write_text(text, encoding="utf-8")
    return path


def written(plan, name, *options):
    out = plan.parent / name
    assert main(["zones", str(plan), "--out", str(out), "--overwrite", "-q", *options]) == 0
    return out


def cells_of(study):
    grid = study.grid
    places = grid.block(Window(0, 0, grid.rows, grid.columns))
    return places, *np.broadcast_arrays(places.longitude, places.latitude)


@pytest.mark.parametrize("of", ["before", "after", "shared"])
def test_every_cell_once_and_within_the_tolerance(plan, of):
    frame = geopandas.read_file(written(plan, f"{of}.gpkg", "--tolerance", str(TOLERANCE), "--of", of))
    study = Study(plan, needs_sites=False)
    places, x, y = cells_of(study)
    own = evaluate(study.scenario, places, [WANTED[of]])[WANTED[of]]
    inside = np.stack([shapely.contains_xy(zone, x, y) for zone in frame.geometry])
    assert np.array_equal(inside.sum(axis=0) == 1, np.isfinite(own))
    assert inside.sum(axis=0).max() == 1
    setting = np.asarray(frame["setting_deg"])[np.argmax(inside, axis=0)]
    apart = np.abs(np.mod(own - setting + 90.0, 180.0) - 90.0)
    assert np.nanmax(apart) <= TOLERANCE + 1e-5  # settings are written to six decimals
    for number, zone in enumerate(frame.itertuples()):
        assert zone.cells == inside[number].sum()
        assert zone.worst_deviation_deg == pytest.approx(apart[inside[number]].max(), abs=2e-6)
    assert frame["percent"].sum() == pytest.approx(100.0, abs=1e-4)
    # A simple bound for a field of values close together: bands of 2t and the gaps between them.
    ordered = np.sort(own[np.isfinite(own)])
    bound = ceil(
        (np.ptp(ordered) + np.diff(ordered).max()) / (2.0 * TOLERANCE + np.diff(ordered).max()) - 1e-9
    )
    assert bound <= len(frame) <= bound + 1


@pytest.mark.parametrize(
    ("of", "layer"), [("before", "margin_before_rain"), ("after", "margin_untouched_rain")]
)
def test_cost_is_what_the_layers_say_of_a_feed_set_so(plan, of, layer):
    # Same slot: a feed set for the new satellite is an untouched one that stands there already.
    frame = geopandas.read_file(written(plan, f"cost-{of}.gpkg", "--tolerance", "4", "--of", of))
    study = Study(plan, needs_sites=False)
    places, x, y = cells_of(study)
    inside = np.stack([shapely.contains_xy(zone, x, y) for zone in frame.geometry])
    own = evaluate(study.scenario, places, [WANTED[of]])[WANTED[of]]
    zone = np.where(inside.any(axis=0), np.asarray(frame["setting_deg"])[np.argmax(inside, axis=0)], np.nan)

    def margin(setting):
        there = Places(places.longitude, places.latitude, places.height, columns={"setting_deg": setting})
        return evaluate(study.scenario, there, [layer])[layer]

    lost, left = margin(own) - margin(zone), margin(zone)
    weight = np.cos(np.deg2rad(y))
    for number, row in enumerate(frame.itertuples()):
        here = inside[number] & np.isfinite(lost)
        if not here.any():
            assert np.isnan(row.cost_worst_db)
            continue
        assert row.cost_worst_db == pytest.approx(lost[here].max(), abs=2e-6)
        assert row.cost_mean_db == pytest.approx(np.average(lost[here], weights=weight[here]), abs=2e-6)
        assert row.margin_least_db == pytest.approx(left[here].min(), abs=2e-6)


def test_districts_are_kept_whole(plan, capsys):
    boxes = {"west": (-76, -56, -73, -17), "narrow": (-66.5, -40, -65.5, -35), "broad": (-60, -35, -53, -17)}
    districts = geopandas.GeoDataFrame(
        {"name": list(boxes)}, geometry=[shapely.box(*box) for box in boxes.values()], crs="EPSG:4326"
    )
    path = plan.parent / "districts.geojson"
    districts.to_file(path)
    out = plan.parent / "districts.gpkg"
    options = [
        "--tolerance",
        "6",
        "--of",
        "after",
        "--districts",
        str(path),
        "--out",
        str(out),
        "--overwrite",
    ]
    assert main(["zones", str(plan), *options]) == 0
    told = capsys.readouterr().err
    frame = geopandas.read_file(out)
    study = Study(plan, needs_sites=False)
    places, x, y = cells_of(study)
    own = evaluate(study.scenario, places, ["setting_realigned"])["setting_realigned"]
    inside = np.stack([shapely.contains_xy(zone, x, y) for zone in frame.geometry])
    label = np.argmax(inside, axis=0)
    for name, box in boxes.items():
        here = shapely.contains_xy(shapely.box(*box), x, y) & np.isfinite(own)
        if np.ptp(own[here]) > 12.0:
            assert f"district {name} spans more than twice the tolerance" in told
        else:
            assert f"district {name}" not in told
            assert len(np.unique(label[here])) == 1
    assert "district broad" in told
    assert "district narrow" not in told


def test_geojson_across_the_date_line(tmp_path):
    path = tmp_path / "far.toml"
    path.write_text(
        "\n".join(
            [
                'title = "Across 180°"',
                "[outgoing]\nlongitude_deg = 176.0\neirp_dbw = 50.0\ntilt_deg = 12.0",
                "[incoming]\nlongitude_deg = 176.0\neirp_dbw = 50.0",
                '[carrier]\npolarisation = "V"\nfrequency_ghz = 11.9\nsymbol_rate_mbaud = 20.0\nrequired_es_n0_db = 6.0',
                "[region]\nbounds_deg = [170.0, -45.0, -170.0, -30.0]\nstep_deg = 0.5",
            ]
        ),
        encoding="utf-8",
    )
    out = tmp_path / "far.geojson"
    assert main(["zones", str(path), "--tolerance", "3", "--of", "before", "--out", str(out), "-q"]) == 0
    content = json.loads(out.read_text(encoding="utf-8"))
    frame = geopandas.read_file(out)
    assert frame.geometry.is_valid.all()
    west, south, east, north = frame.total_bounds
    assert (west, south, east, north) == (-180.0, -45.0, 180.0, -30.0)
    # 20° by 15° on both sides of the date line, once each.
    shapes = np.asarray(frame.geometry)
    assert shapely.area(shapes).sum() == pytest.approx(300.0, abs=1e-6)
    assert shapely.area(shapely.union_all(shapes)) == pytest.approx(300.0, abs=1e-6)
    for feature in content["features"]:
        for polygon in feature["geometry"]["coordinates"]:
            assert shapely.is_ccw(shapely.linearrings(polygon[0]))  # RFC 7946 §3.1.6
    assert set(content["features"][0]["properties"]) == set(frame.columns) - {"geometry"}


@pytest.mark.parametrize(
    ("options", "told"),
    [
        (["--tolerance", "0", "--out", "z.gpkg"], "--tolerance 0 is not above 0 and at most 90 degrees"),
        (["--tolerance", "0.001", "--out", "z.gpkg"], "give at least 0.045 degrees"),
        (["--tolerance", "3", "--out", "z.shp"], "zones are written as .gpkg or .geojson"),
        (["--tolerance", "3", "--out", "z.gpkg", "--districts", "nothing.gpkg"], "no such file"),
    ],
)
def test_wrong_input_is_said(plan, capsys, monkeypatch, options, told):
    monkeypatch.chdir(plan.parent)
    assert main(["zones", str(plan), *options]) == 2
    assert told in capsys.readouterr().err
    assert not list(plan.parent.glob("z.*"))
