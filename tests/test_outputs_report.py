"""The report as files: inert text, no network, the same bytes, tables readable out of the PDF, figures in grey."""

from __future__ import annotations

import base64
import hashlib
import re
from datetime import UTC, date, datetime
from html.parser import HTMLParser
from io import BytesIO

import numpy as np
import pytest
from PIL import Image
from pypdf import PdfReader

from geoskew.errors import InputError
from geoskew.layers import REGISTRY
from geoskew.outputs.report import (
    Base,
    Bullets,
    Field,
    Figures,
    Grid,
    Heading,
    Isoline,
    LoadFigure,
    MapFigure,
    Marks,
    Report,
    Words,
    write_report,
)
from geoskew.outputs.report.canvas import HATCHES, MARKERS
from geoskew.ramps import CLASS_COLOURS, CLASS_SHAPES

import geoskew.catalogue  # noqa: F401, isort: skip  (fills the registry)

HOSTILE = "<script>alert('1')</script>\"&#x202e;\x00$x_1$ 電波"
CLASSES = ((0, "leave"), (1, "preset"))


def map_figure(layer="action"):
    x, y = np.linspace(-70.5, -60.5, 21), np.linspace(-20.5, -35.5, 31)
    if layer == "action":
        values = np.where(x[None, :] + 0.0 * y[:, None] > -65.0, 1, 0).astype(np.uint8)
        field = Field(REGISTRY[layer], values, x, y)
    else:
        line = Isoline(-2.0, np.column_stack([np.full(31, -65.0), y]))
        field = Field(
            REGISTRY[layer], x[None, :] + 65.0 + 0.0 * y[:, None], x, y, lines=(line,), thick=(0.0,)
        )
    ring = np.array([[-72.0, -19.0], [-59.0, -19.0], [-59.0, -37.0], [-72.0, -37.0], [-72.0, -19.0]])
    marks = Marks(np.array([-68.0, -62.0]), np.array([-25.0, -30.0]), np.array([0, 1]), CLASSES)
    return MapFigure(f"A map {HOSTILE}", "A map", Base((-72.0, -37.0, -59.0, -19.0), (ring,)), field, marks)


def load_figure(crews=("North", HOSTILE)):
    visits = np.arange(len(crews) * 3).reshape(len(crews), 3)
    days = tuple(date(2027, 5, day) for day in (3, 4, 5))
    return LoadFigure("Load. Unit: visits a day.", "Bars", days, tuple(crews), visits, date(2027, 5, 5))


def report():
    rows = tuple((f"site {n}", f"{-n / 10:.1f}") for n in range(1, 4))
    return Report(
        title=f"Report {HOSTILE}",
        subtitle="before and after",
        foot=f"foot {HOSTILE}",
        dated=datetime(2027, 5, 18, 3, tzinfo=UTC),
        blocks=(
            Heading("One"),
            Words(f"words {HOSTILE}"),
            Bullets((f"bullet {HOSTILE}",), small=True),
            Grid(f"caption {HOSTILE}", ("site", "dB"), (*rows, (HOSTILE, "1")), "lr", (80, 20)),
            Figures((map_figure(), map_figure("margin_untouched"))),
            Heading("Two", new_page=True),
            Figures((load_figure(),)),
        ),
    )


@pytest.fixture(scope="module")
def written(tmp_path_factory):
    folder = tmp_path_factory.mktemp("report")
    remarks = write_report(report(), folder / "r.html", folder / "r.pdf")
    return folder, remarks


class Elements(HTMLParser):
    """Every element with its attributes, and all text outside of the style sheet."""

    def __init__(self):
        super().__init__()
        self.found, self.words, self._in = [], [], ""

    def handle_starttag(self, tag, attrs):
        self.found.append((tag, dict(attrs)))
        self._in = tag

    def handle_data(self, data):
        if self._in != "style":
            self.words.append(data)


def test_html_is_inert_and_asks_no_network(written):
    text = (written[0] / "r.html").read_text(encoding="utf-8")
    page = Elements()
    page.feed(text)
    names = {tag for tag, _ in page.found}
    assert not names & {"script", "link", "iframe", "object", "embed", "form", "base"}
    for tag, attributes in page.found:
        assert not [name for name in attributes if name.startswith("on") or name in ("style", "href")]
        if "src" in attributes:
            assert tag == "img"
            assert attributes["src"].startswith("data:image/png;base64,")
            assert attributes["alt"]
    policy = next(a["content"] for tag, a in page.found if a.get("http-equiv") == "Content-Security-Policy")
    style = re.search(r"<style>(.*?)</style>", text, re.DOTALL)[1]
    digest = base64.b64encode(hashlib.sha256(style.encode()).digest()).decode()
    assert policy.split("; ")[:3] == ["default-src 'none'", "img-src data:", f"style-src 'sha256-{digest}'"]
    shown = HOSTILE.replace("\x00", "□")
    for start in ("Report ", "words ", "bullet ", "caption ", "foot "):
        assert start + shown in "".join(page.words)


def test_same_content_same_bytes(written, tmp_path):
    write_report(report(), tmp_path / "r.html", tmp_path / "r.pdf")
    for name in ("r.html", "r.pdf"):
        assert (tmp_path / name).read_bytes() == (written[0] / name).read_bytes()


def test_pdf_has_the_tables_as_text_and_says_what_the_font_lacks(written):
    folder, remarks = written
    reader = PdfReader(folder / "r.pdf")
    text = "\n".join(page.extract_text() for page in reader.pages)
    for n in range(1, 4):
        assert re.search(rf"site {n}\s+{-n / 10:.1f}", text)
    assert "<script>alert('1')</script>" in text
    assert re.search(r"Two\n", reader.pages[-1].extract_text())
    assert len(remarks) == 1
    assert "U+96FB" in remarks[0]  # the first of the two signs that DejaVu Sans does not have
    for page in reader.pages:
        assert [round(float(side)) for side in page.mediabox[2:]] == [595, 842]


def pictures(folder):
    text = (folder / "r.html").read_text(encoding="utf-8")
    found = re.findall(r"data:image/png;base64,([A-Za-z0-9+/=]+)", text)
    return [Image.open(BytesIO(base64.b64decode(one))) for one in found]


def test_figures_are_numbered_and_large_enough_to_print(written):
    drawn = pictures(written[0])
    assert len(drawn) == 3
    for picture, width in zip(drawn, (88.0, 88.0, 180.0), strict=True):
        assert picture.width / (width / 25.4) >= 150.0  # dots per inch on paper
    text = (written[0] / "r.html").read_text(encoding="utf-8")
    assert [int(one) for one in re.findall(r"<b>Figure (\d)\.</b>", text)] == [1, 2, 3]


def test_areas_tell_apart_in_grey(written):
    grey = np.asarray(pictures(written[0])[0].convert("L"), dtype=float)
    middle = grey[grey.shape[0] // 3, :]
    left, right = (
        middle[int(0.35 * len(middle)) : int(0.45 * len(middle))],
        middle[int(0.6 * len(middle)) : int(0.7 * len(middle))],
    )
    assert np.median(left) - np.median(right) > 30.0


def test_no_two_classes_share_hatching_or_marker():
    assert set(HATCHES) == set(CLASS_COLOURS)
    assert len(set(HATCHES.values())) == len(HATCHES)
    markers = [MARKERS[CLASS_SHAPES[code]] for code in CLASS_SHAPES]
    assert len(set(markers)) == len(markers)


def test_many_crews_are_drawn_as_a_few(tmp_path):
    crews = [f"crew {n}" for n in range(40)]
    content = Report("Crews", "", "", datetime(2027, 1, 1, tzinfo=UTC), (Figures((load_figure(crews),)),))
    assert write_report(content, tmp_path / "r.html") == []


def test_a_table_that_does_not_fit_together_is_refused():
    with pytest.raises(ValueError, match="different numbers"):
        Grid("caption", ("a", "b"), (("1",),), "ll", (50, 50))


def test_unknown_ending(tmp_path):
    with pytest.raises(InputError, match=r"written as \.html or \.pdf"):
        write_report(report(), tmp_path / "r.docx")
