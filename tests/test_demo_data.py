"""The bundled scenarios: places on land, footprints well-formed, recipes that give the committed files."""

from __future__ import annotations

import csv
import hashlib
import importlib.util
import itertools
import json
import re
from collections import Counter
from pathlib import Path
from typing import Any

import numpy as np
import pytest
import shapely

from geoskew import resources
from geoskew.scenario import load

DATA = resources.data_folder()
SOUTHERN = DATA / "southern-cone"
FOOTPRINTS = ("eirp-velarin", "eirp-osmara")


def _usable(value: str) -> float | None:
    try:
        return float(value.replace(",", "."))
    except ValueError:
        return None


def _places(path: Path, delimiter: str, latitude: str, longitude: str) -> list[tuple[str, float, float]]:
    with path.open(encoding="utf-8", newline="") as stream:
        rows = list(csv.DictReader(stream, delimiter=delimiter))
    found = [(row["name"], _usable(row[longitude]), _usable(row[latitude])) for row in rows]
    return [(name, lon, lat) for name, lon, lat in found if lon is not None and lat is not None]


@pytest.mark.parametrize(
    ("path", "delimiter", "columns", "off_land"),
    [
        # Off land on purpose: one latitude out of range, one pair swapped.
        (SOUTHERN / "sites.csv", ",", ("lat", "lon"), 2),
        (DATA / "slot-change" / "posts.csv", ";", ("latitude", "longitude"), 0),
    ],
)
def test_places_are_on_land(path: Path, delimiter: str, columns: tuple[str, str], off_land: int) -> None:
    land = resources.outline("land", (-180.0, -60.0, 180.0, 0.0))
    places = _places(path, delimiter, *columns)
    off = [name for name, lon, lat in places if not land.covers(shapely.Point(lon, lat))]
    assert len(off) == off_land, off


def test_the_site_list_has_the_announced_rows() -> None:
    with (SOUTHERN / "sites.csv").open(encoding="utf-8", newline="") as stream:
        rows = list(csv.DictReader(stream))
    assert len(rows) == 250
    identifiers = Counter(row["id"] for row in rows)
    assert [name for name, count in identifiers.items() if count > 1] == ["AR-013"]
    assert identifiers[""] == 1


@pytest.mark.parametrize("name", ["southern-cone", "slot-change"])
def test_the_scenario_is_valid(name: str) -> None:
    scenario = load(resources.demo_scenario(name))
    assert scenario.changeover is not None
    assert scenario.slots_differ is (name == "slot-change")


@pytest.mark.parametrize("name", FOOTPRINTS)
def test_footprints_are_closed_and_nested(name: str) -> None:
    features = json.loads((SOUTHERN / f"{name}.geojson").read_text(encoding="utf-8"))["features"]
    levels = [feature["properties"]["dbw"] for feature in features]
    assert levels == list(range(levels[0], levels[0] + len(levels)))
    areas = [shapely.Polygon(feature["geometry"]["coordinates"]) for feature in features]
    assert all(area.is_valid for area in areas)
    for outer, inner in itertools.pairwise(areas):
        assert outer.contains_properly(inner)


def test_the_new_footprint_is_the_weaker_one_in_the_far_south() -> None:
    south = shapely.Point(-67.7, -54.5)
    old, new = (
        max(
            feature["properties"]["dbw"]
            for feature in json.loads((SOUTHERN / f"{name}.geojson").read_text(encoding="utf-8"))["features"]
            if shapely.Polygon(feature["geometry"]["coordinates"]).contains(south)
        )
        for name in FOOTPRINTS
    )
    assert new <= old - 2


def test_the_recipe_gives_the_committed_footprints() -> None:
    recipe = _module(DATA / "recipes" / "footprints.py")
    for name in FOOTPRINTS:
        committed = json.loads((SOUTHERN / f"{name}.geojson").read_text(encoding="utf-8"))["features"]
        made = recipe.contours(*recipe.BEAMS[name])
        assert [feature["properties"] for feature in made] == [feature["properties"] for feature in committed]
        for ours, theirs in zip(made, committed, strict=True):
            # Where the thinning keeps which point may depend on the last bit of a sine.
            apart = shapely.hausdorff_distance(
                shapely.LineString(ours["geometry"]["coordinates"]),
                shapely.LineString(theirs["geometry"]["coordinates"]),
                densify=0.05,
            )
            assert apart < 0.05


def _module(path: Path) -> Any:
    spec = importlib.util.spec_from_file_location(path.stem, path)
    assert spec is not None
    assert spec.loader is not None
    module = importlib.util.module_from_spec(spec)
    spec.loader.exec_module(module)
    return module


def test_the_base_map_is_the_one_described() -> None:
    content = (DATA / "natural-earth" / "countries-50m.json").read_bytes()
    described = re.search(r"`([0-9a-f]{64})`", (DATA / "README.md").read_text(encoding="utf-8"))
    assert described is not None
    assert hashlib.sha256(content).hexdigest() == described[1]
    assert np.less(len(content), 800_000)
