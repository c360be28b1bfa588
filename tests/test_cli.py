"""The command line: every command's exit status, what it says and where, and the files it leaves."""

from __future__ import annotations

import csv
import json
import re
import shutil
import sqlite3
from pathlib import Path
from typing import NamedTuple

import pytest
from small_scenarios import PLAIN, contents, plain, small

import geoskew.catalogue  # noqa: F401  (fills the registry)
from geoskew import __version__
from geoskew.cli import main
from geoskew.cli.main import COMMANDS
from geoskew.layers import REGISTRY

DIRTY = 5  # rows of the southern list that cannot be used, as `small` copies them


class Said(NamedTuple):
    """What a command line came to."""

    status: int
    out: str
    err: str

    @property
    def lines(self) -> list[str]:
        """Lines on standard error."""
        return self.err.splitlines()


class Caller:
    """Runs command lines in this process."""

    def __init__(self, capsys: pytest.CaptureFixture[str]) -> None:
        self._capsys = capsys

    def __call__(self, *arguments: str | Path) -> Said:
        self._capsys.readouterr()
        status = main([str(argument) for argument in arguments])
        return Said(status, *self._capsys.readouterr())


@pytest.fixture
def call(capsys: pytest.CaptureFixture[str]) -> Caller:
    return Caller(capsys)


@pytest.fixture(scope="module")
def cone(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """The southern scenario, small, with the rows that cannot be used."""
    folder = tmp_path_factory.mktemp("inputs") / "a cone ñ"
    return small("southern-cone", folder, rows=(0, 1, 40, 80, 120, 160, 200), dirty=True)


@pytest.fixture(scope="module")
def posts(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """The scenario with another slot, across 180°, without rows that cannot be used."""
    return small("slot-change", tmp_path_factory.mktemp("inputs") / "posts", rows=(0, 3, 7, 12, 16, 17))


# --- help ------------------------------------------------------------------------------------------


@pytest.mark.parametrize("command", COMMANDS)
def test_help_of_every_command_has_an_example(call: Caller, command: str) -> None:
    said = call(command, "--help")
    assert (said.status, said.err) == (0, "")
    assert re.search(rf"Examples?: geoskew {command}\b", said.out)
    assert max(map(len, said.out.splitlines())) <= 100
    assert call(command, "-h").out == said.out


def test_help_lists_every_command_with_what_it_does(call: Caller) -> None:
    said = call("--help")
    assert said.status == 0
    for name, what in COMMANDS.items():
        assert re.search(rf"^  {name} +{what[:20]}", said.out, re.MULTILINE)
    assert call().out == said.out


def test_version(call: Caller) -> None:
    assert call("--version") == (0, f"geoskew, version {__version__}\n", "")


# --- commands that read no scenario ----------------------------------------------------------------


def test_layers_lists_name_unit_meaning(call: Caller) -> None:
    said = call("layers")
    assert (said.status, said.err) == (0, "")
    assert [line.split()[0] for line in said.out.splitlines()] == list(REGISTRY)
    rows = json.loads(call("layers", "--json").out)
    assert [row["name"] for row in rows] == list(REGISTRY)
    assert all(row["meaning"] for row in rows)


def test_new_writes_a_scenario_and_replaces_none(call: Caller, tmp_path: Path) -> None:
    file = tmp_path / "my plan.toml"
    assert call("new", file).status == 0
    first = file.read_bytes()
    again = call("new", file)
    assert (again.status, again.out, len(again.lines)) == (2, "", 1)
    assert "already exists" in again.err
    assert "--overwrite" in again.err
    file.write_text("mine")
    assert call("new", file, "--overwrite", "-q") == (0, "", "")
    assert file.read_bytes() == first


# --- check -----------------------------------------------------------------------------------------


def test_check_tells_what_a_run_would_write(call: Caller, posts: Path) -> None:
    said = call("check", posts)
    assert (said.status, said.err) == (0, "")
    assert "13 × 8 cells of 2°" in said.out
    assert "6 usable rows of posts.csv" in said.out
    assert call("check", posts, "-q") == (0, "", "")


def test_check_finds_rejected_rows_wrong(call: Caller, cone: Path) -> None:
    said = call("check", cone)
    assert said.status == 2
    assert len(said.lines) == DIRTY + 1
    assert said.lines[-1].startswith(f"geoskew: {DIRTY} problems found; a run sets these rows aside")
    assert all(re.match(r"geoskew: .*/a cone ñ/sites\.csv:\d+: ", line) for line in said.lines[:-1])
    assert "latitude and longitude look exchanged" in said.err
    assert "cells of 2°" in said.out  # what a run would write is told all the same


def test_check_lists_problems_of_all_inputs_once(call: Caller, tmp_path: Path) -> None:
    text = PLAIN.replace("eirp_dbw = 50.0", 'eirp_raster = "a.tif"').replace(
        "bounds_deg = [-70.0, -40.0, -60.0, -30.0]", 'outline = "outline.gpkg"'
    )
    path = plain(tmp_path, text, "id,lat,lon\nA,x,-65\nB,-33,-65\n")
    for name in ("a.tif", "outline.gpkg"):
        (tmp_path / name).write_text("nothing of the kind")
    said = call("check", path)
    assert said.status == 2
    files = [re.match(r"geoskew: .*/([a-z.]+)", line) for line in said.lines[:-1]]
    assert [found and found[1] for found in files] == ["a.tif", "outline.gpkg", "sites.csv"]
    assert "lat 'x' is not a number" in said.lines[2]


# --- spot ------------------------------------------------------------------------------------------


def test_spot_gives_every_layer(call: Caller, cone: Path) -> None:
    said = call("spot", cone, "--at=-33.9,-60.6")
    assert (said.status, said.err) == (0, "")
    heading, empty, *rows = said.out.splitlines()
    assert (heading, empty) == ("-33.9, -60.6 (latitude, longitude), height not known", "")
    names = [line.split()[0] for line in rows]
    assert {"skew_after", "action", "margin_untouched_rain"} <= set(names)
    values = json.loads(call("spot", cone, "--at", "-33.9,-60.6", "--json").out)
    assert list(values) == names
    assert isinstance(values["action"], str)
    assert all(value is not None for name, value in values.items() if not name.startswith("margin_marked"))


def test_spot_says_null_where_there_is_no_value(call: Caller, posts: Path) -> None:
    # The other side of the Earth: neither satellite is seen from Cape Town's longitude.
    said = call("spot", posts, "--at=-33.9,18.4", "--json")
    assert (said.status, said.err) == (0, "")
    values = json.loads(said.out)
    assert values["margin_before"] is None
    assert values["action"] == "no-sight"
    assert "no value" in call("spot", posts, "--at=-33.9,18.4").out


def test_spot_takes_height_and_gives_a_budget(call: Caller, cone: Path) -> None:
    low, high = (
        json.loads(call("spot", cone, "--at=-33.9,-60.6", "--json", "--height", height).out)
        for height in ("0", "3000")
    )
    assert high["range_after"] < low["range_after"]
    assert high["rain_after"] < low["rain_after"]
    budget = call("spot", cone, "--at=-33.9,-60.6", "--budget")
    assert (budget.status, budget.err) == (0, "")
    assert "EIRP" in budget.out
    assert isinstance(json.loads(call("spot", cone, "--at=-33.9,-60.6", "--budget", "--json").out), dict)


def test_spot_and_raster_need_no_site_list_to_exist(call: Caller, tmp_path: Path) -> None:
    path = plain(tmp_path / "in", sites=None)
    assert call("spot", path, "--at=-33,-65", "--budget").status == 0
    assert call("spot", path, "--at=-33,-65").status == 0
    assert call("raster", path, "--out", tmp_path / "out", "--layer", "action").status == 0
    assert call("contours", path, "--out", tmp_path / "c.gpkg", "--layer", "skew_after").status == 0
    assert call("sites", path, "--out", tmp_path / "s.csv").status == 2


# --- raster, contours ------------------------------------------------------------------------------


def test_raster_writes_the_layers_asked_for(call: Caller, cone: Path, tmp_path: Path) -> None:
    import rasterio

    out = tmp_path / "deep" / "layers"
    said = call(
        "raster", cone, "--out", out, "--layer", "skew_after", "--layer", "action", "--nodata", "-9999"
    )
    assert (said.status, said.out) == (0, "")
    assert said.lines == [
        f"geoskew: wrote 2 layers into {out}; margins in rain at 99.6 % availability decide"
    ]
    assert sorted(contents(out)) == ["action.tif", "skew_after.tif"]
    with rasterio.open(out / "skew_after.tif") as skew, rasterio.open(out / "action.tif") as action:
        assert (skew.nodata, action.nodata) == (-9999.0, 255.0)
    first = contents(out)
    again = call("raster", cone, "--out", out, "--layer", "action", "--workers", "1", "-q")
    assert again == (0, "", "")
    assert contents(out) == first


def test_raster_without_a_name_writes_all_that_the_scenario_can_give(call: Caller, tmp_path: Path) -> None:
    path = plain(tmp_path / "in")
    assert call("raster", path, "--out", tmp_path / "out", "--precision", "full").status == 0
    given = set(json.loads(call("spot", path, "--at=-33,-65", "--json").out))
    written = {Path(name).stem for name in contents(tmp_path / "out")}
    assert written == {name for name in given if REGISTRY[name].where == "both"}


def test_contours(call: Caller, posts: Path, tmp_path: Path) -> None:
    file = tmp_path / "c.gpkg"
    said = call("contours", posts, "--out", file, "--layer", "skew_after", "--every", "5")
    assert (said.status, said.out) == (0, "")
    with sqlite3.connect(file) as base:
        rows = base.execute("SELECT level, unit, layer FROM skew_after").fetchall()
    assert rows
    assert {(level % 5.0, unit, layer) for level, unit, layer in rows} == {(0.0, "deg", "skew_after")}
    assert contents(tmp_path).keys() == {"c.gpkg"}


# --- site lists ------------------------------------------------------------------------------------


@pytest.mark.parametrize("ending", [".csv", ".gpkg", ".geojson", ".parquet", ".xlsx"])
def test_sites_in_every_format_with_the_rejected_rows_beside(
    call: Caller, cone: Path, tmp_path: Path, ending: str
) -> None:
    file = tmp_path / f"assessed{ending}"
    said = call("sites", cone, "--out", file)
    assert (said.status, said.out) == (0, "")
    told = [line for line in said.lines if "could not be used" in line]
    assert told == [f"geoskew: {DIRTY} rows of sites.csv could not be used; see {tmp_path / 'rejected.csv'}"]
    assert contents(tmp_path).keys() == {file.name, "rejected.csv"}
    with (tmp_path / "rejected.csv").open(encoding="utf-8", newline="") as stream:
        header, *rows = csv.reader(stream)
    assert header == ["line", "id", "reason", "row"]
    assert len(rows) == DIRTY
    quiet = call("sites", cone, "--out", file, "--overwrite", "-q")
    assert quiet.lines == told


def test_assessed_table_has_given_columns_layers_then_the_rest(
    call: Caller, cone: Path, tmp_path: Path
) -> None:
    assert call("sites", cone, "--out", tmp_path / "s.csv").status == 0
    with (tmp_path / "s.csv").open(encoding="utf-8", newline="") as stream:
        rows = list(csv.DictReader(stream))
    names = list(rows[0])
    assert names[:3] == ["id", "lat", "lon"]
    assert names[-2:] == ["country", "pupils"]
    layers = [name for name in names if name in REGISTRY]
    assert names.index("last_visit") < names.index(layers[0])
    assert names.index(layers[-1]) < names.index("country")
    assert rows[0]["lat"] == "-22.104"
    # The table and the spot agree where no column of the list overrides the terminal.
    assert re.fullmatch(r"-?\d+\.\d{4,}", rows[0]["skew_after"])


def test_strict_stops_at_rejected_rows(call: Caller, cone: Path, tmp_path: Path) -> None:
    for command, name in (("sites", "s.csv"), ("cards", "c.html"), ("visits", "v.csv"), ("run", "out")):
        said = call(command, cone, "--out", tmp_path / name, "--strict")
        assert (said.status, said.out, len(said.lines)) == (2, "", DIRTY)
    assert contents(tmp_path) == {}


def test_no_usable_row_is_wrong_input(call: Caller, tmp_path: Path) -> None:
    path = plain(tmp_path / "in", sites="id,lat,lon\nA,x,-65\nB,91,-65\n")
    said = call("sites", path, "--out", tmp_path / "s.csv")
    assert (said.status, said.out) == (2, "")
    assert "no row can be used: all 2 are rejected" in said.err
    assert contents(tmp_path).keys() == {"in", "in/plan.toml", "in/sites.csv"}


def test_a_list_of_ours_beside_is_replaced_a_foreign_one_is_not(call: Caller, tmp_path: Path) -> None:
    path = plain(tmp_path / "in")
    assert call("sites", path, "--out", tmp_path / "a.csv").status == 0
    assert call("sites", path, "--out", tmp_path / "b.csv").status == 0
    (tmp_path / "rejected.csv").write_text("line,why\n1,mine\n")
    said = call("sites", path, "--out", tmp_path / "c.csv")
    assert (said.status, len(said.lines)) == (2, 1)
    assert "rejected.csv already exists" in said.err
    assert not (tmp_path / "c.csv").exists()


@pytest.mark.parametrize("name", ["v.csv", "v.gpkg", "v.ics", "v.xlsx"])
def test_visits(call: Caller, cone: Path, tmp_path: Path, name: str) -> None:
    said = call("visits", cone, "--out", tmp_path / name)
    assert (said.status, said.out) == (0, "")
    assert re.search(r"wrote .*: \d+ visits on \d+ crew days", said.err)
    assert contents(tmp_path).keys() == {name, "rejected.csv"}


@pytest.mark.parametrize("name", ["c.html", "c.pdf"])
def test_cards(call: Caller, posts: Path, tmp_path: Path, name: str) -> None:
    said = call("cards", posts, "--out", tmp_path / name)
    assert (said.status, said.out) == (0, "")
    assert contents(tmp_path).keys() == {name, "rejected.csv"}


def test_fieldmap(call: Caller, posts: Path, tmp_path: Path) -> None:
    said = call("fieldmap", posts, "--out", tmp_path / "m.html", "--layer", "skew_after", "--blur", "0.5")
    assert (said.status, said.out) == (0, "")
    assert contents(tmp_path).keys() == {"m.html", "rejected.csv"}
    kept = call("fieldmap", posts, "--out", tmp_path / "n.html", "--only", "island=Viti Levu", "-q")
    assert kept == (0, "", "")


# --- run -------------------------------------------------------------------------------------------


@pytest.fixture(scope="module", params=["southern-cone", "slot-change"])
def ran(
    request: pytest.FixtureRequest, cone: Path, posts: Path, tmp_path_factory: pytest.TempPathFactory
) -> tuple[Path, Path]:
    """A scenario and the folder that a run of it left."""
    path = cone if request.param == "southern-cone" else posts
    out = tmp_path_factory.mktemp("run") / "out put"
    assert main(["run", str(path), "--out", str(out), "-q"]) == 0
    return path, out


def test_run_leaves_what_check_foretells(call: Caller, ran: tuple[Path, Path]) -> None:
    path, out = ran
    foretold = [line.strip() for line in call("check", path).out.splitlines() if line.startswith("  DIR/")]
    files = {name for name in contents(out) if (out / name).is_file()}
    assert {line.removeprefix("DIR/") for line in foretold} == files
    assert {"contours.gpkg", "sites.gpkg", "sites.csv", "rejected.csv", "fieldmap.html"} <= files
    assert {"cards.html", "cards.pdf", "visits.csv", "summary.json", "columns.csv"} <= files


def test_check_foretells_the_bytes_of_a_run(call: Caller, ran: tuple[Path, Path]) -> None:
    path, out = ran
    (told,) = re.findall(r"a run writes \d+ files, about ([\d.]+) MB in all", call("check", path).out)
    written = sum(file.stat().st_size for file in out.rglob("*") if file.is_file())
    assert 0.5 < float(told) * 1e6 / written < 2.0


def test_a_second_run_gives_the_same_bytes(call: Caller, ran: tuple[Path, Path]) -> None:
    path, out = ran
    first = contents(out)
    said = call("run", path, "--out", out)
    assert (said.status, said.out) == (0, "")
    assert f"everything is in {out}" in said.err
    assert contents(out) == first


def test_run_keeps_foreign_files_unless_told(call: Caller, tmp_path: Path) -> None:
    path = plain(tmp_path / "in")
    out = tmp_path / "out"
    out.mkdir()
    (out / "sites.csv").write_text("mine")
    (out / "notes.txt").write_text("mine too")
    before = contents(tmp_path)
    said = call("run", path, "--out", out)
    assert (said.status, said.out, len(said.lines)) == (2, "", 1)
    assert str(out / "sites.csv") in said.err
    assert contents(tmp_path) == before
    assert call("run", path, "--out", out, "--overwrite", "-q").status == 0
    assert (out / "notes.txt").read_text() == "mine too"
    # Inputs are replaced by nothing, whatever is asked for.
    said = call("run", path, "--out", path.parent, "--overwrite")
    assert (said.status, len(said.lines)) == (2, 1)
    assert "is an input of this scenario" in said.err


def test_run_without_a_region_or_without_sites(call: Caller, tmp_path: Path) -> None:
    region = PLAIN[: PLAIN.index("[region]")] + PLAIN[PLAIN.index("[sites]") :]
    assert call("run", plain(tmp_path / "a", region), "--out", tmp_path / "listed", "-q").status == 0
    assert not (tmp_path / "listed" / "layers").exists()
    assert (tmp_path / "listed" / "cards.html").exists()
    sites = PLAIN.replace('[sites]\nfile = "sites.csv"\n', "")
    assert call("run", plain(tmp_path / "b", sites, None), "--out", tmp_path / "mapped", "-q").status == 0
    assert not (tmp_path / "mapped" / "sites.csv").exists()
    assert (tmp_path / "mapped" / "fieldmap.html").exists()


def test_demo_runs_a_bundled_scenario_into_a_folder_of_its_own(
    call: Caller, posts: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    asked = []

    def found(name: str) -> Path:
        asked.append(name)
        return posts

    monkeypatch.setattr("geoskew.resources.demo_scenario", found)
    monkeypatch.chdir(tmp_path)
    said = call("demo", "--scenario", "slot-change")
    assert (said.status, said.out, asked) == (0, "", ["slot-change"])
    (folder,) = tmp_path.iterdir()
    assert "slot-change" in folder.name
    assert (folder / "summary.json").is_file()
    assert call("demo", "--out", tmp_path / "here", "-q") == (0, "", "")
    assert asked[-1] == "southern-cone"
    shutil.rmtree(tmp_path / "here")
