"""Compose a field map and put it under its name in one step."""

from __future__ import annotations

import re
from pathlib import Path
from typing import Any, Final

import numpy as np

from geoskew.errors import InputError
from geoskew.layers import REGISTRY, Layer
from geoskew.outputs.fieldmap.content import MapContent, SatelliteFacts, Tiles
from geoskew.outputs.fieldmap.extent import Extent, extent_of
from geoskew.outputs.fieldmap.lines import packed_basemap, packed_contours, packed_routes
from geoskew.outputs.fieldmap.overlays import packed_overlay
from geoskew.outputs.fieldmap.table import column_facts, packed_sites, packed_visits
from geoskew.outputs.files import writing
from geoskew.ramps import CLASS_COLOURS, CLASS_SHAPES, FLAG_COLOURS, RAMPS

# Above this a phone's mail program or its memory starts to mind.
LARGE_FILE: Final = 15_000_000


def write_fieldmap(path: Path | str, content: MapContent) -> int:
    """Write the self-contained map; an existing file under that name is replaced.

    Parameters
    ----------
    path : path-like
        The HTML file.
    content : MapContent
        Everything that the page shows. Equal content gives equal bytes.

    Returns
    -------
    int
        Size of the file in bytes.

    Raises
    ------
    InputError
        The address of the online background cannot be used.
    OutputError
        The file cannot be written; nothing half-written stays.
    """
    data = compose(content).encode("utf-8", "replace")
    with writing(path) as part:
        part.write_bytes(data)
    return len(data)


def size_remark(size: int) -> str:
    """What to say of a file of that many bytes; empty when there is nothing to say."""
    if size <= LARGE_FILE:
        return ""
    return (
        f"the map has {size / 1e6:.1f} MB, more than many mail programs carry: leave out passed-through "
        "columns or layers, or write one map a crew (--only crew=NAME)"
    )


def compose(content: MapContent) -> str:
    """The page as text."""
    from geoskew.outputs.fieldmap.shell import leaflet_notice, page

    extent = extent_of(content)
    blocks: dict[str, str] = {}
    pictures = []
    for number, overlay in enumerate(content.overlays):
        facts, blocks[f"grid-{number}"] = packed_overlay(overlay)
        pictures.append({**facts, "block": f"grid-{number}"})
    names: list[str] = []
    count = 0
    if content.sites is not None:
        count = len(content.sites)
        names = [str(name) for name in content.sites.columns]
        blocks["sites"], blocks["details"] = packed_sites(content.sites, judged_in=content.judged_in)
        blocks["visits"] = packed_visits(content.sites, content.routes)
    middle = extent.middle
    # A five-thousandth of the map's width is less than a pixel until one has zoomed in far.
    tolerance = (extent.east - extent.west) / 5000.0
    for name, lines in (("contours", content.contours), ("coverage", content.coverage)):
        if lines:
            blocks[name] = packed_contours(lines, middle=middle, tolerance=tolerance)
    if content.routes:
        blocks["routes"] = packed_routes(content.routes, middle=middle)
    basemap = content.basemap(extent.frame()) if callable(content.basemap) else content.basemap
    blocks["basemap"] = packed_basemap(basemap, extent.frame())
    meta = {**_words(content), **_look(content, extent), "sites": {"count": count}, "pictures": pictures}
    meta["columns"] = column_facts(content.columns, names)
    meta["thanks"] = {"basemap": basemap.attribution, "leaflet": leaflet_notice()}
    return page(
        title=content.title,
        middle=((extent.south + extent.north) / 2.0, middle),
        zoom=4,
        meta=meta,
        blocks=blocks,
        tile_origin=tile_origin(content.tiles),
    )


def _words(content: MapContent) -> dict[str, Any]:
    return {
        "title": content.title,
        "identity": content.identity or content.title,
        "provenance": [[str(key), str(value)] for key, value in content.provenance.items()],
        "cautions": [str(line) for line in content.cautions],
        "privacy": content.privacy_note,
        "judged": content.judged_in,
        "reserve": content.reserve_db,
        "geometry": {
            "outgoing": _satellite(content.geometry.outgoing),
            "incoming": _satellite(content.geometry.incoming),
            "lowest": content.geometry.lowest_elevation,
            "port": content.geometry.port_offset,
            "linear": content.geometry.linear,
        },
    }


def _look(content: MapContent, extent: Extent) -> dict[str, Any]:
    action = REGISTRY.get("action")
    names = dict(action.classes) if action is not None else {}
    shown = {overlay.layer.name: overlay.layer for overlay in content.overlays}
    for contour in content.contours:
        if contour.layer in REGISTRY:
            shown.setdefault(contour.layer, REGISTRY[contour.layer])
    tiles = None if content.tiles is None else {"url": content.tiles.url, "thanks": content.tiles.attribution}
    return {
        "layers": {name: {**_layer(layer), **_present(name, content)} for name, layer in shown.items()},
        "classes": [
            {"code": code, "name": names.get(code, str(code)), "colour": CLASS_COLOURS[code], "shape": shape}
            for code, shape in CLASS_SHAPES.items()
        ],
        "extent": [extent.west, extent.south, extent.east, extent.north],
        "frame": list(extent.frame()),
        "names": [[place.name, place.longitude, place.latitude] for place in content.places],
        "tiles": tiles,
    }


# Code of a cell without a class.
NO_CLASS: Final = 255


def _present(name: str, content: MapContent) -> dict[str, Any]:
    """What the picture of a layer really holds: codes of classes, and whether cells lack a value."""
    for overlay in content.overlays:
        if overlay.layer.name == name:
            values = np.asarray(overlay.values)
            if not overlay.layer.is_class:
                return {"present": [], "gaps": bool(np.isnan(values).any())}
            codes = [int(code) for code in np.unique(values[np.isfinite(values)])]
            return {
                "present": [code for code in codes if code != 255],
                "gaps": 255 in codes or not np.isfinite(values).all(),
            }
    return {"present": [], "gaps": True}


def _layer(layer: Layer) -> dict[str, Any]:
    """Record of a layer for the page: its words, limits and colours."""
    if layer.kind == "category":
        classes = [[code, name, CLASS_COLOURS.get(code, "#888888")] for code, name in layer.classes]
    elif layer.kind == "flag":
        words = dict(layer.classes) or {0: "no", 1: "yes"}
        classes = [[code, words.get(code, str(code)), colour] for code, colour in FLAG_COLOURS.items()]
    else:
        classes = []
    return {
        "unit": layer.unit,
        "description": layer.description,
        "kind": layer.kind,
        "period": layer.period,
        "ramp": [list(stop) for stop in RAMPS[layer.ramp]],
        "classes": classes,
    }


def _satellite(facts: SatelliteFacts) -> dict[str, Any]:
    return {
        "name": facts.name,
        "longitude": float(facts.longitude),
        "latitude": float(facts.latitude),
        "tilt": float(facts.tilt),
        "aim": None if facts.aim is None else [float(np.float64(value)) for value in facts.aim],
    }


def tile_origin(tiles: Tiles | None) -> str:
    """Scheme and host of an online background, empty where there is none.

    Raises
    ------
    InputError
        The address is not that of a tile server.
    """
    if tiles is None:
        return ""
    found = re.match(r"^(https://[A-Za-z0-9.{}-]+(?::\d+)?)/", tiles.url)
    if found is None or not all(f"{{{key}}}" in tiles.url for key in ("x", "y", "z")):
        raise InputError(
            f"tiles: {tiles.url!r} is not the address of a tile server; give "
            "https://HOST/PATH with {z}, {x} and {y} in it"
        )
    # Leaflet's {s} stands for a sub-domain; a policy writes that as a star, and only in front.
    return re.sub(r"^https://\{s\}", "https://*", found.group(1))
