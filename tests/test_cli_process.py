"""The command line as a process of its own: pipes, terminals, interrupts, encodings."""

from __future__ import annotations

import json
import os
import pty
import re
import signal
import subprocess
import sys
import time
from collections.abc import Callable
from pathlib import Path

import pytest
from small_scenarios import PLAIN, contents, plain

GEOSKEW = [sys.executable, "-m", "geoskew"]
ESCAPE = "\x1b"


def _run(*arguments: str | Path, **options: object) -> subprocess.CompletedProcess[str]:
    command = [*GEOSKEW, *map(str, arguments)]
    return subprocess.run(command, capture_output=True, text=True, encoding="utf-8", check=False, **options)  # type: ignore[call-overload,no-any-return]


@pytest.fixture
def plan(tmp_path: Path) -> Path:
    return plain(tmp_path / "in")


def test_results_and_messages_go_their_own_ways_without_escape_codes(plan: Path, tmp_path: Path) -> None:
    # Colours asked for by the environment are for terminals.
    coloured = {**os.environ, "TERM": "xterm-256color"}
    done = _run("run", plan, "--out", tmp_path / "out", "-v", env=coloured)
    assert (done.returncode, done.stdout) == (0, "")
    assert ESCAPE not in done.stderr
    assert all(line.startswith("geoskew: ") for line in done.stderr.splitlines())
    assert f"geoskew: wrote {tmp_path / 'out' / 'sites.csv'}" in done.stderr.splitlines()
    spot = _run("spot", plan, "--at=-33,-65", "--json", env=coloured)
    assert (spot.returncode, spot.stderr) == (0, "")
    assert isinstance(json.loads(spot.stdout), dict)
    assert ESCAPE not in _run("--help", env=coloured).stdout


@pytest.mark.parametrize("arguments", [("layers",), ("layers", "--json"), ("--help",), ("check", "{plan}")])
def test_a_reader_that_leaves_is_no_failure(arguments: tuple[str, ...], plan: Path) -> None:
    read, write = os.pipe()
    os.close(read)
    words = [word.replace("{plan}", str(plan)) for word in arguments]
    try:
        done = subprocess.run(
            [*GEOSKEW, *words], stdout=write, stderr=subprocess.PIPE, text=True, check=False
        )
    finally:
        os.close(write)
    assert (done.returncode, done.stderr) == (0, "")


def test_standard_output_that_is_closed_or_full(plan: Path) -> None:
    closed = subprocess.run(
        [*GEOSKEW, "layers"], preexec_fn=lambda: os.close(1), stderr=subprocess.PIPE, text=True, check=False
    )
    assert (closed.returncode, closed.stderr) == (0, "")
    if not Path("/dev/full").exists():
        pytest.skip("not applicable: there is no device that is always full")
    with Path("/dev/full").open("w") as full:
        done = subprocess.run(
            [*GEOSKEW, "layers"], stdout=full, stderr=subprocess.PIPE, text=True, check=False
        )
    assert done.returncode == 1
    assert re.fullmatch(r"geoskew: No space left on device\n", done.stderr)


def test_an_encoding_that_lacks_signs_stops_nothing(plan: Path) -> None:
    done = _run("layers", env={**os.environ, "PYTHONIOENCODING": "ascii", "PYTHONUTF8": "0"})
    assert (done.returncode, done.stderr) == (0, "")
    wrong = _run("spot", plan, "--at=95,0", env={**os.environ, "PYTHONIOENCODING": "latin-1"})
    assert wrong.returncode == 2
    assert "latitude 95 is not within" in wrong.stderr


def test_a_bar_on_a_terminal_is_gone_at_the_end(plan: Path, tmp_path: Path) -> None:
    ours, theirs = pty.openpty()
    process = subprocess.Popen(
        [*GEOSKEW, "raster", str(plan), "--out", str(tmp_path / "out"), "--layer", "action"], stderr=theirs
    )
    os.close(theirs)
    shown = b""
    while True:
        try:
            part = os.read(ours, 4096)
        except OSError:  # Linux's way of saying that the other end is closed
            break
        if not part:
            break
        shown += part
    os.close(ours)
    assert process.wait() == 0
    assert shown.decode().rstrip().endswith("margins in clear sky decide")


# --- interrupts ------------------------------------------------------------------------------------


def _interrupted(arguments: list[str], when: Callable[[], bool]) -> tuple[int, str]:
    """Send the signal of Ctrl-C when something is seen; exit status and standard error."""
    process = subprocess.Popen(
        [*GEOSKEW, *arguments],
        stderr=subprocess.PIPE,
        text=True,
        # A shell's background job ignores this signal, and so would the child.
        preexec_fn=lambda: signal.signal(signal.SIGINT, signal.SIG_DFL),
    )
    while not when():
        assert process.poll() is None, "it ended before it could be interrupted"
        time.sleep(0.01)
    process.send_signal(signal.SIGINT)
    _, said = process.communicate()
    return process.returncode, said


@pytest.mark.parametrize("command", ["raster", "run"])
def test_an_interrupt_leaves_nothing_half_written(command: str, tmp_path: Path) -> None:
    # Fine enough for the work to last: the signal comes as soon as the first part is there.
    path = plain(tmp_path / "in", PLAIN.replace("step_deg = 2.0", "step_deg = 0.005"))
    out = tmp_path / "out"
    before = contents(tmp_path)
    status, said = _interrupted(
        [command, str(path), "--out", str(out)], lambda: any(out.rglob("*.part-*/*.tif"))
    )
    assert status == 130
    assert (
        said.splitlines()[-1]
        == "geoskew: interrupted; what was finished is whole, the rest is missing, nothing half-written is left"
    )
    assert "Traceback" not in said
    assert contents(tmp_path) == before


def test_an_interrupt_of_contours_leaves_no_work_folder(tmp_path: Path) -> None:
    path = plain(tmp_path / "in", PLAIN.replace("step_deg = 2.0", "step_deg = 0.005"))
    before = contents(tmp_path)
    status, _ = _interrupted(
        ["contours", str(path), "--out", str(tmp_path / "c.gpkg")],
        lambda: any(tmp_path.glob(".contours-*/*.part-*/*.tif")),
    )
    assert status == 130
    assert contents(tmp_path) == before
