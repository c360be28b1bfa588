"""What the field map shows of a study."""

from __future__ import annotations

import os
from collections.abc import Sequence
from datetime import UTC, datetime
from pathlib import Path
from typing import TYPE_CHECKING, Any, Final

import numpy as np

from geoskew import __version__
from geoskew.errors import InputError
from geoskew.layers import REGISTRY
from geoskew.outputs import contours, fieldmap
from geoskew.outputs.fieldmap import (
    Basemap,
    ContourLine,
    GeometryFacts,
    MapContent,
    Overlay,
    PlaceName,
    Route,
    SatelliteFacts,
    Tiles,
)
from geoskew.region import Grid
from geoskew.resources import outline
from geoskew.situation.ports import is_linear, port_offset
from geoskew.study.facts import CAUTIONS
from geoskew.study.plan import judged_suffix
from geoskew.study.reasons import scenario_notes

if TYPE_CHECKING:
    import pandas as pd

    from geoskew.study.core import Study
    from geoskew.study.plan import Planned

# Cells along the longer side of an overlay: what a phone shows and carries.
LONG_SIDE: Final = 1200
# Room around the region or the sites, as a share of their extent and in degrees at the least.
ROOM_SHARE, ROOM_DEG = 0.5, 2.0
BASEMAP_THANKS: Final = "Made with Natural Earth, public domain"


def overlay_names(study: Study, names: Sequence[str] | None) -> tuple[str, ...]:
    """Layers to lay over the map: those asked for, or action, the deciding margin and the shared turn."""
    can = study.raster_names
    if names:
        for name in names:
            if name not in can:
                raise InputError(f"layer {name!r} cannot be shown; 'geoskew layers' lists what there is")
        return tuple(names)
    wanted = ("action", f"margin_untouched{judged_suffix(study.scenario.judged_in)}", "turn_shared")
    return tuple(name for name in wanted if name in can)


def contour_names(study: Study) -> tuple[str, ...]:
    """Layers whose isolines the map carries."""
    wanted = ("skew_after", f"margin_untouched{judged_suffix(study.scenario.judged_in)}", "eirp_after")
    return tuple(name for name in wanted if name in study.raster_names)


def map_content(
    study: Study,
    rasters: dict[str, Path],
    *,
    overlays: Sequence[str],
    planned: Planned | None,
    tiles: str | None = None,
) -> MapContent:
    """Gather everything that the map shows; `rasters` are GeoTIFFs by layer name."""
    scenario = study.scenario
    table = None
    columns: tuple[Any, ...] = ()
    if scenario.has_sites:
        table, columns = study.assessed.table, study.assessed.columns
    lines = [
        line for name in contour_names(study) if name in rasters for line in _isolines(name, rasters[name])
    ]
    return MapContent(
        title=scenario.title,
        geometry=_geometry(study),
        provenance={"Made": made_on(), **provenance(study)},
        cautions=CAUTIONS,
        judged_in="rain" if scenario.judged_in == "rain" else "clear",
        reserve_db=scenario.decision.reserve_db,
        identity=scenario.digest,
        sites=table,
        columns=columns,
        overlays=[_overlay(name, rasters[name]) for name in overlays if name in rasters],
        contours=[line for line in lines if not line.layer.startswith("eirp_")],
        coverage=[line for line in lines if line.layer.startswith("eirp_")],
        routes=[] if planned is None else _routes(planned),
        basemap=_basemap,
        places=[] if table is None else _districts(table),
        tiles=background(tiles),
    )


def background(tiles: str | None) -> Tiles | None:
    """The online background that the map may show, from its address.

    Raises
    ------
    InputError
        It is not the address of a tile server.
    """
    if tiles is None:
        return None
    chosen = Tiles(tiles, "")
    fieldmap.tile_origin(chosen)
    return chosen


def made_on() -> str:
    """Today's date in UTC, or the date that SOURCE_DATE_EPOCH stands for (reproducible-builds.org)."""
    given = os.environ.get("SOURCE_DATE_EPOCH", "")
    now = datetime.fromtimestamp(int(given), UTC) if given.isdigit() else datetime.now(UTC)
    return now.date().isoformat()


def provenance(study: Study) -> dict[str, str]:
    """Where the numbers come from, line by line; nothing in it changes from run to run."""
    scenario = study.scenario
    lines = {
        "Scenario": scenario.path.name,
        "Inputs (SHA-256)": scenario.digest,
        "Made by": f"geoskew {__version__}",
        "Satellite before": f"{scenario.outgoing.name}, {scenario.outgoing.longitude_deg:g}° east",
        "Satellite after": f"{scenario.incoming.name}, {scenario.incoming.longitude_deg:g}° east",
        "Decision": study.judged,
    }
    if notes := scenario_notes(scenario):
        lines["Assumed"] = "; ".join(notes)
    if scenario.changeover is not None:
        lines["Changeover"] = scenario.changeover.strftime("%Y-%m-%d %H:%M UTC")
    if scenario.weather is not None:
        from geoskew.weather import EDITIONS

        lines["Weather"] = "; ".join(EDITIONS)
    return lines


def _geometry(study: Study) -> GeometryFacts:
    scenario = study.scenario
    before, after = scenario.carriers_before, scenario.carriers_after
    offsets = port_offset(before, after, scenario.terminal.ports)
    return GeometryFacts(
        outgoing=_satellite(scenario.outgoing),
        incoming=_satellite(scenario.incoming),
        lowest_elevation=scenario.lowest_elevation_deg,
        port_offset=float(min(float(one) for one in offsets)),
        linear=all(is_linear(one) for one in (*before, *after)),
    )


def _satellite(satellite: Any) -> SatelliteFacts:
    aim = satellite.aim
    return SatelliteFacts(
        name=satellite.name,
        longitude=satellite.longitude_deg,
        latitude=satellite.latitude_deg,
        tilt=satellite.tilt_deg,
        aim=None if aim is None else (aim.lon_deg, aim.lat_deg),
    )


def _districts(table: pd.DataFrame) -> list[PlaceName]:
    """Names of the districts that the site list gives, each amid its sites."""
    if "district" not in table.columns:
        return []
    named = table[table["district"].fillna("").astype(str) != ""]
    names = []
    for district, sites in named.groupby("district", sort=True):
        longitudes = np.unwrap(sites["lon"].to_numpy(dtype=float), period=360.0)
        middle = float(np.mod(longitudes.mean() + 180.0, 360.0) - 180.0)
        names.append(PlaceName(str(district), middle, float(sites["lat"].mean())))
    return names


def _overlay(name: str, path: Path) -> Overlay:
    values, crs, transform = _thinned(name, path)
    return Overlay(REGISTRY[name], values, crs, transform)


def _thinned(name: str, path: Path) -> tuple[Any, str, tuple[float, float, float, float, float, float]]:
    """A raster with at most `LONG_SIDE` cells a side, nearest neighbour, NaN (or 255) for no value."""
    import rasterio
    from rasterio.enums import Resampling

    with rasterio.open(path) as source:
        shrink = max(1.0, max(source.height, source.width) / LONG_SIDE)
        shape = max(1, round(source.height / shrink)), max(1, round(source.width / shrink))
        values = source.read(1, out_shape=shape, resampling=Resampling.nearest)
        if not REGISTRY[name].is_class:
            values = values.astype(np.float64)
            if source.nodata is not None and not np.isnan(source.nodata):
                values[values == source.nodata] = np.nan
        a, b, c, d, e, f = tuple(source.transform)[:6]
        across, down = source.width / shape[1], source.height / shape[0]
        scaled = (a * across, b * down, c, d * across, e * down, f)
        return values, source.crs.to_string(), scaled


def _isolines(name: str, path: Path) -> list[ContourLine]:
    from pyproj import Transformer

    record = REGISTRY[name]
    values, crs, (a, _, c, _, e, f) = _thinned(name, path)
    x = c + a * (np.arange(values.shape[1]) + 0.5)
    y = f + e * (np.arange(values.shape[0]) + 0.5)
    if not np.any(np.isfinite(values)):
        return []
    levels, _ = contours.levels_of(values, record.contour_step, layer=record, widen=True)
    found = contours.isolines(values, x, y, levels, kind=record.kind, period=record.period)
    to_degrees = None if crs == "EPSG:4326" else Transformer.from_crs(crs, "EPSG:4326", always_xy=True)
    lines = []
    for line in found:
        for part in line.parts:
            points = np.asarray(part, dtype=np.float64)
            if to_degrees is not None:
                points = np.column_stack(to_degrees.transform(points[:, 0], points[:, 1]))
            lines.append(ContourLine(name, line.level, points, record.unit))
    return lines


def _routes(planned: Planned) -> list[Route]:
    """Each crew's day, from where it starts through its sites to where it spends the night."""
    routes = []
    for day in planned.plan.days.itertuples(index=False):
        stops = planned.plan.visits
        stops = stops[(stops["crew"] == day.crew) & (stops["day"] == day.day)].sort_values("order")
        points = [
            (day.start_lon, day.start_lat),
            *stops[["lon", "lat"]].itertuples(index=False, name=None),
            (day.end_lon, day.end_lat),
        ]
        track = np.asarray(points, dtype=np.float64)
        track[:, 0] = np.unwrap(track[:, 0], period=360.0)
        routes.append(Route(str(day.crew), str(day.day), track, tuple(stops["id"].astype(str))))
    return routes


def shown_bounds(study: Study) -> tuple[float, float, float, float]:
    """Region and sites together with some room; longitudes may run past 180."""
    longitudes: list[float] = []
    latitudes: list[float] = []
    if study.scenario.region is not None:
        west, south, east, north = grid_in_degrees(study.grid)
        longitudes, latitudes = [west, east], [south, north]
    if study.scenario.has_sites:
        places = study.sites.places
        middle = 0.5 * (longitudes[0] + longitudes[1]) if longitudes else float(places.longitude[0])
        near = middle + np.mod(places.longitude - middle + 180.0, 360.0) - 180.0
        longitudes += [float(near.min()), float(near.max())]
        latitudes += [float(places.latitude.min()), float(places.latitude.max())]
    width, height = max(longitudes) - min(longitudes), max(latitudes) - min(latitudes)
    beside, above = max(ROOM_DEG, ROOM_SHARE * width), max(ROOM_DEG, ROOM_SHARE * height)
    west, east = min(longitudes) - beside, max(longitudes) + beside
    if east - west > 360.0:
        west, east = -180.0, 180.0
    turns = 360.0 * np.floor((west + 180.0) / 360.0)
    return west - turns, max(-90.0, min(latitudes) - above), east - turns, min(90.0, max(latitudes) + above)


def grid_in_degrees(grid: Grid) -> tuple[float, float, float, float]:
    """West, south, east, north of a grid in degrees; east may run past 180."""
    if grid.is_geographic:
        return grid.bounds
    from pyproj import Transformer

    bounds = Transformer.from_crs(grid.crs, "EPSG:4326", always_xy=True).transform_bounds(*grid.bounds)
    west, south, east, north = (float(one) for one in bounds)
    return west, south, east + 360.0 * (east < west), north


def _basemap(bounds: tuple[float, float, float, float]) -> Basemap:
    import shapely

    def rings(geometry: Any) -> list[Any]:
        return [shapely.get_coordinates(part) for part in shapely.get_parts(geometry)]

    land = rings(shapely.get_rings(shapely.get_parts(outline("land", bounds))))
    return Basemap(land=land, borders=rings(outline("borders", bounds)), attribution=BASEMAP_THANKS)
