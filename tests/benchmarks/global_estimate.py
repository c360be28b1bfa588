"""What all of Earth at 30 m would take, measured on a small share of it.

    python tests/benchmarks/global_estimate.py                    # a thousandth of the cells
    python tests/benchmarks/global_estimate.py --share 2e-5 --rounds 3

Computes twelve layers of a grid of the whole Earth whose step is as much coarser as the share asks
for, by turns with two threads of this process and with two processes on dask, whose start does not
count; compares the bytes, prints the ratios, and multiplies: processor time, bytes of final files and
bytes of tiles are all in proportion to the cells.
"""

from __future__ import annotations

import argparse
import math
import os
import statistics
import threading
import time
from collections.abc import Iterator, Mapping, Sequence
from contextlib import contextmanager
from dataclasses import dataclass
from pathlib import Path
from tempfile import TemporaryDirectory

import dask.config
import psutil  # comes with distributed
from distributed import Client, LocalCluster
from timing import machine

from geoskew.engine.blocks import COMPILED_FROM_CELLS
from geoskew.engine.cluster.clients import ENVIRONMENT
from geoskew.region import Grid
from geoskew.study.core import Study
from geoskew.study.rasters import write_study_rasters

STEP_DEG = 1.0 / 3600.0  # one arc second: 30.9 m along a meridian
CELLS = round(360.0 / STEP_DEG) * round(180.0 / STEP_DEG)
LAYERS = (
    "azimuth_after",
    "elevation_after",
    "range_after",
    "skew_before",
    "skew_after",
    "mismatch_untouched",
    "discrimination_untouched",
    "eirp_after",
    "cn_after",
    "margin_untouched",
    "margin_realigned",
    "action",
)
SCENARIO = """
title = "All of Earth"
[outgoing]
longitude_deg = -66.2
tilt_deg = 21.0
beam = {{ peak_dbw = 52.0, major_deg = 8.0, minor_deg = 5.0, orientation_deg = 20.0 }}
[incoming]
longitude_deg = -66.2
beam = {{ peak_dbw = 52.0, major_deg = 8.0, minor_deg = 5.0, orientation_deg = 20.0 }}
[carrier]
polarisation = "V"
frequency_ghz = 11.95
symbol_rate_mbaud = 27.5
modcod = "8PSK 3/4"
[region]
bounds_deg = [-180.0, -90.0, 180.0, 90.0]
step_deg = {step!r}
"""


@dataclass
class Measured:
    """Seconds of wall, of all processors and of this process, and the greatest size of the folder of tiles."""

    wall: float = 0.0
    cpu: float = 0.0
    own: float = 0.0
    tile_bytes: int = 0


@contextmanager
def measured(folder: Path, workers: Sequence[int]) -> Iterator[Measured]:
    """Measure a body that writes into a folder and has other processes at work."""
    found, done = Measured(), threading.Event()

    def watch() -> None:
        while not done.wait(0.5):
            files = (f"{at}/{name}" for at, _, names in os.walk(folder) for name in names)
            sizes = [size_of(Path(file)) for file in files if "/.tiles-" in file and file.endswith(".tif")]
            found.tile_bytes = max(found.tile_bytes, sum(sizes))

    watcher = threading.Thread(target=watch)
    watcher.start()
    wall, cpu, own = time.monotonic(), cpu_seconds(workers), cpu_seconds(())
    try:
        yield found
    finally:
        found.wall, found.cpu = time.monotonic() - wall, cpu_seconds(workers) - cpu
        found.own = cpu_seconds(()) - own
        done.set()
        watcher.join()


def cpu_seconds(workers: Sequence[int]) -> float:
    """Seconds of this process and of others."""
    times = [psutil.Process(number).cpu_times() for number in (os.getpid(), *workers)]
    return sum(one.user + one.system for one in times)


def size_of(path: Path) -> int:
    """Bytes of a file, none where it has just gone."""
    try:
        return path.stat().st_size
    except OSError:
        return 0


def write_plan(path: Path, share: float) -> Grid:
    """A scenario of all of Earth with about a share of its cells."""
    step = 180.0 / math.floor(180.0 / (STEP_DEG / math.sqrt(share)))
    path.write_text(SCENARIO.format(step=step), encoding="utf-8")
    return Study(path).grid


def main() -> None:
    """Measure and multiply."""
    parser = argparse.ArgumentParser(
        description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter
    )
    parser.add_argument("--share", type=float, default=1e-3, help="of all cells of Earth at 30 m")
    parser.add_argument("--rounds", type=int, default=1)
    parser.add_argument("--folder", type=Path, default=None, help="where to work")
    given = parser.parse_args()
    here = TemporaryDirectory(dir=given.folder, prefix="estimate-")
    dask.config.set({"distributed.nanny.pre-spawn-environ": ENVIRONMENT})
    cluster = LocalCluster(
        n_workers=2, threads_per_worker=1, host="127.0.0.1", dashboard_address="127.0.0.1:0", silence_logs=50
    )
    with here as name, cluster, Client(cluster) as client:
        pids = list(client.run(os.getpid).values())
        folder = Path(name)
        plan = folder / "plan.toml"
        ways = {"pool": {"workers": 2}, "dask": {"cluster": cluster.scheduler_address}}
        # from the number of cells on at which loops are compiled: that is no part of the comparison
        write_plan(plan, max(1.2 * COMPILED_FROM_CELLS / CELLS if given.share > 1e-5 else 1e-6, 1e-6))
        for options in ways.values():
            write_study_rasters(Study(plan), folder / "warm", LAYERS, **options)  # type: ignore[arg-type]
        grid = write_plan(plan, given.share)
        print(
            f"{machine()}; {grid.columns} x {grid.rows} cells of {grid.step:.6f} degrees, {len(LAYERS)} layers"
        )
        taken: dict[str, list[Measured]] = {way: [] for way in ways}
        for _ in range(given.rounds):
            for way, options in ways.items():
                with measured(folder / way, pids) as found:
                    write_study_rasters(Study(plan), folder / way, LAYERS, **options)  # type: ignore[arg-type]
                taken[way].append(found)
        tell(folder, grid, {way: middle(found) for way, found in taken.items()})


def middle(found: Sequence[Measured]) -> Measured:
    """Medians of rounds."""
    return Measured(
        statistics.median(one.wall for one in found),
        statistics.median(one.cpu for one in found),
        statistics.median(one.own for one in found),
        max(one.tile_bytes for one in found),
    )


def tell(folder: Path, grid: Grid, found: Mapping[str, Measured]) -> None:
    """Print what was measured, and what it makes for all of Earth."""
    pool, dask = found["pool"], found["dask"]
    for way, one in found.items():
        print(
            f"{way}: {one.wall:.1f} s, {one.cpu:.1f} s of processors, {grid.cells / one.cpu:,.0f} cells in one"
        )
    files = [f"{layer}.tif" for layer in LAYERS]
    same = all(
        (folder / "pool" / name).read_bytes() == (folder / "dask" / name).read_bytes() for name in files
    )
    print(
        f"same bytes: {same}; dask / pool: {dask.wall / pool.wall:.2f} wall {dask.cpu / pool.cpu:.2f} processors"
    )
    final = sum(size_of(folder / "dask" / name) for name in files)
    times = CELLS / grid.cells
    print(f"Earth at 30 m, {len(LAYERS)} layers, {CELLS:,} cells, {times:,.0f} times as many:")
    print(
        f"  {dask.cpu * times / 3600.0:,.0f} hours of one core, {dask.own * times / 3600.0:,.0f} of them of the one writer"
    )
    print(
        f"  {final * times / 1e12:,.2f} TB of final files, {dask.tile_bytes * times / 1e12:,.2f} TB of tiles"
    )


if __name__ == "__main__":
    main()
