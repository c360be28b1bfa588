"""The commented scenario to start from, and the fingerprints of a scenario and its files."""

from __future__ import annotations

import hashlib
import pickle
import re
import tomllib
from pathlib import Path

import pydantic
import pytest

from geoskew.errors import InputError
from geoskew.scenario import TEMPLATE, Scenario, load
from geoskew.scenario.document import KNOWN


def read(folder: Path, text: str) -> Scenario:
    path = folder / "study.toml"
    path.write_text(text, encoding="utf-8")
    return load(path)


def test_the_template_loads_as_it_is_and_needs_no_file(tmp_path: Path) -> None:
    scenario = read(tmp_path, TEMPLATE)
    assert scenario.input_files == {}
    assert scenario.changeover is not None
    assert scenario.region is not None
    assert all(len(line) <= 110 for line in TEMPLATE.splitlines())


def uncommented(*, without: tuple[str, ...]) -> str:
    """Return the template with every key in use but those that exclude each other."""
    text = re.sub(r"(?m)^#(?=[\[a-z])", "", TEMPLATE)
    for key in without:
        text = re.sub(rf"(?m)^{key} = .*\n", "", text)
    return text


def test_every_key_of_the_template_is_right_once_in_use(tmp_path: Path) -> None:
    for name in ("sites.csv", "dem.tif", "clutter.tif", "distances.csv"):
        (tmp_path / name).touch()
    without = (
        "eirp_contours",
        "eirp_raster",
        "beam",
        "required_es_n0_db",
        "outline",
        "crs",
        "step_m",
        "query",
    )
    scenario = read(tmp_path, uncommented(without=without))
    assert scenario.carriers_after[0].frequency_ghz == 12.05
    assert scenario.judged_in == "clear"
    assert scenario.neighbours
    assert scenario.crews
    assert scenario.visits


def test_the_template_shows_every_known_key_and_its_default(tmp_path: Path) -> None:
    document = tomllib.loads(uncommented(without=()))
    for table, keys in KNOWN.items():
        if len(table) != 1 or table == ("incoming",):
            continue
        found = document[table[0]]
        found = found[0] if isinstance(found, list) else found
        missing = set(keys) - set(found) - {"carrier", "name"}
        assert not missing, (table, missing)
    plain = read(tmp_path, TEMPLATE)
    for key, value in document["terminal"].items():
        if key != "receive_mask":
            assert getattr(plain.terminal, key) == value, key


def test_checksums_are_those_of_the_files(tmp_path: Path) -> None:
    (tmp_path / "tiles").mkdir()
    (tmp_path / "tiles" / "a.tif").write_bytes(b"a")
    (tmp_path / "tiles" / "b.tif").write_bytes(b"b")
    scenario = read(tmp_path, TEMPLATE + '[terrain]\ndem = "tiles"\n')
    assert scenario.input_files == {
        "tiles/a.tif": hashlib.sha256(b"a").hexdigest(),
        "tiles/b.tif": hashlib.sha256(b"b").hexdigest(),
    }


def test_the_digest_follows_content_and_nothing_else(tmp_path: Path) -> None:
    here, there = tmp_path / "here", tmp_path / "there"
    digests = []
    for folder, text, sites in (
        (here, TEMPLATE, "1"),
        (there, "# a remark\n" + TEMPLATE, "1"),
        (here, TEMPLATE, "2"),
        (here, TEMPLATE.replace("11.95", "11.96"), "2"),
    ):
        folder.mkdir(exist_ok=True)
        (folder / "sites.csv").write_text(sites)
        digests.append(read(folder, text + '[sites]\nfile = "sites.csv"\n').digest)
    assert digests[0] == digests[1]
    assert len(set(digests)) == 3
    assert re.fullmatch("[0-9a-f]{64}", digests[0])


def test_a_file_that_vanishes_is_reported(tmp_path: Path) -> None:
    (tmp_path / "dem.tif").write_bytes(b"a")
    scenario = read(tmp_path, TEMPLATE + '[terrain]\ndem = "dem.tif"\n')
    (tmp_path / "dem.tif").unlink()
    with pytest.raises(InputError, match=r"dem\.tif: cannot be read"):
        _ = scenario.digest


def test_a_scenario_is_frozen_small_and_picklable(tmp_path: Path) -> None:
    scenario = read(tmp_path, TEMPLATE)
    _ = scenario.digest
    copy = pickle.loads(pickle.dumps(scenario))
    assert copy == scenario
    assert copy.digest == scenario.digest
    assert len(pickle.dumps(scenario)) < 10_000
    with pytest.raises(pydantic.ValidationError, match="frozen"):
        scenario.title = "other"  # type: ignore[misc]
