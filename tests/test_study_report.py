"""The planner's report and the comparison of two plans: figures of the text against the tables they come from."""

from __future__ import annotations

import json
import re
import shutil

import numpy as np
import pandas as pd
import pytest
import rasterio
from pypdf import PdfReader

from geoskew.cli import main
from geoskew.outputs.report import Figures, Grid, MapFigure
from geoskew.resources import demo_scenario
from geoskew.study.core import Study
from geoskew.study.report import report_of

MARGINS = (
    "margin_before",
    "margin_untouched",
    "margin_shared_before",
    "margin_shared_after",
    "margin_realigned",
)


def changed(folder, name, **lines):
    """A copy of the scenario in which whole lines are replaced, by the key that they set."""
    text = (folder / "scenario.toml").read_text(encoding="utf-8")
    for key, value in lines.items():
        text, count = re.subn(rf"(?m)^{key} = .*$", f"{key} = {value}", text)
        assert count >= 1
    path = folder / name
    path.write_text(text, encoding="utf-8")
    return path


@pytest.fixture(scope="module")
def folder(tmp_path_factory):
    made = tmp_path_factory.mktemp("report") / "plan"
    shutil.copytree(demo_scenario().parent, made)
    changed(made, "scenario.toml", step_deg="0.5")
    return made


@pytest.fixture(scope="module")
def study(folder):
    return Study(folder / "scenario.toml")


@pytest.fixture(scope="module")
def content(study):
    return report_of(study)


def table(content, start):
    return next(one for one in content.blocks if isinstance(one, Grid) and one.caption.startswith(start))


def test_counts_are_those_of_the_assessed_table(study, content):
    rows = table(content, "Sites, and true area").rows
    counts = study.assessed.table["action"].value_counts()
    assert {row[0]: int(row[2]) for row in rows} == {row[0]: int(counts.get(row[0], 0)) for row in rows}
    assert sum(float(row[4]) for row in rows) == pytest.approx(100.0, abs=0.3)  # rounded to 0.1


def test_both_satellites_and_all_carriers_are_said(study, content):
    text = " ".join(" ".join(row) for row in table(content, "Satellites and carriers").rows)
    scenario = study.scenario
    assert scenario.outgoing.name in text
    assert scenario.incoming.name in text
    assert "66.2° west" in text
    for one in scenario.carriers_before:
        assert f"{one.polarisation}, {one.frequency_ghz:g} GHz" in text


def test_worst_sites_are_the_worst(study, content):
    ours = study.assessed.table
    rows = table(content, "The 6 sites").rows
    expected = ours.sort_values("margin_untouched_rain", kind="stable")["id"].head(6)
    assert [row[0].split("  ")[0] for row in rows] == list(expected)


def test_every_figure_has_caption_unit_and_source(content):
    items = [item for block in content.blocks if isinstance(block, Figures) for item in block.items]
    assert len(items) == 5
    for item in items:
        assert "Unit: " in item.caption
        assert "Source: " in item.caption
        assert item.alt
    margins = [
        item
        for item in items
        if isinstance(item, MapFigure) and item.shown and item.shown.thick == (0.0, 1.0)
    ]
    assert len(margins) == 2
    assert all({line.level for line in item.shown.lines} >= {0.0, 1.0} for item in margins)


def test_two_to_four_pages(folder, capsys):
    out = folder / "report.pdf"
    assert main(["report", str(folder / "scenario.toml"), "--out", str(out)]) == 0
    pages = PdfReader(out).pages
    assert 2 <= len(pages) <= 4
    text = " ".join(page.extract_text() for page in pages)
    for words in (
        "What changes",
        "What is to be done",
        "How sure is the plan",
        "Crews",
        "Assumptions and editions",
    ):
        assert words in text
    assert "Local codes and licensed practice prevail" in text
    assert "ITU-R P.618-14" in text


def test_report_without_a_changeover_is_refused(folder, capsys):
    text = (folder / "scenario.toml").read_text(encoding="utf-8")
    path = folder / "bare.toml"
    path.write_text(re.sub(r"(?m)^changeover = .*$", "", text), encoding="utf-8")
    assert main(["report", str(path), "--out", str(folder / "bare.pdf")]) == 2
    assert "changeover" in capsys.readouterr().err
    assert not (folder / "bare.pdf").exists()


@pytest.fixture(scope="module")
def compared(folder):
    """A plan with half a dB less reserve and two sites less, against the bundled one."""
    rows = (folder / "sites.csv").read_text(encoding="utf-8").splitlines(keepends=True)
    (folder / "fewer.csv").write_text("".join(rows[:1] + rows[3:]), encoding="utf-8")
    path = changed(folder, "this.toml", reserve_db="0.5", file='"fewer.csv"')
    out = folder / "out"
    out.mkdir()
    options = ["--against", str(folder / "scenario.toml"), "--out", str(out / "d.html"), "-q"]
    assert main(["report", str(path), *options]) == 0
    return path, out


def test_compared_sites(study, compared):
    path, out = compared
    found = pd.read_csv(out / "d-sites.csv", keep_default_na=False)
    here, there = Study(path).assessed.table.set_index("id"), study.assessed.table.set_index("id")
    assert set(found["id"]) == set(here.index) | set(there.index)
    alone = set(there.index) - set(here.index)
    assert len(alone) == 2
    assert set(found.loc[found["only_in"] == "other", "id"]) == alone
    both = found[found["only_in"] == ""].set_index("id")
    differ = here.loc[both.index, "action"] != there.loc[both.index, "action"]
    assert np.array_equal(both["changed"] == 1, differ)
    assert differ.sum() > 20
    for name in MARGINS:
        gain = here.loc[both.index, f"{name}_rain"] - there.loc[both.index, f"{name}_rain"]
        np.testing.assert_allclose(both[f"gain_{name}"].replace("", np.nan).astype(float), gain, atol=2e-6)


def test_difference_over_the_region_and_against_a_run(folder, compared, capsys):
    stronger = changed(folder, "stronger.toml", eirp_offset_db="-2.5")
    plan, run = str(folder / "scenario.toml"), folder / "run"
    run.mkdir()
    # What a comparison reads of a run, by the commands that write the same files.
    layers = ["--layer", "margin_untouched_rain", "--layer", "margin_realigned_rain"]
    assert main(["raster", plan, "--out", str(run / "layers"), "-q", *layers]) == 0
    assert main(["sites", plan, "--out", str(run / "sites.csv"), "-q"]) == 0
    summary = {"title": "A run", "judged": "margins in rain decide", "judged_in": "rain"}
    (run / "summary.json").write_text(json.dumps(summary), encoding="utf-8")
    gains = {}
    for kind, other in (("scenario", folder / "scenario.toml"), ("run", run)):
        out = folder / f"against-{kind}"
        out.mkdir()
        assert (
            main(["report", str(stronger), "--against", str(other), "--out", str(out / "d.pdf"), "-q"]) == 0
        )
        with rasterio.open(out / "gain_margin_realigned.tif") as source:
            gains[kind] = source.read(1)
            assert source.units[0] == "dB"
            assert source.tags()["COMPARED_WITH"]
        table = pd.read_csv(out / "d-sites.csv")
        # 1.5 dB more of the new satellite: between nothing and all of it reaches the margin.
        assert table["gain_margin_realigned"].dropna().between(0.0, 1.5).all()
        assert (table["gain_margin_realigned"] > 0.3).sum() > 200
    known = np.isfinite(gains["scenario"])
    assert np.array_equal(known, np.isfinite(gains["run"]))
    # A run stores margins to 2^-10 dB.
    np.testing.assert_allclose(gains["run"][known], gains["scenario"][known], atol=2.0**-9)


def test_what_is_no_plan_is_refused(folder, tmp_path, capsys):
    options = ["--against", str(tmp_path), "--out", str(tmp_path / "d.pdf")]
    assert main(["report", str(folder / "scenario.toml"), *options]) == 2
    assert "give a scenario file or the folder of a finished run" in capsys.readouterr().err
    assert not list(tmp_path.iterdir())
