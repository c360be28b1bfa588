"""The field map as a file: what it holds, what it never holds, how large it is, where its pictures lie."""

from __future__ import annotations

import base64
import hashlib
import json
import re
import struct
import subprocess
from collections.abc import Callable
from dataclasses import replace
from pathlib import Path
from typing import Any
from urllib.parse import urlparse

import fieldmap_sample as sample
import numpy as np
import pytest

from geoskew.errors import InputError, OutputError
from geoskew.outputs.fieldmap import (
    Basemap,
    ContourLine,
    Overlay,
    PlaceName,
    Route,
    SatelliteFacts,
    Tiles,
    blurred,
    compose,
    only,
    size_remark,
    write_fieldmap,
)
from geoskew.outputs.fieldmap.blocks import inert_json, pack
from geoskew.outputs.fieldmap.lines import unrolled
from geoskew.outputs.fieldmap.overlays import (
    MercatorGrid,
    delta_coded,
    mercator_y,
    shown_limits,
    to_mercator,
)
from geoskew.outputs.fieldmap.quantise import quantise
from geoskew.outputs.fieldmap.table import packed_sites

ASSETS = Path(sample.__file__).parents[1] / "geoskew" / "outputs" / "fieldmap" / "assets"

# Texts that broke pages or ran code when they went through templates, scripts or markup.
HOSTILE = (
    "{{7*7}}",
    "{{ cycler.__init__.__globals__.os.system('touch {mark}') }}",
    "{% raise %}",
    "{# lost",
    "{{ x",
    "</script><img src=x onerror=alert(1)>",
    "<img src=x onerror=alert(1)>",
    "<!--<script>",
    "${alert(1)}",
    "`${alert(1)}`",
    "\\\\`alert(1)`",
    "'\"><svg onload=alert(1)>",
    "]]></title><script>alert(1)</script>",
    "\u202eright to left\u202c",
    "\u2028line\u2029end",
    "\U0001f4e1\U0001f3eb emoji",
    "N" * 10_000,
    "=cmd|'/c calc'!A0",
    'a,b;c\t"d"\r\nnext',
)


def unpacked(text: str) -> tuple[dict[str, Any], dict[str, np.ndarray[Any, Any]]]:
    """Header and arrays of a packed block, read with the standard library's own gzip."""
    import gzip

    raw = gzip.decompress(base64.b64decode(text))
    (length,) = struct.unpack("<I", raw[:4])
    head = json.loads(raw[4 : 4 + length])
    arrays, at = {}, 4 + length
    for part in head["parts"]:
        size = part["width"] * part["count"]
        planes = np.frombuffer(raw[at : at + size], np.uint8).reshape(part["width"], part["count"])
        weights = 256 ** np.arange(part["width"], dtype=np.int64)
        arrays[part["name"]] = (planes.astype(np.int64) * weights[:, None]).sum(axis=0)
        at += size
    assert at == len(raw)
    return head, arrays


def block(page: str, name: str) -> str:
    """Text of one inert block of a page."""
    found = re.search(rf'<script type="[a-z/]+" id="data-{name}">([^<]*)</script>', page)
    assert found is not None, name
    return found.group(1)


# --- blocks -----------------------------------------------------------------------------------


@pytest.mark.parametrize("text", HOSTILE)
def test_json_holds_neither_markup_nor_template_and_reads_back(text: str) -> None:
    written = inert_json({"name": [text, {"inner": {}}]})
    assert json.loads(written) == {"name": [text, {"inner": {}}]}
    assert not re.search(r"[<>&\u2028\u2029]|\{\{|\{%|\{#", written)


def test_json_refuses_numbers_that_json_does_not_have() -> None:
    with pytest.raises(ValueError, match="JSON"):
        inert_json([float("nan")])


def test_packed_block_reads_back() -> None:
    arrays = {
        "bytes": np.array([0, 255], np.uint8),
        "words": np.array([[1, 65535], [256, 0]], np.uint16),
        "longs": np.array([4_000_000_000, 7], np.uint32),
    }
    head, back = unpacked(pack(arrays, texts={"names": list(HOSTILE)}, facts={"count": 2}))
    assert head["texts"]["names"] == list(HOSTILE)
    assert head["facts"] == {"count": 2}
    for name, values in arrays.items():
        np.testing.assert_array_equal(back[name], values.ravel())


def test_packed_block_refuses_signed_numbers() -> None:
    with pytest.raises(TypeError, match="unsigned"):
        pack({"x": np.array([-1])})


@pytest.mark.parametrize(("low", "high", "step"), [(-90.0, 90.0, 0.01), (0.0, 360.0, 0.01), (0.0, 5e6, 0.1)])
def test_quantised_values_are_right_to_half_a_step(low: float, high: float, step: float) -> None:
    values = np.random.default_rng(1).uniform(low, high, 5000)
    values[::7] = np.nan
    codes, offset, kept = quantise(values, step)
    back = np.where(codes == 0, np.nan, offset + (codes.astype(float) - 1) * kept)
    np.testing.assert_array_equal(np.isnan(back), np.isnan(values))
    assert np.nanmax(np.abs(back - values)) <= kept / 2 * 1.0001
    assert kept == step or high > 1e6


# --- pictures ---------------------------------------------------------------------------------


def edges_in_pixels(grid: MercatorGrid, latitude: float, longitude: float, zoom: int) -> tuple[float, float]:
    """How far the nearest change of value in a picture lies from a parallel and a meridian, CSS pixels.

    Web Mercator pixels as OGC's Two Dimensional Tile Matrix Set standard defines WebMercatorQuad: 256
    pixels times two to the zoom around the world.
    """
    rows, columns = grid.values.shape
    world = 256 * 2**zoom
    top, bottom = float(mercator_y(grid.north)), float(mercator_y(grid.south))
    y = top + np.arange(rows + 1) * (bottom - top) / rows
    x = grid.west + np.arange(columns + 1) * (grid.east - grid.west) / columns
    middle = grid.values[:, columns // 2]
    across = grid.values[rows // 2]
    row_edges = y[1:-1][np.diff(middle) != 0]
    column_edges = x[1:-1][np.diff(across) != 0]
    down = np.abs(row_edges - float(mercator_y(latitude))).min() / 360 * world
    side = np.abs(column_edges - longitude).min() / 360 * world
    return float(down), float(side)


def blocks_of(bounds: tuple[float, float, float, float], step: float, size: tuple[int, int]) -> Overlay:
    """A grid in degrees whose value changes at every `step` degrees, counted from its corner."""
    west, south, east, north = bounds
    rows, columns = size
    row = np.floor((np.arange(rows) + 0.5) * (north - south) / rows / step)
    column = np.floor((np.arange(columns) + 0.5) * (east - west) / columns / step)
    values = row[:, None] * 1000 + column[None, :]
    transform = ((east - west) / columns, 0.0, west, 0.0, (south - north) / rows, north)
    return Overlay(sample.ELEVATION, values, "EPSG:4326", transform)


REGIONS = {
    "58 to 70° N": (4.0, 58.0, 20.0, 70.0),
    "40 to 56° S": (-76.0, -56.0, -60.0, -40.0),
    "equator": (30.0, -6.0, 46.0, 6.0),
    "across 180°": (172.0, -22.0, 188.0, -10.0),
}


@pytest.mark.parametrize("zoom", [5, 6, 7, 8])
@pytest.mark.parametrize("region", REGIONS)
def test_edges_lie_within_a_pixel_of_known_coordinates(region: str, zoom: int) -> None:
    bounds = REGIONS[region]
    west, south, east, north = bounds
    # Cells of 1/80°: at zoom 8 a cell of a 16° wide grid of 1,200 columns is 2.4 pixels of that zoom.
    grid = to_mercator(blocks_of(bounds, 2.0, (int((north - south) * 80), 1280)), long_side=4000)
    for parallel in np.arange(south + 2.0, north, 2.0):
        for meridian in np.arange(west + 2.0, east, 2.0):
            down, side = edges_in_pixels(grid, parallel, meridian, zoom)
            assert down <= 1.0
            assert side <= 1.0


def test_the_same_check_fails_without_the_warp() -> None:
    bounds = REGIONS["58 to 70° N"]
    overlay = blocks_of(bounds, 2.0, (960, 1280))
    west, south, east, north = bounds
    stretched = MercatorGrid(overlay.values, west, east, north, south)
    worst = max(
        edges_in_pixels(stretched, parallel, 12.0, 5)[0] for parallel in (60.0, 62.0, 64.0, 66.0, 68.0)
    )
    assert worst > 20.0


@pytest.mark.parametrize("region", REGIONS)
def test_at_1200_pixels_edges_lie_within_half_a_cell(region: str) -> None:
    bounds = REGIONS[region]
    west, south, east, north = bounds
    grid = to_mercator(blocks_of(bounds, 2.0, (int((north - south) * 100), 1600)))
    assert max(grid.values.shape) <= 1200
    cell = (east - west) / grid.values.shape[1] / 360 * 256 * 2**7
    for parallel in np.arange(south + 2.0, north, 2.0):
        assert edges_in_pixels(grid, parallel, west + 2.0, 7)[0] <= 0.5 * cell * 1.01


def test_cells_are_picked_and_never_mixed() -> None:
    overlay = blocks_of(REGIONS["58 to 70° N"], 1.0, (700, 900))
    grid = to_mercator(overlay)
    assert np.isin(grid.values, overlay.values).all()


def test_metric_grids_are_laid_by_the_inverse_projection() -> None:
    """UTM zone 33 north; positions by pyproj, the general-purpose projection library."""
    from pyproj import Transformer

    step, rows, columns = 2000.0, 300, 250
    west, north = 300_000.0, 7_300_000.0
    values = np.arange(rows * columns, dtype=float).reshape(rows, columns)
    overlay = Overlay(sample.ELEVATION, values, "EPSG:32633", (step, 0.0, west, 0.0, -step, north))
    grid = to_mercator(overlay)
    to_degrees = Transformer.from_crs("EPSG:32633", "EPSG:4326", always_xy=True)
    random = np.random.default_rng(2)
    row, column = random.integers(5, rows - 5, 300), random.integers(5, columns - 5, 300)
    longitude, latitude = to_degrees.transform(west + (column + 0.5) * step, north - (row + 0.5) * step)
    top, bottom = mercator_y(grid.north), mercator_y(grid.south)
    down = np.floor((top - mercator_y(latitude)) / (top - bottom) * grid.values.shape[0]).astype(int)
    side = np.floor((longitude - grid.west) / (grid.east - grid.west) * grid.values.shape[1]).astype(int)
    found = grid.values[down, side]
    # The picture's cell that holds the point may have its own centre in a neighbour of the source's cell.
    found_row, found_column = np.divmod(found, columns)
    assert np.nanmax(np.abs(found_row - row)) <= 1
    assert np.nanmax(np.abs(found_column - column)) <= 1
    assert np.mean((found_row == row) & (found_column == column)) > 0.5


def test_rotated_grids_are_refused() -> None:
    overlay = Overlay(sample.ELEVATION, np.zeros((4, 4)), "EPSG:4326", (1.0, 0.2, 0.0, 0.0, -1.0, 10.0))
    with pytest.raises(ValueError, match="not rotated"):
        to_mercator(overlay)


def test_second_difference_is_undone_by_sums() -> None:
    codes = np.random.default_rng(4).integers(0, 65536, (40, 30)).astype(np.uint16)
    back = np.cumsum(np.cumsum(delta_coded(codes).astype(np.int64), axis=0), axis=1) % 65536
    np.testing.assert_array_equal(back, codes)


def test_a_line_across_180_degrees_stays_whole() -> None:
    line = np.array([[178.0, -17.0], [-179.0, -17.5], [-177.0, -18.0]])
    np.testing.assert_allclose(unrolled(line, 180.0)[:, 0], [178.0, 181.0, 183.0])
    np.testing.assert_allclose(unrolled(line, -175.0)[:, 0], [-182.0, -179.0, -177.0])


# --- the page ---------------------------------------------------------------------------------


def test_page_asks_the_network_for_nothing() -> None:
    page = compose(sample.content(30))
    markup = re.sub(r"<(script|style)[^>]*>.*?</\1>", "", page, flags=re.DOTALL)
    assert not re.search(r"https?:", markup)
    styles = "".join(re.findall(r"<style>(.*?)</style>", page, re.DOTALL))
    assert "url(" not in styles
    assert "@import" not in styles
    policy = re.search(r'Content-Security-Policy" content="([^"]+)"', page)
    assert policy is not None
    assert policy.group(1).startswith("default-src 'none'; ")
    assert "unsafe" not in policy.group(1)
    assert "http" not in policy.group(1)
    assert "connect-src" not in policy.group(1)


def test_policy_names_every_script_and_style_by_its_hash() -> None:
    page = compose(sample.content(5))
    policy = re.search(r'Content-Security-Policy" content="([^"]+)"', page)
    assert policy is not None
    texts = re.findall(r"<(?:script|style)>(.*?)</(?:script|style)>", page, re.DOTALL)
    assert len(texts) == 4
    for text in texts:
        digest = base64.b64encode(hashlib.sha256(text.encode()).digest()).decode()
        assert f"'sha256-{digest}'" in policy.group(1)


def test_page_has_language_title_and_zoom() -> None:
    page = compose(sample.content(5, title="North <& South>"))
    assert '<html lang="en">' in page
    assert "<title>North &lt;&amp; South&gt;</title>" in page
    assert "user-scalable" not in page
    assert "maximum-scale" not in page


def test_licence_of_leaflet_travels_along() -> None:
    page = compose(sample.content(0))
    assert page.count("Redistributions of source code must retain the above copyright notice") >= 2


def test_equal_content_gives_equal_bytes(tmp_path: Path) -> None:
    first, second = tmp_path / "first.html", tmp_path / "second.html"
    size = write_fieldmap(first, sample.content(200))
    assert write_fieldmap(second, sample.content(200)) == size == first.stat().st_size
    assert first.read_bytes() == second.read_bytes()


@pytest.mark.parametrize(("count", "most"), [(500, 3_500_000), (5_000, 5_000_000), (50_000, 12_000_000)])
def test_size_with_three_pictures_of_1200_pixels(tmp_path: Path, count: int, most: int) -> None:
    size = (1500, 1200)
    pictures = [
        sample.overlay(sample.ELEVATION, size=size, rough=5.0),
        sample.overlay(sample.MISMATCH, size=size, rough=0.02),
        sample.overlay(sample.SKEW, size=size),
    ]
    written = write_fieldmap(tmp_path / "map.html", sample.content(count, overlays=pictures, every=True))
    assert written <= most


def test_large_files_get_a_remark() -> None:
    assert size_remark(15_000_000) == ""
    assert "16.2 MB" in size_remark(16_200_000)
    assert "--only" in size_remark(16_200_000)


def test_sites_read_back_from_the_page() -> None:
    content = sample.content(300)
    table = content.sites
    assert table is not None
    page = compose(content)
    head, arrays = unpacked(block(page, "sites"))
    np.testing.assert_allclose(arrays["lat"] / 1e6 - 720, table["lat"], atol=5.1e-7)
    np.testing.assert_allclose(arrays["lon"] / 1e6 - 720, table["lon"], atol=5.1e-7)
    assert [head["texts"]["id"][code] for code in arrays["id"]] == table["id"].tolist()
    assert [sample.ACTIONS[code] for code in arrays["action"]] == table["action"].tolist()
    head, arrays = unpacked(block(page, "details"))
    facts = {column["name"]: column for column in head["facts"]["columns"]}["margin_before"]
    back = facts["offset"] + (arrays["margin_before"] - 1) * facts["step"]
    np.testing.assert_allclose(back, table["margin_before"], atol=0.00501)
    assert set(table.columns) == {
        *(column["name"] for column in head["facts"]["columns"]),
        *(column["name"] for column in unpacked(block(page, "sites"))[0]["facts"]["columns"]),
        "lat",
        "lon",
        "action",
    }


def test_given_texts_are_not_changed() -> None:
    table = sample.sites(3)
    table["id"] = ["007", "NA", "1E5"]
    page = compose(sample.content(0, sites=table))
    head, arrays = unpacked(block(page, "sites"))
    assert [head["texts"]["id"][code] for code in arrays["id"]] == ["007", "NA", "1E5"]


def test_map_without_sites_pictures_or_lines() -> None:
    page = compose(
        sample.content(0, pictures=0, contours=(), coverage=(), routes=(), places=(), basemap=Basemap())
    )
    assert json.loads(block(page, "meta"))["sites"] == {"count": 0}


def test_the_numbers_of_the_page_are_plain_json() -> None:
    meta = json.loads(block(compose(sample.content(10)), "meta"))
    assert meta["geometry"]["outgoing"] == {
        "name": "Meridian East 1",
        "longitude": -66.2,
        "latitude": 0.0,
        "tilt": 21.0,
        "aim": [-64.0, -36.5],
    }
    assert [kind["shape"] for kind in meta["classes"]] == [
        "dot",
        "square",
        "triangle",
        "diamond",
        "cross",
        "bar",
    ]
    assert [kind["name"] for kind in meta["classes"]] == list(sample.ACTIONS)


def hostile_content(mark: Path) -> Any:
    """Hostile text in every field that comes from a file."""
    texts = [text.replace("{mark}", str(mark)) for text in HOSTILE]
    table = sample.sites(len(texts), extra=1)
    for column in ("id", "name", "district", "remark 0"):
        table[column] = [f"{text}{number if column == 'id' else ''}" for number, text in enumerate(texts)]
    table = table.rename(columns={"remark 0": texts[1]})
    everything = " ".join(text for text in texts if len(text) < 1000)
    track = np.array([[-60.0, -30.0], [-61.0, -31.0]])
    return sample.content(
        0,
        title=everything,
        sites=table,
        provenance={everything: everything},
        cautions=texts,
        geometry=sample.GeometryFacts(
            SatelliteFacts(everything, -66.2, 0.0, 21.0), SatelliteFacts(everything, -66.2)
        ),
        identity=everything,
        columns=[sample.Column(texts[1], everything, everything)],
        contours=[ContourLine(everything, 1.0, track, everything)],
        routes=[Route(text, text, track, (table["id"].iloc[0],)) for text in texts],
        places=[PlaceName(text, -60.0, -30.0) for text in texts],
        basemap=Basemap(attribution=everything),
        privacy_note=everything,
        tiles=Tiles("https://tiles.example.org/{z}/{x}/{y}.png", everything),
    )


def test_hostile_text_neither_runs_nor_stops_the_writing(tmp_path: Path) -> None:
    mark = tmp_path / "it-ran"
    page = compose(hostile_content(mark))
    assert not mark.exists()
    markup = re.sub(r"<(script|style)[^>]*>.*?</\1>", "", page, flags=re.DOTALL)
    assert not re.search(r"<(img|svg)", markup)
    assert len(re.findall(r"<script>", page)) == 2
    title = re.search(r"<title>(.*?)</title>", page, re.DOTALL)
    assert title is not None
    assert "{{7*7}}" in title.group(1)
    assert "49" not in title.group(1)
    meta = json.loads(block(page, "meta"))
    assert "{{7*7}}" in meta["title"]
    assert "</script>" in meta["title"]
    head, _ = unpacked(block(page, "sites"))
    assert set(head["texts"]["name"]) == {text.replace("{mark}", str(mark)) for text in HOSTILE}


@pytest.mark.parametrize(
    "address",
    [
        "http://plain.example.org/{z}/{x}/{y}.png",
        "https://a.example.org/tiles.png",
        "javascript:alert(1)//{z}{x}{y}",
        "https://a.example.org; script-src *; /{z}/{x}/{y}.png",
        "'; img-src *",
    ],
)
def test_unusable_tile_addresses_are_refused(address: str) -> None:
    with pytest.raises(InputError, match="tile"):
        compose(sample.content(0, tiles=Tiles(address, "somebody")))


def test_tiles_open_the_policy_for_their_host_alone() -> None:
    page = compose(
        sample.content(0, tiles=Tiles("https://{s}.tiles.example.org:8443/m/{z}/{x}/{y}.png", "X"))
    )
    policy = re.search(r"img-src ([^;]*);", page)
    assert policy is not None
    assert policy.group(1) == "data: blob: https://*.tiles.example.org:8443"
    assert urlparse("https://a.tiles.example.org:8443").hostname == "a.tiles.example.org"


def test_nothing_half_written_stays(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    target = tmp_path / "map.html"
    target.write_text("earlier", encoding="utf-8")

    def full(self: Path, data: bytes) -> int:
        raise OSError(28, "No space left on device")

    monkeypatch.setattr(Path, "write_bytes", full)
    with pytest.raises(OutputError, match=r"map\.html"):
        write_fieldmap(target, sample.content(3))
    assert [file.name for file in tmp_path.iterdir()] == ["map.html"]
    assert target.read_text(encoding="utf-8") == "earlier"


# --- privacy ----------------------------------------------------------------------------------


def test_only_keeps_the_sites_and_routes_of_one_crew() -> None:
    content = sample.content(100)
    left = only(content, {"crew": "crew 2"})
    assert left.sites is not None
    assert content.sites is not None
    wanted = [identity for route in content.routes if route.crew == "crew 2" for identity in route.sites]
    assert sorted(left.sites["id"]) == sorted(wanted)
    assert {route.crew for route in left.routes} == {"crew 2"}
    assert "15 of 100 sites" in left.privacy_note
    page = compose(left)
    others = set(content.sites["id"]) - set(wanted)
    assert not others & set(unpacked(block(page, "sites"))[0]["texts"]["id"])


def test_only_by_any_column() -> None:
    left = only(sample.content(100), {"district": "Distrito 3"})
    assert left.sites is not None
    assert set(left.sites["district"]) == {"Distrito 3"}


@pytest.mark.parametrize(
    ("wanted", "words"), [({"tribe": "x"}, "no column 'tribe'"), ({"crew": "crew 9"}, "no site is left")]
)
def test_only_says_what_is_wrong(wanted: dict[str, str], words: str) -> None:
    with pytest.raises(InputError, match=words):
        only(sample.content(50), wanted)


def test_blurred_sites_lose_place_and_directions() -> None:
    content = sample.content(200)
    left = blurred(content, 0.1)
    assert left.sites is not None
    assert content.sites is not None
    moved = np.abs(left.sites["lat"] - content.sites["lat"])
    assert moved.max() <= 0.05 + 1e-9
    assert moved.max() > 0.03
    assert len(np.unique(np.round(np.mod(left.sites["lat"] / 0.1, 1.0), 3))) == 1
    for name in left.sites.columns:
        assert not str(name).startswith(("azimuth", "elevation", "range", "skew", "seen", "setting"))
    assert (left.sites["turn_realigned"] % 1.0 == 0).all()
    assert list(left.routes) == []
    assert "cells of 0.1°" in left.privacy_note


def test_the_turn_to_make_is_a_number_of_the_first_block_and_is_blurred_too() -> None:
    content = sample.content(20)
    assert content.sites is not None
    table = content.sites.assign(turn_to_make=np.linspace(-140.3, 40.0, 20), turn_remark="exchange the leads")
    table.loc[3, "turn_to_make"] = np.nan
    first, second = (unpacked(text)[0]["facts"] for text in packed_sites(table, judged_in="clear"))
    assert {one["name"]: one["kind"] for one in first["columns"]}["turn_to_make"] == "number"
    assert {one["name"]: one["kind"] for one in second["columns"]}["turn_remark"] == "text"
    left = blurred(replace(content, sites=table), 0.1).sites
    assert left is not None
    assert (left["turn_to_make"].dropna() % 1.0 == 0).all()


@pytest.mark.parametrize("step", [0.0, -1.0, 11.0, float("nan")])
def test_blur_refuses_cells_that_make_no_sense(step: float) -> None:
    with pytest.raises(InputError, match="blur"):
        blurred(sample.content(5), step)


# --- scripts ----------------------------------------------------------------------------------


def test_scripts_and_styles_are_all_used_and_readable() -> None:
    from geoskew.outputs.fieldmap.shell import SCRIPTS, STYLES

    assert sorted(SCRIPTS) == sorted(file.name for file in (ASSETS / "js").glob("*.js"))
    assert sorted(STYLES) == sorted(file.name for file in ASSETS.glob("*.css"))
    for file in ASSETS.rglob("*.js"):
        text = file.read_text(encoding="utf-8")
        assert len(text.splitlines()) < 300
        assert not re.search(
            r"innerHTML|outerHTML|insertAdjacentHTML|document\.write|\beval\(|new Function", text
        ), file


def test_scripts_parse(needs_tool: Callable[[str], str]) -> None:
    node = needs_tool("node")
    for file in sorted((ASSETS / "js").glob("*.js")):
        done = subprocess.run([node, "--check", str(file)], capture_output=True, text=True, check=False)
        assert done.returncode == 0, done.stderr


@pytest.mark.parametrize(
    ("ramp", "limits", "values", "wanted"),
    [
        ("signed", (-90.0, 90.0), (-21.0, 14.0), [-25.0, 25.0]),
        ("signed", (-90.0, 90.0), (-89.0, 14.0), [-90.0, 90.0]),
        ("margin", (-12.0, 12.0), (2.0, 40.0), [-12.0, 12.0]),
        ("loss", (0.0, 6.0), (0.3, 1.1), [0.0, 1.5]),
        ("level", (0.0, 90.0), (31.0, 58.0), [30.0, 60.0]),
        ("level", (38.0, 56.0), (70.0, 75.0), [70.0, 75.0]),
        ("cycle", (0.0, 360.0), (10.0, 20.0), [0.0, 360.0]),
    ],
)
def test_colours_span_the_values_with_round_ends(
    ramp: str, limits: tuple[float, float], values: tuple[float, float], wanted: list[float]
) -> None:
    of = sample.layer("x", "deg", ramp, limits)
    assert shown_limits(of, np.array([*values, np.nan])) == pytest.approx(wanted)


def test_colours_without_values_keep_the_limits_of_the_layer() -> None:
    assert shown_limits(sample.ELEVATION, np.full((2, 2), np.nan)) == [0.0, 90.0]
    assert shown_limits(sample.ACTION, np.zeros((2, 2), np.uint8)) == [0.0, 5.0]
