"""A made-up field map for the tests: smooth invented layers over a region, invented sites, no physics."""

from __future__ import annotations

import json
from dataclasses import dataclass
from functools import cache
from pathlib import Path
from typing import Any

import numpy as np
import pandas as pd

import geoskew.catalogue  # noqa: F401  fills the registry, from which the tables take their units
from geoskew.layers import REGISTRY, Layer
from geoskew.outputs.fieldmap import (
    Basemap,
    ContourLine,
    GeometryFacts,
    MapContent,
    Overlay,
    PlaceName,
    Route,
    SatelliteFacts,
)

ACTIONS = ("leave", "preset", "turn-at-changeover", "re-aim", "upgrade", "no-sight")
CLASSES = tuple(enumerate(ACTIONS))


@dataclass(frozen=True)
class Column:
    """Name, unit and meaning of a column."""

    name: str
    unit: str
    meaning: str


def nothing(_: Any) -> Any:
    """Stand-in for a layer's function: a map never computes one."""
    raise AssertionError("a map does not compute layers")


def layer(name: str, unit: str, ramp: str, limits: tuple[float, float], **more: Any) -> Layer:
    """A layer's record."""
    return Layer(
        name=name,
        unit=unit,
        description=more.pop("description", name.replace("_", " ").capitalize()),
        kind=more.pop("kind", "continuous"),
        ramp=ramp,
        limits=limits,
        contour_step=1.0,
        compute=nothing,
        **more,
    )


MISMATCH = layer(
    "mismatch_untouched",
    "dB",
    "loss",
    (0.0, 6.0),
    description="Loss of the wanted carrier when no feed is touched",
)
ELEVATION = layer(
    "elevation_after", "deg", "level", (0.0, 90.0), description="Elevation of the new satellite"
)
SKEW = layer(
    "skew_after",
    "deg",
    "cycle",
    (-90.0, 90.0),
    kind="circular",
    period=180.0,
    description="Skew of the new satellite",
)
ACTION = layer(
    "action", "", "classes", (0.0, 5.0), kind="category", classes=CLASSES, description="What to do at a place"
)

GEOMETRY = GeometryFacts(
    SatelliteFacts("Meridian East 1", -66.2, 0.0, 21.0, (-64.0, -36.5)),
    SatelliteFacts("Meridian East 2", -66.2, 0.0, 0.0, (-64.0, -36.5)),
)
BOUNDS = (-76.0, -56.0, -53.0, -17.0)


def overlay(
    of: Layer,
    *,
    bounds: tuple[float, float, float, float] = BOUNDS,
    size: tuple[int, int] = (780, 460),
    rough: float = 0.0,
    seed: int = 3,
) -> Overlay:
    """Smooth values over the bounds, with a corner without value; `rough` adds noise, in the unit."""
    west, south, east, north = bounds
    rows, columns = size
    y, x = np.mgrid[0:rows, 0:columns]
    wave = (
        0.5
        + 0.25 * np.sin(x / columns * 7.0 + y / rows * 3.0)
        + 0.25 * np.cos(y / rows * 5.0 - x / columns * 2.0)
    )
    low, high = of.limits
    if of.is_class:
        values: Any = np.clip((wave * 6).astype(np.uint8), 0, 5)
        values[(x + y) < rows / 4] = 255
    else:
        values = low + wave * (high - low)
        values += rough * np.random.default_rng(seed).standard_normal(size)
        values[(x + y) < rows / 4] = np.nan
    return Overlay(
        of, values, "EPSG:4326", ((east - west) / columns, 0.0, west, 0.0, (south - north) / rows, north)
    )


def sites(
    count: int, *, seed: int = 5, bounds: tuple[float, float, float, float] = BOUNDS, extra: int = 4
) -> pd.DataFrame:
    """An assessed table of invented sites."""
    random = np.random.default_rng(seed)
    west, south, east, north = bounds
    action = random.choice(6, size=count, p=(0.3, 0.34, 0.16, 0.08, 0.08, 0.04))
    table = {
        "id": [f"S{i:05d}" for i in range(count)],
        "lat": np.round(random.uniform(south, north, count), 6),
        "lon": np.round(random.uniform(west, east, count), 6),
        "name": [f"Escuela rural {i}" for i in range(count)],
        "district": [f"Distrito {i % 23}" for i in range(count)],
        "weight": random.integers(5, 300, count).astype(str),
        "dish_m": random.choice(["0.9", "1.2", "1.8"], count),
    }
    numbers = {
        "azimuth_before": (0, 360),
        "azimuth_after": (0, 360),
        "elevation_before": (5, 60),
        "elevation_after": (5, 60),
        "range_before": (36000, 41000),
        "range_after": (36000, 41000),
        "skew_before": (-60, 60),
        "skew_after": (-60, 60),
        "seen_after": (-60, 60),
        "turn_shared": (-25, 25),
        "turn_realigned": (-25, 25),
        "window_low": (-40, -26),
        "window_high": (26, 45),
        "mismatch_untouched": (0, 3),
        "margin_before": (2, 8),
        "margin_untouched": (-4, 5),
        "margin_shared_before": (0, 6),
        "margin_shared_after": (0, 6),
        "margin_reversed": (-9, 2),
        "margin_realigned": (1, 8),
        "fail_probability": (0, 100),
    }
    for name, (low, high) in numbers.items():
        table[name] = random.uniform(low, high, count)
    table["window_low"][action == 2] = np.nan
    table["window_high"][action == 2] = np.nan
    table["action"] = np.asarray(ACTIONS, dtype=object)[action]
    for number in range(extra):
        table[f"remark {number}"] = [
            f"contact {random.integers(1000, 9999)} route {i % 60}" for i in range(count)
        ]
    return pd.DataFrame(table)


def contours(
    of: Layer, *, bounds: tuple[float, float, float, float] = BOUNDS, levels: int = 8
) -> list[ContourLine]:
    """Wavy lines from west to east."""
    west, south, east, north = bounds
    x = np.linspace(west, east, 300)
    out = []
    for number in range(levels):
        y = south + (number + 0.5) / levels * (north - south) + 0.7 * np.sin(x * 0.8 + number)
        out.append(ContourLine(of.name, number * 2.5 - 5, np.column_stack([x, y]), of.unit))
    return out


def routes(table: pd.DataFrame, *, crews: int = 2, days: int = 3, stops: int = 5) -> list[Route]:
    """Days on the road, made of the first sites in the table."""
    out, row = [], 0
    for crew in range(1, crews + 1):
        for day in range(1, days + 1):
            part = table.iloc[row : row + stops]
            row += stops
            if len(part) > 1:
                track = part[["lon", "lat"]].to_numpy(dtype=float)
                out.append(Route(f"crew {crew}", f"2027-05-{10 + day}", track, tuple(part["id"])))
    return out


def rings(file: Path, name: str) -> list[Any]:
    """Rings or lines of one object of a TopoJSON file as (N, 2) arrays."""
    topology = json.loads(file.read_text(encoding="utf-8"))
    scale, shift = np.array(topology["transform"]["scale"]), np.array(topology["transform"]["translate"])
    arcs = [np.cumsum(np.array(arc), axis=0) * scale + shift for arc in topology["arcs"]]

    def joined(indices: list[int]) -> Any:
        parts = [arcs[i] if i >= 0 else arcs[~i][::-1] for i in indices]
        return np.concatenate([part if at == 0 else part[1:] for at, part in enumerate(parts)])

    out = []
    for shape in topology["objects"][name]["geometries"]:
        polygons = (
            shape["arcs"]
            if shape["type"] == "MultiPolygon"
            else [shape["arcs"]]
            if shape["type"] == "Polygon"
            else []
        )
        out += [joined(ring) for polygon in polygons for ring in polygon]
    return out


@cache
def basemap() -> Basemap:
    """The bundled outlines where they are at hand, else a plain block of land."""
    file = Path(__file__).parents[1] / "data" / "natural-earth" / "countries-50m.json"
    if file.exists():
        return Basemap(
            rings(file, "land"), rings(file, "countries"), "Outlines: Natural Earth, public domain."
        )
    box = np.array([[-72.0, -54.0], [-54.0, -54.0], [-54.0, -18.0], [-72.0, -18.0], [-72.0, -54.0]])
    return Basemap([box], [], "Outlines: invented.")


def with_every_layer(table: pd.DataFrame) -> pd.DataFrame:
    """The same table with all layers that the registry knows, as a full run gives them."""
    random = np.random.default_rng(8)
    more = {}
    for name, of in REGISTRY.items():
        if name not in table.columns:
            spread = random.uniform(*of.limits, len(table))
            more[name] = np.round(spread) if of.is_class else spread
    return pd.concat([table, pd.DataFrame(more)], axis=1)


def content(count: int = 240, *, pictures: int = 3, every: bool = False, **changes: Any) -> MapContent:
    """A whole map; with `every`, its sites carry every layer."""
    table = sites(count) if count else None
    if every and table is not None:
        table = with_every_layer(table)
    given: dict[str, Any] = {
        "title": "Changeover of the lesson network",
        "geometry": GEOMETRY,
        "provenance": {
            "Scenario": "lessons.toml",
            "Made": "2027-03-01",
            "Version": "geoskew 0.1.0",
            "Margins judged": "in clear sky",
            "Models": "ITU-R P.618-14, P.676-12",
        },
        "cautions": [
            "Margins are judged without weather and terrain.",
            "A value of a cell stands for its middle.",
        ],
        "identity": "sample",
        "sites": table,
        "columns": [Column("dish_m", "m", "Diameter of the dish")],
        "overlays": [overlay(of) for of in (MISMATCH, ELEVATION, SKEW, ACTION)[:pictures]],
        "contours": contours(SKEW),
        "coverage": contours(layer("eirp", "dBW", "level", (40, 52)), levels=3),
        "routes": routes(table) if table is not None else [],
        "basemap": basemap(),
        "places": [
            PlaceName("Puerto Viejo", -70.9, -53.1),
            PlaceName("Valle Alto", -68.8, -32.9),
            PlaceName("Las Lomas", -58.4, -34.6),
        ],
    }
    return MapContent(**{**given, **changes})
