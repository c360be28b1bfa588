"""Wrong inputs: exit status, one clear line a fault, no trace of the program, nothing left behind."""

from __future__ import annotations

import os
import re
import resource
import subprocess
import sys
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

import pytest
from small_scenarios import contents, plain
from wrong_inputs import RUN, WRONG, Wrong

from geoskew.cli import main


def test_the_table_is_long_enough_and_names_each_case_once() -> None:
    assert len({wrong.name for wrong in WRONG}) == len(WRONG) >= 60


@pytest.mark.parametrize("wrong", WRONG, ids=lambda wrong: wrong.name)
def test_wrong_input(wrong: Wrong, tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    folder = tmp_path / "in"
    folder.mkdir()
    if wrong.text is not None:
        plain(folder, wrong.text, wrong.sites)
    if wrong.prepare is not None:
        wrong.prepare(folder)
    before = contents(tmp_path)
    status = main(_arguments(wrong.arguments, tmp_path))
    said = capsys.readouterr()
    lines = said.err.splitlines()
    if wrong.arguments == ("check", "{plan}"):
        assert lines.pop().startswith("geoskew: 1 problem found; a run ")
    assert (status, said.out) == (wrong.status, "")
    assert len(lines) == len(wrong.said), said.err
    for line, pattern in zip(lines, wrong.said, strict=True):
        assert line.startswith("geoskew: ")
        assert re.search(pattern, line), line
    assert contents(tmp_path) == before


def _arguments(given: tuple[str, ...], folder: Path) -> list[str]:
    places = {"plan": folder / "in" / "plan.toml", "in": folder / "in", "out": folder / "out"}
    return [re.sub(r"\{(plan|in|out)\}", lambda found: str(places[found[1]]), word) for word in given]


def test_debug_shows_the_trace(tmp_path: Path) -> None:
    with pytest.raises(ValueError, match="there is no such scenario file"):
        main(["check", str(tmp_path / "nowhere.toml"), "--debug"])


# --- where the machine is at fault -----------------------------------------------------------------


def _outside(*arguments: str, folder: Path, largest: int | None = None) -> subprocess.CompletedProcess[str]:
    """Run a command line in a process of its own, on request with a limit to the size of files."""

    def limit() -> None:
        if largest is not None:
            resource.setrlimit(resource.RLIMIT_FSIZE, (largest, largest))

    return subprocess.run(
        [sys.executable, "-m", "geoskew", *_arguments(arguments, folder)],
        capture_output=True,
        text=True,
        check=False,
        preexec_fn=limit,
    )


@pytest.mark.parametrize(
    "arguments",
    [
        ("raster", "{plan}", "--out", "{out}", "--layer", "skew_after"),
        ("sites", "{plan}", "--out", "{in}/s.gpkg"),
        ("contours", "{plan}", "--out", "{in}/c.gpkg", "--layer", "skew_after"),
        ("cards", "{plan}", "--out", "{in}/c.html"),
        ("fieldmap", "{plan}", "--out", "{in}/m.html"),
    ],
    ids=" ".join,
)
def test_a_file_that_may_not_grow(arguments: tuple[str, ...], tmp_path: Path) -> None:
    plain(tmp_path / "in")
    before = contents(tmp_path)
    done = _outside(*arguments, folder=tmp_path, largest=2048)
    assert (done.returncode, done.stdout) == (1, ""), done.stderr
    # A library for TIFF speaks to the terminal by itself.
    (line,) = [line for line in done.stderr.splitlines() if not line.startswith("_tiff")]
    assert line.startswith("geoskew: ")
    assert contents(tmp_path) == before


@contextmanager
def mounted(disk: Path, size: str) -> Iterator[Path]:
    """A small disk, or a skip with the reason."""
    disk.mkdir()
    mount = ["mount", "-t", "tmpfs", "-o", f"size={size}", "tmpfs", str(disk)]
    try:
        made = subprocess.run(mount, capture_output=True, text=True, check=False)
    except FileNotFoundError:
        pytest.skip("not applicable: there is no mount here")
    if made.returncode != 0:
        pytest.skip(f"not applicable: a disk cannot be mounted here: {made.stderr.strip()}")
    try:
        yield disk
    finally:
        subprocess.run(["umount", str(disk)], check=True)


@pytest.fixture
def full_disk(tmp_path: Path) -> Iterator[Path]:
    """A disk of 12 kB."""
    with mounted(tmp_path / "disk", "12k") as disk:
        yield disk


@pytest.mark.parametrize(
    "arguments",
    [
        ("raster", "--out", "layers"),
        ("sites", "--out", "s.gpkg"),
        ("sites", "--out", "s.xlsx"),
        ("sites", "--out", "s.parquet"),
        ("contours", "--out", "c.gpkg"),
        ("cards", "--out", "c.html"),
        ("cards", "--out", "c.pdf"),
        ("fieldmap", "--out", "m.html"),
        ("run", "--out", "all"),
    ],
    ids=" ".join,
)
def test_a_full_disk(
    arguments: tuple[str, str, str], full_disk: Path, tmp_path: Path, capfd: pytest.CaptureFixture[str]
) -> None:
    path = plain(tmp_path / "in")
    command, option, name = arguments
    assert main([command, str(path), option, str(full_disk / name)]) == 1
    said = capfd.readouterr()
    (line,) = said.err.splitlines()
    assert "the disk is full" in line
    assert line.endswith("free some space or choose another disk")
    assert contents(full_disk) == {}


def test_a_disk_that_is_full_in_the_middle_of_a_run(
    tmp_path: Path, capfd: pytest.CaptureFixture[str]
) -> None:
    path = plain(tmp_path / "in")
    with mounted(tmp_path / "disk", "900k") as disk:
        assert main(["run", str(path), "--out", str(disk / "out")]) == 1
        (line,) = capfd.readouterr().err.splitlines()
        assert "out/contours.gpkg: the disk is full; free some space" in line
        # What was finished before stays, whole; nothing else does.
        left = [name for name in contents(disk) if not re.fullmatch(r"out(/layers(/\w+\.tif)?)?", name)]
        assert left == []


def test_a_folder_that_may_not_be_written(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    if os.geteuid() == 0:
        pytest.skip("the superuser may write everywhere")
    path = plain(tmp_path / "in")
    locked = tmp_path / "locked"
    locked.mkdir(mode=0o500)
    for command, name in (("run", "out"), ("raster", "out"), ("sites", "s.csv"), ("cards", "c.html")):
        assert main([command, str(path), "--out", str(locked / name)]) == 1
        (line,) = capsys.readouterr().err.splitlines()
        assert "may not be written" in line or "permission denied" in line
    assert list(locked.iterdir()) == []


def test_a_scenario_that_may_not_be_read(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    if os.geteuid() == 0:
        pytest.skip("the superuser may read everything")
    path = plain(tmp_path / "in")
    path.chmod(0)
    assert main(_arguments(RUN, tmp_path)) == 2
    assert "cannot be read: Permission denied" in capsys.readouterr().err
