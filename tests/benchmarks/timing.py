"""Interleaved rounds of several functions, and their medians."""

from __future__ import annotations

import os
import platform
import statistics
import time
from collections.abc import Callable, Mapping
from typing import NamedTuple


class Times(NamedTuple):
    """Medians of the rounds, seconds."""

    wall: float
    cpu: float

    def over(self, other: Times) -> str:
        return f"{self.wall / other.wall:8.2f} wall {self.cpu / other.cpu:8.2f} cpu"


def rounds(
    functions: Mapping[str, Callable[[], object]], count: int = 5, *, warm: bool = True
) -> dict[str, Times]:
    """Call all functions by turns, `count` times; a first round that warms up does not count."""
    taken: dict[str, list[Times]] = {name: [] for name in functions}
    for number in range(count + warm):
        for name, function in functions.items():
            wall, cpu = time.perf_counter(), time.process_time()
            function()
            times = Times(time.perf_counter() - wall, time.process_time() - cpu)
            if number or not warm:
                taken[name].append(times)
    return {
        name: Times(statistics.median(one.wall for one in all_), statistics.median(one.cpu for one in all_))
        for name, all_ in taken.items()
    }


def machine() -> str:
    load = os.getloadavg()[0] if hasattr(os, "getloadavg") else float("nan")
    return f"{platform.machine()}, {os.cpu_count()} processors, load {load:.1f}, Python {platform.python_version()}"


def table(times: Mapping[str, Times], cells: int, base: str) -> None:
    """Print nanoseconds a cell and how many times `base` each is."""
    for name, one in times.items():
        print(
            f"  {name:46s} {one.wall / cells * 1e9:9.1f} ns/cell wall {one.cpu / cells * 1e9:9.1f} cpu"
            f"   x {one.over(times[base])}"
        )
