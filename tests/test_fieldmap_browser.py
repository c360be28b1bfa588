"""The field map in headless Chromium: what a person does with it, on a desk and on a phone."""

from __future__ import annotations

import csv
import io
import json
import re
import subprocess
from collections.abc import Callable
from dataclasses import replace
from datetime import UTC, datetime
from pathlib import Path
from typing import Any

import fieldmap_sample as sample
import numpy as np
import pytest
from test_outputs_fieldmap import HOSTILE, REGIONS, blocks_of, hostile_content

from geoskew.fieldwork.reports.reading import read_reports
from geoskew.outputs.fieldmap import Tiles, write_fieldmap
from geoskew.outputs.fieldmap.overlays import mercator_y, to_mercator

DRIVER = Path(__file__).with_name("fieldmap_browser.mjs")
DESK = {"width": 1280, "height": 800}
PHONE = {"width": 390, "height": 844}
SCREENS = pytest.mark.parametrize("screen", [DESK, PHONE], ids=["desk", "phone"])

Drive = Callable[..., dict[str, Any]]


@pytest.fixture(scope="session")
def drive(needs_tool: Callable[[str], str], needs_node_package: Callable[[str], Path]) -> Drive:
    """Run one task of the driver on a file and give what it saw; it fails where the page misbehaved."""
    node, chromium = needs_tool("node"), needs_tool("chromium")
    modules = needs_node_package("playwright-core").parent

    def run(task: str, file: Path, *, requests: int = 1, **given: Any) -> Any:
        done = subprocess.run(
            [node, str(DRIVER), chromium, str(modules), task],
            input=json.dumps({"file": str(file), **DESK, **given}),
            capture_output=True, text=True, check=False, timeout=300,
        )  # fmt: skip
        assert done.returncode == 0, done.stderr
        seen = json.loads(done.stdout)
        assert seen["errors"] == []
        assert seen["dialogs"] == []
        if requests:
            assert len(seen["requests"]) == requests, seen["requests"]
            assert seen["messages"] == []
        return {**seen["result"], "seen": seen}

    return run


@pytest.fixture(scope="session")
def page(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A map of 240 sites with four layers, in a file whose name has spaces and other letters."""
    file = tmp_path_factory.mktemp("maps") / "Mapa de campo – año ñ 地図.html"
    write_fieldmap(file, sample.content(240, pictures=4))
    return file


@SCREENS
def test_one_request_from_opening_to_print(drive: Drive, page: Path, screen: dict[str, int]) -> None:
    out = drive("walk", page, **screen)
    assert out["chosen"]
    assert out["title"] in out["card"]
    assert re.search(
        r"Standing behind the dish, looking towards the satellite: turn (anti)?clockwise by", out["card"]
    )
    assert re.search(r"Standing in front, looking into the dish: turn (anti)?clockwise by", out["card"])
    behind, front = re.findall(r"turn ((?:anti)?clockwise) by", out["card"])[:2]
    assert {behind, front} == {"clockwise", "anticlockwise"}
    box = out["cardBox"]
    assert 0 <= box["left"] <= box["right"] <= box["width"]
    assert 0 <= box["top"] <= box["bottom"] <= box["height"]
    assert re.fullmatch(r"geo:-?\d+\.\d{6},-?\d+\.\d{6}", out["geo"])
    # The key follows what is shown: none, then each layer with its unit and "no value".
    assert "no value" not in out["keys"][0]
    assert all("no value" in key for key in out["keys"][1:4])
    assert "dB" in out["keys"][1]
    assert "°" in out["keys"][2]
    # Both words must occur in id, name or district.
    texts = [f"s{i:05d} escuela rural {i} distrito {i % 23}" for i in range(240)]
    found = sum("rural" in text and "12" in text for text in texts)
    assert out["summary"] == f"{found} of 240 sites shown"
    for words in ("2027-03-01", "coordinates of 240 sites", "Natural Earth", "Leaflet", "without weather"):
        assert words in out["about"]


def test_renamed_file_opens(drive: Drive, page: Path, tmp_path: Path) -> None:
    copy = tmp_path / "attachment.htm"
    copy.write_bytes(page.read_bytes())
    assert drive("values", copy, places=[[-64.0, -36.0]])["mismatch_untouched"][0] is not None


def test_keyboard_alone_reaches_a_site(drive: Drive, page: Path) -> None:
    out = drive("keyboard", page)
    assert out["focus"] == "card"
    assert "rural 7" in out["title"]
    assert out["closed"]
    assert "rural 7" in out["back"]
    assert out["tab"] == "tab-place"


@SCREENS
def test_targets_are_44_pixels(drive: Drive, page: Path, screen: dict[str, int]) -> None:
    out = drive("targets", page, **screen)
    assert out["small"] == []
    assert not out["wide"]


@pytest.mark.parametrize("theme", ["light", "dark"])
@SCREENS
def test_nothing_serious_by_axe(
    drive: Drive, page: Path, screen: dict[str, int], theme: str, needs_node_package: Callable[[str], Path]
) -> None:
    needs_node_package("axe-core")
    out = drive("axe", page, theme=theme, **screen)
    out.pop("seen")
    found = {
        view: [v for v in violations if v["impact"] in ("serious", "critical")]
        for view, violations in out.items()
    }
    assert found == {view: [] for view in found}


def test_values_under_the_finger_are_those_of_the_grid(drive: Drive, page: Path) -> None:
    random = np.random.default_rng(9)
    west, south, east, north = sample.BOUNDS
    places = np.column_stack([random.uniform(west, east, 300), random.uniform(south, north, 300)])
    out = drive("values", page, places=places.tolist())
    steps = {"mismatch_untouched": 0.01, "elevation_after": 0.01, "skew_after": 0.01, "action": 1.0}
    for overlay in sample.content(0, pictures=4).overlays:
        grid = to_mercator(overlay)
        top, bottom = mercator_y(grid.north), mercator_y(grid.south)
        row = np.floor((top - mercator_y(places[:, 1])) / (top - bottom) * grid.values.shape[0]).astype(int)
        column = np.floor((places[:, 0] - grid.west) / (grid.east - grid.west) * grid.values.shape[1]).astype(
            int
        )
        wanted = grid.values[row, column].astype(float)
        if overlay.layer.is_class:
            wanted[wanted == 255] = np.nan
        found = np.array(out[overlay.layer.name], dtype=float)
        np.testing.assert_array_equal(np.isnan(found), np.isnan(wanted))
        assert np.nanmax(np.abs(found - wanted)) <= steps[overlay.layer.name] / 2 * 1.001


def test_value_under_the_pointer_is_shown(drive: Drive, page: Path) -> None:
    out = drive("pointer", page, at=[-62.0, -38.0])
    assert out["reading"].startswith(out["value"])
    assert "dB" in out["value"]


@pytest.mark.parametrize("region", REGIONS)
def test_drawn_edges_lie_within_a_pixel(drive: Drive, region: str, tmp_path: Path) -> None:
    """A board of 1° squares in the corner of each region: at 1,200 cells a cell is half a pixel of zoom 8."""
    west, south = REGIONS[region][0] + 3.0, REGIONS[region][1] + 3.0
    grid = blocks_of((west, south, west + 4.0, south + 3.0), 1.0, (1200, 1600))
    # Values that jump from one end of the ramp to the other at every line.
    board = (np.floor(grid.values / 1000) + grid.values % 1000) % 2 * 90.0
    file = tmp_path / "edges.html"
    overlay = sample.Overlay(sample.ELEVATION, board, grid.crs, grid.transform)
    write_fieldmap(file, sample.content(0, overlays=[overlay]))
    wanted = [
        {"zoom": zoom, "longitude": west + across, "latitude": south + up}
        for zoom in (5, 6, 7, 8) for across in (1, 2, 3) for up in (1, 2)
    ]  # fmt: skip
    for found in drive("edges", file, wanted=wanted)["found"]:
        assert found["down"] <= 1.0, found
        assert found["side"] <= 1.0, found


@SCREENS
def test_tap_without_a_site_reads_the_place(drive: Drive, page: Path, screen: dict[str, int]) -> None:
    out = drive("place", page, at=[-78.0, -30.0], **screen)
    assert out["visible"]
    assert out["place"] is not None
    assert set(out["cells"]) >= {
        "azimuth_before",
        "elevation_after",
        "skew_before",
        "skew_after",
        "mismatch_untouched",
    }
    assert re.fullmatch(r"−?\d+\.\d{2}°", out["cells"]["skew_after"])
    assert out["grids"]["mismatch_untouched"] == "no value"


def test_address_holds_filter_layer_view_and_site(drive: Drive, page: Path) -> None:
    out = drive("address", page, requests=0, crew="crew 2", day="2027-05-12", layer="skew_after", site=1)
    assert out["first"]["total"] == 240
    assert out["set"]["crew"] == "crew 2"
    assert 0 < out["set"]["total"] <= 5
    for key in ("crew", "day", "total", "hidden", "layer", "zoom", "open"):
        assert out["again"][key] == out["set"][key], key
    assert set(out["seen"]["requests"]) == {page.as_uri(), page.as_uri() + out["set"]["hash"]} or all(
        address.startswith("file:") for address in out["seen"]["requests"]
    )


def test_readings_stay_and_leave_as_a_report(drive: Drive, page: Path, tmp_path: Path) -> None:
    readings = {
        "setting_scale": "12,5", "setting_inclinometer": "12.1", "quality_before": "9.8", "quality_after": "11.2",
        "note": 'clamp "loose", tightened',
    }  # fmt: skip
    out = drive("notes", page, requests=2, readings=readings)
    assert out["kept"]
    assert re.fullmatch(r"reports-\d{4}-\d\d-\d\d\.csv", out["name"])
    rows = list(csv.DictReader(io.StringIO(out["csv"])))
    assert list(rows[0]) == [
        "site", "date", "setting_scale", "setting_inclinometer", "quality_before", "quality_after", "note",
    ]  # fmt: skip
    assert len(rows) == 1
    assert rows[0]["site"] == out["id"]
    assert rows[0]["setting_scale"] == "12.5"
    assert rows[0]["note"] == readings["note"]
    assert re.fullmatch(r"\d{4}-\d\d-\d\d", rows[0]["date"])
    file = tmp_path / out["name"]
    file.write_text(out["csv"], encoding="utf-8", newline="")
    read = read_reports(file, sites=[out["id"]], carriers=["lessons"], changeover=datetime.now(UTC))
    assert read.rejected == ()
    assert read.warnings == ()
    assert (read.reports[0].setting_scale, read.reports[0].quality_after) == (12.5, 11.2)
    assert read.reports[0].note == readings["note"]


def test_hostile_text_is_shown_and_nothing_runs(drive: Drive, tmp_path: Path) -> None:
    file = tmp_path / "hostile.html"
    mark = tmp_path / "it-ran"
    write_fieldmap(file, hostile_content(mark))
    out = drive("hostile", file)
    assert not mark.exists()
    for card in out["cards"]:
        assert card["name"] in card["text"]
    assert {card["name"] for card in out["cards"]} == {text.replace("{mark}", str(mark)) for text in HOSTILE}
    for text in ("{{7*7}}", "</script><img src=x onerror=alert(1)>", "${alert(1)}", "\U0001f4e1"):
        assert text in out["title"]
        assert text in out["about"]
    for text in ("{{7*7}}", "{% raise %}", "<!--<script>"):
        assert text in out["list"]
    assert "<img src=x onerror=alert(1)>" in out["paper"]
    assert out["images"] == 0
    assert out["scripts"] == 2


def test_a_card_gives_the_turn_within_the_stops_of_the_feed(drive: Drive, tmp_path: Path) -> None:
    content = sample.content(6)
    assert content.sites is not None
    told = "cannot reach: the feed is fixed; do not force it, report to the planner"
    table = content.sites.assign(
        action="turn-at-changeover", turn_realigned=40.0, turn_shared=[88.0, *[20.0] * 5],
        turn_to_make=[-140.0, -50.0, 40.0, float("nan"), 0.0, 40.0],
        turn_remark=["the long way round", "exchange the leads", "", told, "exchange the leads", ""],
    )  # fmt: skip
    file = tmp_path / "turns.html"
    write_fieldmap(file, replace(content, sites=table, routes=()))
    out = drive("hostile", file)
    texts = [card["text"].split("All values")[0] for card in out["cards"]]
    assert "satellite: turn anticlockwise by 140.0°. " in texts[0].replace(".Standing", ". Standing")
    assert "The long way round." in texts[0]
    assert "turn anticlockwise by 50.0°" in texts[1]
    assert "Exchange the leads." in texts[1]
    assert "looking towards the satellite: turn clockwise by 40.0°" in texts[2]
    assert "turn clockwise by" not in texts[3]
    assert told[1:] in texts[3]
    assert "The feed is not turned.Exchange the leads." in texts[4]
    assert "−140.0" in out["list"]
    # Near a quarter turn the other way round ends where it should: nothing is called reversed.
    assert "eversed" not in texts[0]
    assert "“Reversed” is what remains" in texts[1]


def test_prints_one_page_a_card(drive: Drive, page: Path, tmp_path: Path) -> None:
    from pypdf import PdfReader

    card, whole = tmp_path / "card.pdf", tmp_path / "map.pdf"
    drive("paper", page, card=str(card), map=str(whole))
    pages = PdfReader(card).pages
    assert len(pages) == 1
    words = pages[0].extract_text()
    assert "Standing behind the dish" in words
    assert "licensed" in words
    assert "2027-03-01" in words
    width, height = float(pages[0].mediabox.width), float(pages[0].mediabox.height)
    assert (width, height) == (pytest.approx(595, abs=2), pytest.approx(842, abs=2))
    map_pages = PdfReader(whole).pages
    assert len(map_pages) == 1
    assert "240 of 240 sites shown" in map_pages[0].extract_text()


def test_online_background_waits_to_be_asked_and_survives_without_network(
    drive: Drive, tmp_path: Path
) -> None:
    file = tmp_path / "tiles.html"
    write_fieldmap(
        file, sample.content(5, tiles=Tiles("https://tiles.example.org/{z}/{x}/{y}.png", "Example"))
    )
    out = drive("tiles", file, requests=0)
    assert out["before"] == 1
    assert out["after"] > 1
    assert out["alive"]


def test_fifty_thousand_sites_open(drive: Drive, tmp_path: Path) -> None:
    file = tmp_path / "many.html"
    write_fieldmap(file, sample.content(50_000))
    out = drive("keyboard", file)
    assert "rural 7" in out["title"]
