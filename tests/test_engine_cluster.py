"""A region computed on a cluster: the same bytes as in one process, whatever is lost on the way."""

from __future__ import annotations

import inspect
import json
import logging
import operator
import os
import signal
import subprocess
import sys
import threading
import time
from collections.abc import Callable, Iterator
from dataclasses import replace
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from geoskew.cli import main
from geoskew.engine import blocks
from geoskew.engine.cluster import Job, clients, cluster_blocks, compute_tile, jobs, session, tile_side, tiles
from geoskew.engine.cluster import collect as collecting
from geoskew.errors import GeoskewError, InputError, OutputError
from geoskew.region import Grid, Window
from geoskew.study.cluster import Encoded, tile_folder
from geoskew.study.core import Study
from geoskew.study.rasters import write_study_rasters

distributed = pytest.importorskip("distributed", reason="the extra [cluster] is not installed")

NAMES = ("azimuth_after", "skew_after", "action")
SCENARIO = """
title = "Tiles"
[outgoing]
longitude_deg = -66.2
tilt_deg = 21.0
eirp_dbw = 50.0
[incoming]
longitude_deg = -66.2
eirp_dbw = 50.0
[carrier]
polarisation = "V"
frequency_ghz = 11.95
symbol_rate_mbaud = 27.5
required_es_n0_db = 7.9
[region]
bounds_deg = [-76.0, -45.0, -65.0, -39.0]
step_deg = 0.01
"""
TILES = 6  # 1100 × 600 cells in tiles of 512


@pytest.fixture(scope="module")
def cluster() -> Iterator[Any]:
    """A scheduler and two processes on the loopback interface."""
    with distributed.LocalCluster(
        n_workers=2,
        threads_per_worker=1,
        host="127.0.0.1",
        dashboard_address="127.0.0.1:0",
        silence_logs=logging.CRITICAL,
    ) as running:
        yield running


@pytest.fixture
def plan(tmp_path: Path) -> Path:
    path = tmp_path / "plan.toml"
    path.write_text(SCENARIO, encoding="utf-8")
    return path


@pytest.fixture(scope="module")
def expected(tmp_path_factory: pytest.TempPathFactory) -> dict[str, bytes]:
    """Bytes of every layer's file, computed in this process by one thread."""
    folder = tmp_path_factory.mktemp("expected")
    path = folder / "plan.toml"
    path.write_text(SCENARIO, encoding="utf-8")
    made = write_study_rasters(Study(path), folder / "layers", NAMES, workers=1)
    return {file.name: file.read_bytes() for file in made}


def job_of(plan: Path, beside: Path) -> Job:
    study = Study(plan)
    folder = tile_folder(study, beside, NAMES, "standard")
    beside.mkdir(exist_ok=True)
    return Job(
        study.scenario, study.inputs, study.grid, folder, Encoded("standard"), True, jobs.versions_here()
    )


def finished_tiles(layers: Path) -> dict[Path, int]:
    """Records of finished tiles, with when they were written."""
    return {
        path: path.stat().st_mtime_ns
        for path in layers.glob(".tiles-*/*/tile.json")
        if ".part-" not in str(path)
    }


def wait_until(condition: Callable[[], object], *, seconds: float = 120.0) -> None:
    deadline = time.monotonic() + seconds
    while not condition():
        assert time.monotonic() < deadline, "waited in vain"
        time.sleep(0.01)


def bytes_of(layers: Path, *, killed: int = 0) -> dict[str, bytes]:
    """Bytes of all final files; nothing else may be left but the record of files.

    What a killed process had in hand under its own number is removed by `outputs.files` after an hour.
    """
    left = {path.name for path in layers.iterdir() if not path.name.endswith(f".part-{killed}")}
    left -= {".geoskew-files.json"}
    assert left == {f"{name}.tif" for name in NAMES}
    return {path.name: path.read_bytes() for path in layers.glob("*.tif")}


def test_workers_run_the_block_function_of_every_other_way() -> None:
    assert jobs.compute_block is blocks.compute_block
    assert inspect.signature(Grid.windows).parameters["size"].default == tiles.BLOCK


@pytest.mark.parametrize(
    "more", [{}, {"precision": "full", "nodata": -9999.0, "compress": "ZSTD"}], ids=["standard", "full"]
)
def test_same_bytes_as_in_one_process(
    cluster: Any, plan: Path, tmp_path: Path, expected: dict[str, bytes], more: dict[str, Any]
) -> None:
    if more:
        made = write_study_rasters(Study(plan), tmp_path / "one", NAMES, workers=1, **more)
        expected = {file.name: file.read_bytes() for file in made}
    told: list[tuple[str, float, float]] = []
    study = Study(plan)
    write_study_rasters(
        study,
        tmp_path / "layers",
        NAMES,
        cluster=cluster.scheduler_address,
        report=lambda *one: told.append(one),
        **more,
    )
    assert bytes_of(tmp_path / "layers") == expected
    counted = [(done, total) for phase, done, total in told if phase == "computing tiles"]
    assert counted == [(done, TILES) for done in range(TILES + 1)]


@pytest.mark.parametrize("name", NAMES)
def test_what_tiles_hold_is_not_changed_by_encoding_it_again(name: str) -> None:
    if name == "action":
        values = np.array([0, 5, 255], dtype=np.uint8)
    else:
        values = np.concatenate([np.linspace(-90.0, 90.0, 100_003), [np.nan, 89.9999, -89.9999, 1e-9]])
    for precision in ("standard", "full"):
        encode = Encoded(precision)
        once = encode(name, values)
        np.testing.assert_array_equal(encode(name, once).view(np.uint8), once.view(np.uint8))


def test_a_killed_worker_is_made_good(
    cluster: Any, plan: Path, tmp_path: Path, expected: dict[str, bytes]
) -> None:
    layers = tmp_path / "layers"
    with distributed.Client(cluster.scheduler_address) as client:
        pids = list(client.run(os.getpid).values())
    killed = []

    def kill() -> None:
        wait_until(lambda: finished_tiles(layers))
        os.kill(pids[0], signal.SIGKILL)
        killed.append(pids[0])

    thread = threading.Thread(target=kill)
    thread.start()
    write_study_rasters(Study(plan), layers, NAMES, cluster=cluster.scheduler_address)
    thread.join()
    assert killed
    assert bytes_of(layers) == expected


def test_after_a_killed_client_only_missing_tiles_are_computed(
    cluster: Any, plan: Path, tmp_path: Path, expected: dict[str, bytes]
) -> None:
    layers = tmp_path / "layers"
    arguments = ["raster", str(plan), "--out", str(layers), "--cluster", cluster.scheduler_address]
    arguments += [part for name in NAMES for part in ("--layer", name)]
    first = subprocess.Popen([sys.executable, "-m", "geoskew", *arguments], stderr=subprocess.PIPE)
    wait_until(lambda: finished_tiles(layers))
    first.kill()
    first.communicate()
    assert first.returncode == -signal.SIGKILL
    assert not list(layers.glob("*.tif"))
    # What a worker had in hand when its client went may still come; then nothing changes any more.
    wait_until(lambda: not list(layers.glob(".tiles-*/*.part-*")))
    before = finished_tiles(layers)
    assert before
    job = job_of(plan, layers)
    job.folder.prepare()
    told: list[tuple[int, int]] = []
    with session(cluster.scheduler_address) as client:
        for _ in cluster_blocks(client, job, on_tiles=lambda done, total: told.append((done, total))):
            pass
    assert told == [(done, TILES) for done in range(len(before), TILES + 1)]
    after = finished_tiles(layers)
    assert len(after) == TILES
    assert {path: after[path] for path in before} == before
    # and once more, with all tiles there: the final files alone are made
    assert main([*arguments, "-q"]) == 0
    assert bytes_of(layers, killed=first.pid) == expected


def test_a_lost_scheduler_gets_one_clear_message(
    plan: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(collecting, "_LOST_SECONDS", 2.0)
    job = job_of(plan, tmp_path / "layers")
    with (
        distributed.LocalCluster(
            n_workers=1,
            threads_per_worker=1,
            host="127.0.0.1",
            dashboard_address="127.0.0.1:0",
            silence_logs=logging.CRITICAL,
        ) as short,
        session(short.scheduler_address) as client,
    ):
        job.folder.prepare()
        coming = cluster_blocks(client, job)
        next(coming)
        short.close()
        with pytest.raises(GeoskewError, match=r"scheduler of the cluster was lost.*goes on from there"):
            list(coming)
    assert job.folder.path.is_dir()


def test_versions_that_differ_are_named_before_any_work(
    cluster: Any,
    plan: Path,
    tmp_path: Path,
    monkeypatch: pytest.MonkeyPatch,
    capfd: pytest.CaptureFixture[str],
) -> None:
    true = distributed.Client.get_versions

    def as_if_newer_here(client: Any, **options: Any) -> Any:
        found = true(client, **options)
        found["client"]["packages"] |= {"geoskew": "9.9.9", "distributed": "9999.1"}
        return found

    monkeypatch.setattr(distributed.Client, "get_versions", as_if_newer_here)
    arguments = ["raster", plan, "--out", tmp_path / "layers", "--cluster", cluster.scheduler_address]
    status = main([str(one) for one in arguments])
    said = capfd.readouterr().err.splitlines()
    assert status == 1
    assert len(said) == 1
    assert "versions differ between the ends of the cluster: the scheduler has distributed" in said[0]
    # each worker is named (one that was killed may still be on its way back); the scheduler needs no geoskew
    workers = said[0].count("the worker at tcp://127.0.0.1:")
    assert workers >= 1
    assert said[0].count("instead of 9.9.9") == workers
    assert not (tmp_path / "layers").exists()


def test_a_worker_that_comes_late_compares_versions_itself(plan: Path, tmp_path: Path) -> None:
    job = job_of(plan, tmp_path / "layers")
    job.folder.prepare()
    other = replace(job, versions={**job.versions, "numpy": "0.1"})
    with pytest.raises(GeoskewError, match=r"other versions than this end: numpy .* instead of 0\.1"):
        compute_tile(other, Window(0, 0, 512, 512))
    assert not finished_tiles(tmp_path / "layers")


def test_a_changed_scenario_uses_no_tile_of_the_old_one(plan: Path, tmp_path: Path) -> None:
    job = job_of(plan, tmp_path / "layers")
    job.folder.prepare()
    window = Window(0, 0, 512, 512)
    compute_tile(job, window)
    assert job.folder.is_finished(window)
    plan.write_text(SCENARIO.replace("21.0", "20.0"), encoding="utf-8")
    changed = job_of(plan, tmp_path / "layers")
    assert changed.folder.path != job.folder.path
    assert not changed.folder.is_finished(window)
    assert changed.folder.others() == [job.folder.path]
    # tiles that were moved there by hand are not taken for ours
    changed.folder.prepare()
    job.folder.place(window).rename(changed.folder.place(window))
    assert not changed.folder.is_finished(window)
    compute_tile(changed, window)
    assert changed.folder.is_finished(window)
    # nor is a whole folder under our name
    changed.folder.remove()
    job.folder.path.rename(changed.folder.path)
    with pytest.raises(InputError, match="tiles of another scenario or other layers; remove it"):
        changed.folder.prepare()


def test_other_layers_precision_or_grids_have_folders_of_their_own(plan: Path, tmp_path: Path) -> None:
    study = Study(plan)
    folders = {
        tile_folder(study, tmp_path, NAMES, "standard").path,
        tile_folder(study, tmp_path, NAMES, "full").path,
        tile_folder(study, tmp_path, NAMES[:2], "standard").path,
    }
    assert len(folders) == 3
    assert all(study.scenario.digest[:12] in folder.name for folder in folders)


def test_a_damaged_tile_is_told_and_an_incomplete_one_computed_again(plan: Path, tmp_path: Path) -> None:
    job = job_of(plan, tmp_path / "layers")
    job.folder.prepare()
    window = Window(0, 0, 512, 512)
    compute_tile(job, window)
    file = job.folder.place(window) / "skew_after.tif"
    whole = file.read_bytes()
    file.write_bytes(whole[:-1] + bytes([whole[-1] ^ 1]))
    with pytest.raises(OutputError, match="was changed or is damaged; remove this folder"):
        list(job.folder.blocks(window))
    file.write_bytes(whole[:100])
    assert not job.folder.is_finished(window)
    compute_tile(job, window)
    assert file.read_bytes() == whole


def test_a_failed_tile_leaves_nothing_and_says_why(cluster: Any, plan: Path, tmp_path: Path) -> None:
    job = replace(job_of(plan, tmp_path / "layers"), store=operator.truediv)
    job.folder.prepare()
    with (
        session(cluster.scheduler_address) as client,
        pytest.raises(GeoskewError, match=r"the tile at row \d+, column \d+ failed on a worker: TypeError"),
    ):
        list(cluster_blocks(client, job))
    # tiles that were in hand run to their end
    wait_until(lambda: {path.name for path in job.folder.path.iterdir()} == {"job.json"})


def test_parts_of_an_hour_ago_go_and_younger_ones_stay(plan: Path, tmp_path: Path) -> None:
    job = job_of(plan, tmp_path / "layers")
    job.folder.prepare()
    old, young = (job.folder.path / f"row0-column0.part-host-{number}" for number in (1, 2))
    for part in (old, young):
        part.mkdir()
    os.utime(old, (time.time() - 7200, time.time() - 7200))
    job.folder.prepare()
    assert (old.exists(), young.exists()) == (False, True)


def test_a_worker_that_does_not_see_the_folder_says_so(
    plan: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(tiles, "_SEEN_WITHIN_SECONDS", 0.1)
    job = job_of(plan, tmp_path / "layers")
    with pytest.raises(OutputError, match=r"does not see the folder .* on a file system that all share"):
        compute_tile(job, Window(0, 0, 512, 512))


WRONG_ADDRESSES = [
    "local",
    "local:",
    "local:0",
    "local:two",
    "somewhere",
    "http://x:1",
    "tcp://x",
    "tcp://x:y",
]


@pytest.mark.parametrize("where", WRONG_ADDRESSES)
def test_a_wrong_address_is_refused_at_once(where: str, capfd: pytest.CaptureFixture[str]) -> None:
    assert main(["raster", "nowhere.toml", "--out", "x", "--cluster", where]) == 2
    said = capfd.readouterr().err.splitlines()
    assert len(said) == 1
    assert "neither the address of a scheduler" in said[0]


def test_no_scheduler_and_no_workers_get_one_line(
    plan: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capfd: pytest.CaptureFixture[str]
) -> None:
    monkeypatch.setattr(clients, "_CONNECT_SECONDS", 1)
    monkeypatch.setattr(clients, "_WORKERS_SECONDS", 1)
    arguments = ["raster", str(plan), "--out", str(tmp_path / "layers"), "--cluster"]
    assert main([*arguments, "tcp://127.0.0.1:1"]) == 1
    said = capfd.readouterr().err.splitlines()
    assert len(said) == 1
    assert "no scheduler answers at tcp://127.0.0.1:1" in said[0]
    with distributed.LocalCluster(
        n_workers=0, host="127.0.0.1", dashboard_address="127.0.0.1:0", silence_logs=logging.CRITICAL
    ) as idle:
        assert main([*arguments, idle.scheduler_address]) == 1
    said = capfd.readouterr().err.splitlines()
    assert len(said) == 1
    assert "has no workers; start workers with: dask worker" in said[0]
    assert not (tmp_path / "layers").exists()


def test_the_extra_that_is_not_installed_is_named(
    plan: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capfd: pytest.CaptureFixture[str]
) -> None:
    monkeypatch.setitem(sys.modules, "distributed", None)
    assert main(["raster", str(plan), "--out", str(tmp_path / "layers"), "--cluster", "local:1"]) == 1
    said = capfd.readouterr().err.splitlines()
    assert len(said) == 1
    assert "pip install 'geoskew[cluster]'" in said[0]


def test_a_tile_is_a_geotiff_that_lies_in_its_place(plan: Path, tmp_path: Path) -> None:
    import rasterio

    job = job_of(plan, tmp_path / "layers")
    job.folder.prepare()
    window = Window(512, 1024, 88, 76)
    compute_tile(job, window)
    with rasterio.open(job.folder.place(window) / "skew_after.tif") as file:
        assert file.crs.to_epsg() == 4326
        # the corner of the tile, by hand: 1024 and 512 cells of 0.01° from 76° W, 39° S
        np.testing.assert_allclose(file.bounds, (-65.76, -45.0, -65.0, -44.12), atol=1e-9)
        assert np.isnan(file.nodata)
    record = json.loads((job.folder.place(window) / "tile.json").read_text())
    assert set(record["bytes"]) == set(NAMES)
    inside = [inner for inner, _ in job.folder.blocks(window)]
    assert inside == [window]


@pytest.mark.parametrize(("columns", "rows"), [(1, 1), (1100, 600), (10_000, 5_000), (1_296_000, 648_000)])
def test_tiles_are_whole_blocks_and_cover_the_grid(columns: int, rows: int) -> None:
    grid = Grid("EPSG:4326", 0.0, 0.0, 0.01, columns, rows)
    side = tile_side(grid)
    assert side % tiles.BLOCK == 0
    assert tiles.BLOCK <= side <= 4096
    if columns <= 10_000:
        windows = list(grid.windows(side))
        inner = [one for window in windows for one in tiles.inner_windows(window)]
        assert {(one.row, one.column) for one in inner} == {
            (one.row, one.column) for one in grid.windows(tiles.BLOCK)
        }
        assert sum(one.height * one.width for one in inner) == grid.cells
