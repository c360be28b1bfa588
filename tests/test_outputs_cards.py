"""Job cards: every number out of the table, both standing places right, every given text inert."""

from __future__ import annotations

import math
import re
import subprocess
from collections.abc import Callable
from dataclasses import dataclass, field
from datetime import UTC, date, datetime
from html.parser import HTMLParser
from pathlib import Path
from typing import Any

import numpy as np
import pandas as pd
import pytest
from pypdf import PdfReader
from scenes import at, scenario

from geoskew.errors import OutputError
from geoskew.outputs.cards import CardFacts, CarrierLine, write_cards
from geoskew.outputs.cards.dial import Dial, Stroke, hands
from geoskew.outputs.cards.words import marks_in_words
from geoskew.turning import Feed, Scale, plan_turning, sense_of_scale

CARRIER = CarrierLine("main", "V", 11.95, 27.5, "8PSK 3/4", 8.7)
FACTS = CardFacts(
    title="Lesson network",
    changeover=datetime(2027, 5, 18, 3, tzinfo=UTC),
    outgoing="Old satellite",
    incoming="New satellite",
    outgoing_longitude_deg=-66.2,
    incoming_longitude_deg=-66.2,
    carriers_before=(CARRIER,),
    carriers_after=(CARRIER,),
    terminal={"dish_m": 0.9, "scale_step_deg": 5.0, "ports": 1, "transmits": False},
    edition="geoskew, inputs 0123abcd",
)
OTHER_SLOT = {"incoming_longitude_deg": -65.6}


def row(**values: Any) -> dict[str, Any]:
    """One preset site of invented figures; what a test is about is given by name."""
    site: dict[str, Any] = {
        "id": "S1", "lat": -33.5, "lon": -66.25, "action": "preset", "name": "School",
        "azimuth_before": 3.25, "elevation_before": 51.125, "azimuth_after": 3.25, "elevation_after": 51.125,
        "skew_before": 30.86, "skew_after": 9.86, "seen_after": 9.86,
        "setting_shared": 20.36, "setting_realigned": 9.86, "turn_shared": -10.5, "turn_realigned": -21.0,
        "window_low": -13.75, "window_high": -7.25,
        "margin_before": 6.0625, "margin_untouched": -1.1875, "margin_shared_before": 4.25,
        "margin_shared_after": 4.125, "margin_realigned": 6.03125, "margin_reversed": -7.75,
        "margin_marked_before": 4.21875, "margin_marked_after": 4.0625,
    }  # fmt: skip
    return site | values


def table(*rows: dict[str, Any]) -> pd.DataFrame:
    return pd.DataFrame(list(rows))


@dataclass
class Article:
    """What a browser would see of one card."""

    site: str
    fields: dict[str, list[float]] = field(default_factory=dict)
    text: str = ""
    shapes: list[tuple[str, str, str]] = field(default_factory=list)
    code: str = ""


class Reader(HTMLParser):
    """Reads cards back: fields, texts, drawn shapes by standing place."""

    def __init__(self) -> None:
        super().__init__(convert_charrefs=True)
        self.articles: list[Article] = []
        self.tags: list[tuple[str, dict[str, str | None]]] = []
        self.view = ""
        self.inside = False

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        attributes = dict(attrs)
        self.tags.append((tag, attributes))
        if tag == "article":
            self.articles.append(Article(attributes["data-site"] or ""))
            self.inside = True
        if not self.inside:
            return
        here = self.articles[-1]
        if tag == "figure":
            self.view = attributes["data-view"] or ""
        if tag in ("polyline", "polygon"):
            here.shapes.append((self.view, f"{tag}.{attributes['class']}", attributes["points"] or ""))
        if tag == "path":
            here.code = attributes["d"] or ""
        if tag == "data":
            here.fields.setdefault(attributes["data-field"] or "", []).append(
                float(attributes["value"] or "")
            )

    def handle_endtag(self, tag: str) -> None:
        if tag == "article":
            self.inside = False

    def handle_data(self, data: str) -> None:
        if self.inside:
            self.articles[-1].text += data


def read(path: Path) -> Reader:
    reader = Reader()
    reader.feed(path.read_text(encoding="utf-8"))
    return reader


def card(tmp_path: Path, site: dict[str, Any], facts: CardFacts = FACTS) -> Article:
    path = tmp_path / "cards.html"
    write_cards(path, None, table(site), facts)
    (article,) = read(path).articles
    return article


def pointed_at(article: Article, view: str, shape: str) -> float:
    """Direction of a drawn hand's outer end, degrees clockwise on the paper from straight up."""
    (points,) = [points for seen, name, points in article.shapes if (seen, name) == (view, shape)]
    x, y = map(float, points.split()[-1].split(","))
    return math.degrees(math.atan2(x, -y))


# Ten sites drawn by hand from the definition on the conventions' page: the skew is the angle from the
# local vertical to the satellite's V axis, positive CLOCKWISE for a person who looks TOWARDS the
# satellite (behind the dish); a person in front of the dish sees the mirror image. A tilt of +t adds +t
# in both hemispheres; on the satellite's meridian the skew is the tilt; 45° S, 10° west: +9.86° at tilt 0
# (north of the equator −9.86°, and the other way round to the east). Each line: what it is, polarisation,
# action, skew before and after, and by hand: turn, its sense from behind, side of the target from behind.
HAND = [
    ("45 S 10 W, tilt 21 to 0", "V", "preset", 30.86, 9.86, -10.5, "COUNTER-CLOCKWISE", 20.36, "RIGHT"),
    ("45 S 10 W, tilt 0 to 21", "V", "preset", 9.86, 30.86, 10.5, "CLOCKWISE", 20.36, "RIGHT"),
    ("45 S 10 E, tilt 21 to 0", "H", "preset", 11.14, -9.86, -10.5, "COUNTER-CLOCKWISE", 0.64, "RIGHT"),
    ("45 S 10 E, tilt -21 to 0", "H", "preset", -30.86, -9.86, 10.5, "CLOCKWISE", -20.36, "LEFT"),
    ("45 N 10 W, tilt 21 to 0", "V", "preset", 11.14, -9.86, -10.5, "COUNTER-CLOCKWISE", 0.64, "RIGHT"),
    ("45 N 10 W, tilt -21 to 0", "H", "preset", -30.86, -9.86, 10.5, "CLOCKWISE", -20.36, "LEFT"),
    ("45 N 10 E, tilt 0 to -21", "V", "preset", 9.86, -11.14, -10.5, "COUNTER-CLOCKWISE", -0.64, "LEFT"),
    ("meridian S, tilt 40 to 0", "H", "turn-at-changeover", 40.0, 0.0, -40.0, "COUNTER-CLOCKWISE", 0.0, ""),
    ("meridian N, tilt 0 to 40", "V", "turn-at-changeover", 0.0, 40.0, 40.0, "CLOCKWISE", 40.0, "RIGHT"),
    ("meridian N, tilt 70 to -80", "V", "turn-at-changeover", 70.0, -80.0, 30.0, "CLOCKWISE", -80.0, "LEFT"),
]
MIRROR = {
    "CLOCKWISE": "COUNTER-CLOCKWISE",
    "COUNTER-CLOCKWISE": "CLOCKWISE",
    "LEFT": "RIGHT",
    "RIGHT": "LEFT",
}


@pytest.mark.parametrize("case", HAND, ids=[case[0] for case in HAND])
def test_hand_drawn_case(case: tuple[Any, ...], tmp_path: Path) -> None:
    _, polarisation, action, before, after, turn, sense, target, side = case
    carrier = CarrierLine("main", polarisation, 11.95, 27.5, "8PSK 3/4", 8.7)
    facts = CardFacts(**{**_as_dict(FACTS), "carriers_before": (carrier,), "carriers_after": (carrier,)})
    whole = 90.0 - (90.0 - (after - before)) % 180.0
    site = row(
        action=action, skew_before=before, skew_after=after, seen_after=after, setting_realigned=after,
        turn_realigned=whole, turn_shared=whole / 2, setting_shared=90.0 - (90.0 - before - whole / 2) % 180.0,
        window_low=turn - 3, window_high=turn + 3,
    )  # fmt: skip
    article = card(tmp_path, site, facts)
    column = "turn_shared" if action == "preset" else "turn_realigned"
    assert article.fields[column][0] == pytest.approx(turn)
    words = " ".join(article.text.split())
    behind = re.search(
        r"Stand BEHIND the dish, looking towards the satellite\..*? turn it ([\d.]+)° ([A-Z-]+)", words
    )
    assert behind is not None
    assert float(behind[1]) == pytest.approx(abs(turn), abs=0.05)
    assert behind[2] == sense
    front = re.search(
        r"Standing IN FRONT of the dish, looking into it, the same turn goes ([A-Z-]+)\.", words
    )
    assert front is not None
    assert front[1] == MIRROR[sense]
    stands = re.search(r"must stand (.*?) seen from BEHIND, (.*?) seen from IN FRONT", words)
    assert stands is not None
    if side:
        assert stands[1] == f"{abs(target):.1f}° to the {side} of upright"
        assert stands[2] == f"to the {MIRROR[side]} of upright"
    else:
        assert (stands[1], stands[2]) == ("upright", "upright")
    # On paper: clockwise from straight up as seen from behind, mirrored from in front.
    assert pointed_at(article, "behind", "polyline.target") == pytest.approx(before + turn, abs=0.1)
    assert pointed_at(article, "in front", "polyline.target") == pytest.approx(-(before + turn), abs=0.1)
    assert pointed_at(article, "behind", "polyline.present") == pytest.approx(before, abs=0.1)
    assert pointed_at(article, "in front", "polyline.present") == pytest.approx(-before, abs=0.1)


def _as_dict(facts: CardFacts) -> dict[str, Any]:
    return {name: getattr(facts, name) for name in facts.__dataclass_fields__}


def test_numbers_read_back_equal_the_table(tmp_path: Path) -> None:
    rain = {f"{name}_rain": value - 3 for name, value in row().items() if name.startswith("margin_")}
    sites = [
        row(id="preset", scale_zero_deg=2.5, setting_deg=30.1875, setting_source="inclinometer"),
        row(id="at changeover", action="turn-at-changeover"),
        row(id="aim", action="re-aim", azimuth_after=4.5, elevation_after=50.5, seen_after=10.5),
    ]
    sites = [site | rain for site in sites]
    facts = CardFacts(**_as_dict(FACTS) | OTHER_SLOT | {"judged_in": "rain", "availability_percent": 99.5})
    path = tmp_path / "cards.html"
    assert write_cards(path, None, table(*sites), facts) == []
    articles = read(path).articles
    assert [article.site for article in articles] == [site["id"] for site in sites]
    for article, site in zip(articles, sites, strict=True):
        compared = [name for name in article.fields if name in site]
        for name in compared:
            assert article.fields[name] == pytest.approx([site[name]] * len(article.fields[name]), abs=1e-6)
        wanted = {
            "lat",
            "lon",
            "azimuth_before",
            "margin_before",
            "margin_before_rain",
            "margin_untouched_rain",
        }
        if site["action"] == "preset":
            wanted |= {"turn_shared", "setting_deg", "window_low", "window_high", "margin_shared_before"}
            wanted |= {
                "margin_shared_after",
                "margin_reversed_rain",
                "margin_marked_before",
                "margin_marked_after",
            }
        else:
            wanted |= {"turn_realigned", "setting_realigned", "azimuth_after", "elevation_after"}
            wanted |= {"margin_realigned", "margin_realigned_rain", "skew_before"}
        assert wanted <= set(compared)
        # The meter shows what the receiver needs and the margin on top.
        assert article.fields["margin_before:es_n0"] == pytest.approx([site["margin_before"] + 8.7])


def test_wrong_way_is_one_and_a_half_or_twice_the_error(tmp_path: Path) -> None:
    # common practice, no source: the half-way turn made the wrong way leaves 1.5 times the error, the
    # whole turn made the wrong way twice.
    ahead = card(tmp_path, row(turn_shared=-10.5, turn_realigned=-21.0))
    assert ahead.fields["reversed_error"] == pytest.approx([31.5])
    assert ahead.fields["untouched_error"] == pytest.approx([21.0])
    assert "one and a half times as far" in ahead.text
    assert "look nearly alike" in ahead.text
    at = card(tmp_path, row(action="turn-at-changeover"))
    assert at.fields["wrong_way_error"] == pytest.approx([42.0])
    assert "twice as far" in at.text


def test_wrong_way_of_a_dish_that_stays_counts_the_angle_of_the_old_aim(tmp_path: Path) -> None:
    # seen_after 2° beyond skew_after: untouched is off by −21 + 2 = −19, reversed by −19 − 10.5 = −29.5.
    article = card(tmp_path, row(seen_after=11.86), CardFacts(**_as_dict(FACTS) | OTHER_SLOT))
    assert article.fields["untouched_error"] == pytest.approx([19.0])
    assert article.fields["reversed_error"] == pytest.approx([29.5])


@pytest.mark.parametrize(
    ("marks", "words"),
    [
        (2.0, "2 whole marks"),
        (-2.1, "2 whole marks and about a tenth of a mark"),
        (1.5, "1 whole mark and about half a mark"),
        (0.32, "about a third of a mark"),
        (0.97, "1 whole mark"),
        (3.96, "4 whole marks"),
        (0.02, "less than a tenth of a mark"),
        (4.76, "4 whole marks and about three quarters of a mark"),
    ],
)
def test_marks_in_words(marks: float, words: str) -> None:
    assert marks_in_words(marks) == words


def test_scale_readings_follow_zero_and_sense(tmp_path: Path) -> None:
    # Zero at a setting of +10, numbers growing counter-clockwise: setting 30 reads −20, 20.36 reads −10.36;
    # marks stand at 10 + 5k, the nearest to 20.36 is 20, which reads −10.
    site = row(setting_deg=30.86, scale_zero_deg=10.0, scale_sense="counter-clockwise")
    article = card(tmp_path, site)
    assert article.fields["scale_now"] == pytest.approx([-20.86])
    assert article.fields["scale_target"] == pytest.approx([-10.36])
    assert article.fields["nearest_mark"] == pytest.approx([-10.0])
    assert sense_of_scale("sideways") is None
    assert Scale(5.0, zero=10.0, sense=-1).reading(30.0) == -20.0


@pytest.mark.parametrize("step", [5.0, 7.0, 8.0])
@pytest.mark.parametrize(
    "columns",
    [{}, {"setting_deg": 12.3}, {"scale_zero_deg": 3.1}, {"setting_deg": 12.3, "scale_zero_deg": -150.0}],
)
def test_nearest_mark_is_the_one_whose_margins_are_printed(
    tmp_path: Path, columns: dict[str, float], step: float
) -> None:
    # A feed left on the mark that the card names has the margins that the card prints beside it.
    scene = scenario(terminal={"scale_step_deg": step})
    names = ("skew_before", "turn_shared", "setting_shared", "window_low", "window_high")
    marked = ("margin_marked_before", "margin_marked_after")
    site = {name: float(value) for name, value in at(scene, -34.6, -58.4, *names, *marked, **columns).items()}
    article = card(tmp_path, row(**site, **columns, scale_step_deg=step))
    (shown,) = article.fields["nearest_mark"]
    left = at(
        scene, -34.6, -58.4, "margin_before", "margin_untouched",
        setting_deg=shown + columns.get("scale_zero_deg", 0.0),
    )  # fmt: skip
    assert left["margin_before"] == pytest.approx(article.fields[marked[0]][0])
    assert left["margin_untouched"] == pytest.approx(article.fields[marked[1]][0])


@pytest.mark.parametrize("turn", [90.0, 88.5, -89.0])
def test_near_a_quarter_turn_no_setting_is_called_the_wrong_way(tmp_path: Path, turn: float) -> None:
    # Turned the other way round the feed's axis ends where it should: nothing there is wrong.
    article = card(tmp_path, row(action="turn-at-changeover", skew_before=10.0, turn_realigned=turn))
    assert "WRONG WAY" not in article.text
    assert "margin_wrong_way" not in article.fields
    assert abs(article.fields["other_way_round"][0]) == pytest.approx(180.0 - 2.0 * abs(turn))
    assert not [shape for shape in article.shapes if shape[1].endswith(".wrong")]
    assert "WRONG WAY" in card(tmp_path, row(action="turn-at-changeover", turn_realigned=80.0)).text


def test_a_mark_past_level_is_said_to_point_down(tmp_path: Path) -> None:
    # 70° right, 40° clockwise: the marked end stands at 110°, below level; its axis leans 70° to the left.
    words = " ".join(card(tmp_path, row(skew_before=70.0, turn_shared=40.0)).text.split())
    assert "must stand 70.0° to the LEFT of upright seen from BEHIND" in words
    assert "seen from IN FRONT (marked end DOWN)." in words
    assert "marked end" not in card(tmp_path, row()).text


def test_dish_is_moved_to_a_satellite_that_differs_in_latitude_alone(tmp_path: Path) -> None:
    site = row(action="turn-at-changeover", azimuth_after=4.5, elevation_after=50.5)
    assert "The dish stays where it is" in card(tmp_path, site).text
    inclined = CardFacts(**_as_dict(FACTS) | {"incoming_latitude_deg": 1.0})
    assert "Move the DISH to the new satellite" in card(tmp_path, site, inclined).text


NO_SLACK = (0.0, 0.0)


def test_stops_send_the_feed_the_other_way_round() -> None:
    direct = plan_turning(60.0, 40.0, Feed(-95, 95), slack=NO_SLACK)
    # 60 + 40 = 100 lies behind the stop at 95; the same axis stands at 100 − 180 = −80: turn −140.
    assert direct.way is not None
    assert (direct.way.turn, direct.way.target, direct.way.swap) == (-140.0, -80.0, False)
    assert "stop" in direct.obstacle
    swapped = plan_turning(60.0, 40.0, Feed(-95, 95, ports=2), slack=NO_SLACK)
    # With two ports the target less a quarter turn does: 10, that is −50, and the leads exchanged.
    assert swapped.way is not None
    assert (swapped.way.turn, swapped.way.swap) == (-50.0, True)


def test_no_way_within_the_stops() -> None:
    found = plan_turning(0.0, 30.0, Feed(-20, 20), slack=NO_SLACK)
    assert found.way is None
    assert "stops" in found.obstacle


def test_swap_is_offered_only_where_it_saves_a_turn() -> None:
    offered = plan_turning(0.0, 80.0, Feed(ports=2), slack=NO_SLACK)
    assert offered.is_direct
    assert offered.shorter is not None
    assert (offered.shorter.turn, offered.shorter.swap) == (-10.0, True)
    assert plan_turning(0.0, 80.0, Feed(ports=1), slack=NO_SLACK).shorter is None
    assert plan_turning(0.0, 30.0, Feed(ports=2), slack=NO_SLACK).shorter is None


def test_fixed_feed_is_never_turned(tmp_path: Path) -> None:
    assert plan_turning(0.0, 88.0, Feed(fixed=True), slack=(85, 91)).way is None
    only_leads = plan_turning(0.0, 88.0, Feed(fixed=True, ports=2), slack=(85, 91)).way
    assert only_leads is not None
    assert (only_leads.turn, only_leads.swap) == (0.0, True)
    path = tmp_path / "cards.html"
    warnings = write_cards(path, None, table(row(feed_fixed=1)), FACTS)
    assert any("S1" in warning and "fixed" in warning for warning in warnings)
    (article,) = read(path).articles
    assert "report to the planner" in article.text
    assert not [shape for shape in article.shapes if shape[1] == "polyline.target"]


def test_dial_shows_tolerance_and_the_wrong_side() -> None:
    dial = Dial(True, present=10.0, turn=20.0, step=5.0, tolerance=(25.0, 35.0))
    strokes = [mark for mark in hands(dial) if isinstance(mark, Stroke) and mark.filled]

    def settings(ink: str) -> list[float]:
        points = [point for stroke in strokes if stroke.ink == ink for point in stroke.points]
        return [math.degrees(math.atan2(x, -y)) for x, y in points]

    assert min(settings("tolerance")) == pytest.approx(25.0)
    assert max(settings("tolerance")) == pytest.approx(35.0)
    # The turn is clockwise: the forbidden side lies counter-clockwise of the present mark.
    assert max(settings("wrong")) < 10.0
    assert min(settings("wrong")) >= 10.0 - 90.0 - 1e-9


HOSTILE = [
    "<script>document.title='run'</script>",
    "<img src=x onerror=\"document.title='run'\">",
    "\"><svg onload=document.title='run'>",
    "'><b>bold</b> & <i>",
    "{{7*7}} {% for %} {# #} ${7*7} `backtick`",
    "javascript:alert(1)",
    "مدرسة \N{RIGHT-TO-LEFT OVERRIDE}abc",
    "学校 \N{CROSS MARK} \N{GRINNING FACE}",
    "x" * 10_000,
    "tab\tline\nbell\x07end",
]


def hostile_table() -> pd.DataFrame:
    sites = [
        row(id=f"{k} {name}"[:9000], name=name, district=name, access=name) for k, name in enumerate(HOSTILE)
    ]
    return table(*sites, row(id="left <i>", name="<u>leave</u>", action="leave"))


def fullest_table() -> pd.DataFrame:
    """Cards with as much to say as can be."""
    rain = {f"{name}_rain": value - 3 for name, value in row().items() if name.startswith("margin_")}
    fullest = row(
        id="fullest", ports=2, turn_shared=70.0, setting_shared=-79.14, window_low=66.0, window_high=73.0,
        scale_zero_deg=0.0, feed_low_deg=-170.0, feed_high_deg=175.0, transmits=1, district="A" * 60,
        access="Ask for the key at the school's office; the roof is reached by the ladder behind the hall. " * 2,
        last_visit="2025-11-03", setting_deg=30.86, setting_source="inclinometer",
    )  # fmt: skip
    moved = row(id="moved", action="re-aim", azimuth_after=4.5, elevation_after=50.5, transmits=1)
    return table(*(site | rain for site in (fullest, moved, row())))


def test_hostile_texts_are_shown_literally_and_do_nothing(tmp_path: Path) -> None:
    path = tmp_path / "cards.html"
    facts = CardFacts(
        **_as_dict(FACTS) | {"title": HOSTILE[0], "outgoing": HOSTILE[1], "edition": HOSTILE[2]}
    )
    warnings = write_cards(path, None, hostile_table(), facts)
    reader = read(path)
    assert {tag for tag, _ in reader.tags}.isdisjoint(
        {"script", "img", "iframe", "object", "embed", "form", "i", "u"}
    )
    for tag, attributes in reader.tags:
        assert not [name for name in attributes if name.startswith("on")]
        if tag == "a":
            assert re.fullmatch(r"#card-\d+", attributes["href"] or "")
    assert any(
        tag == "meta" and "default-src 'none'" in (attributes.get("content") or "")
        for tag, attributes in reader.tags
    )
    for article, name in zip(reader.articles, HOSTILE, strict=True):
        shown = name.replace("\x07", "\N{WHITE SQUARE}").replace(
            "\N{RIGHT-TO-LEFT OVERRIDE}", "\N{WHITE SQUARE}"
        )
        assert shown in article.text
    assert any("too long for a square code" in warning for warning in warnings)


def test_hostile_texts_in_the_pdf(tmp_path: Path) -> None:
    path = tmp_path / "cards.pdf"
    warnings = write_cards(None, path, hostile_table(), FACTS)
    pages = [page.extract_text() for page in PdfReader(path).pages]
    assert len(pages) == len(HOSTILE) + 1
    assert "{{7*7}}" in pages[4]
    (lacking,) = [warning for warning in warnings if "the font lacks" in warning]
    assert "U+5B66" in lacking  # 学
    assert any("from right to left" in warning for warning in warnings)
    assert "\N{WHITE SQUARE}" in pages[7]


def test_browser_runs_nothing_and_prints_a_page_a_site(
    needs_tool: Callable[[str], str], tmp_path: Path
) -> None:
    chromium = needs_tool("chromium")
    path, printed = tmp_path / "cards.html", tmp_path / "printed.pdf"
    write_cards(
        path, None, pd.concat([fullest_table(), hostile_table()]), CardFacts(**_as_dict(FACTS) | OTHER_SLOT)
    )
    command = [
        chromium, "--headless", "--no-sandbox", "--disable-gpu", "--disable-quic", "--no-first-run",
        "--disable-background-networking", "--disable-component-update", "--disable-sync",
        f"--user-data-dir={tmp_path / 'profile'}",
    ]  # fmt: skip
    dumped = subprocess.run(
        [*command, "--dump-dom", path.as_uri()], check=True, capture_output=True, timeout=120
    )
    assert b"<title>Job cards: Lesson network</title>" in dumped.stdout
    subprocess.run(
        [*command, "--no-pdf-header-footer", f"--print-to-pdf={printed}", path.as_uri()],
        check=True, capture_output=True, timeout=120,
    )  # fmt: skip
    # The contents, then a page a card.
    texts = [page.extract_text() for page in PdfReader(printed).pages]
    starts = [k for k, text in enumerate(texts) if "WHAT TO DO" in text.upper()]
    assert len(starts) == 3 + len(HOSTILE)
    assert starts == list(range(starts[0], starts[0] + len(starts)))
    assert len(texts) == starts[-1] + 2  # and the list of the others


def test_pdf_text_equals_the_table(tmp_path: Path) -> None:
    path = tmp_path / "cards.pdf"
    sites = [row(id="A-1"), row(id="B-2", action="turn-at-changeover"), row(id="C-3", action="upgrade")]
    write_cards(None, path, table(*sites), FACTS)
    pages = [
        " ".join(page.extract_text().split()).replace("\N{MINUS SIGN}", "-") for page in PdfReader(path).pages
    ]
    assert len(pages) == 3
    assert "A-1" in pages[0]
    assert "turn it 10.5° COUNTER-CLOCKWISE" in pages[0]
    assert "the same turn goes CLOCKWISE." in pages[0]
    assert "20.4° to the RIGHT of upright seen from BEHIND" in pages[0]
    for value in (6.0625, 4.25, 4.125, -7.75, -1.1875):
        assert f"{value:+.1f} dB" in pages[0]
    assert "from -13.8° to -7.2° keeps what is asked" in pages[0]
    assert "turn it 21.0° COUNTER-CLOCKWISE" in pages[1]
    assert "C-3" in pages[2]
    assert "upgrade" in pages[2]


def test_fullest_card_fits_a_page_of_the_pdf(tmp_path: Path) -> None:
    path = tmp_path / "cards.pdf"
    facts = CardFacts(**_as_dict(FACTS) | OTHER_SLOT | {"availability_percent": 99.5, "overlap_hours": 6.0})
    write_cards(None, path, fullest_table(), facts)
    assert len(PdfReader(path).pages) == len(fullest_table())


def test_square_code_is_read_by_a_decoder(tmp_path: Path) -> None:
    zxingcpp = pytest.importorskip(
        "zxingcpp", reason="the reader of square codes (zxing-cpp) is not installed"
    )
    article = card(tmp_path, row(id="Ñandú 007"))
    side = 0
    dark = []
    for column, line, length in re.findall(r"M(\d+) (\d+)h(\d+)v", article.code):
        dark.append((int(line), int(column), int(length)))
        side = max(side, int(line) + 5)
    image = np.full((side, side), 255, np.uint8)
    for line_number, column_number, run in dark:
        image[line_number, column_number : column_number + run] = 0
    (found,) = zxingcpp.read_barcodes(np.kron(image, np.ones((6, 6), np.uint8)))
    assert found.text.splitlines() == [
        "SITE Ñandú 007",
        "TARGET +20.36 deg from upright, clockwise from behind",
        "TURN 10.50 deg counter-clockwise from behind",
    ]


def test_cards_follow_crew_and_day(tmp_path: Path) -> None:
    order = pd.DataFrame(
        {
            "id": ["c", "a", "d"],
            "crew": ["South", "North", "North"],
            "day": [date(2027, 5, 3), date(2027, 5, 10), date(2027, 5, 4)],
            "order": [1, 1, 2],
        }
    )
    path = tmp_path / "cards.html"
    write_cards(path, None, table(*(row(id=name) for name in "abcd")), FACTS, order=order)
    articles = read(path).articles
    assert [article.site for article in articles] == ["d", "a", "c", "b"]
    assert "Crew North · Tue 04 May 2027 · stop 2" in articles[0].text


def test_same_input_gives_the_same_bytes(tmp_path: Path) -> None:
    for name in ("one", "two"):
        write_cards(tmp_path / f"{name}.html", tmp_path / f"{name}.pdf", table(row()), FACTS)
    assert (tmp_path / "one.html").read_bytes() == (tmp_path / "two.html").read_bytes()
    assert (tmp_path / "one.pdf").read_bytes() == (tmp_path / "two.pdf").read_bytes()


def test_nothing_half_written_stays(tmp_path: Path) -> None:
    with pytest.raises(OutputError, match="does not exist"):
        write_cards(tmp_path / "missing" / "cards.html", None, table(row()), FACTS)
    assert list(tmp_path.iterdir()) == []


def test_stop_inside_the_window_ends_the_turn(tmp_path: Path) -> None:
    # By hand: from 30.86 the target 20.36 lies behind a stop at 22.0; the window reaches from 17.11 to 23.61,
    # so the feed goes to its stop: 8.86 counter-clockwise, 1.64 short.
    stopped = card(tmp_path, row(feed_low_deg=22.0, feed_high_deg=75.0))
    assert stopped.fields["turn_to_make"] == pytest.approx([-8.86])
    assert stopped.fields["target_to_reach"] == pytest.approx([22.0])
    assert stopped.fields["short_of_target"] == pytest.approx([1.64])
    assert "WRONG WAY, after the changeover" not in stopped.text
    # A stop at 25 lies outside of the window, and no other way is open.
    barred = plan_turning(30.86, -10.5, Feed(25.0, 75.0), slack=(-13.75, -7.25))
    assert barred.way is None
