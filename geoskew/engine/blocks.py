"""Compute the blocks of a grid ahead of whoever consumes them."""

from __future__ import annotations

import os
from collections import deque
from collections.abc import Callable, Iterator, Sequence
from concurrent.futures import Future, ThreadPoolExecutor
from functools import partial
from typing import Any, Final

import numpy as np
from numpy.typing import NDArray

from geoskew import kernels
from geoskew.evaluate import evaluate
from geoskew.region import Grid, Window
from geoskew.scenario import Scenario
from geoskew.situation import Inputs

Values = dict[str, NDArray[Any]]
Block = tuple[Window, Values]

# A grid of fewer cells is done by the time that the compiler would be.
COMPILED_FROM_CELLS: Final = 10_000_000
# Rows worked on at once: keeps the hundreds of intermediate arrays small.
STRIP_ROWS: Final = 24


def compute_block(
    scenario: Scenario, inputs: Inputs, grid: Grid, window: Window, names: Sequence[str]
) -> Block:
    """One block: the very function that every worker runs, on this machine or another one."""
    return window, _values(scenario, inputs, grid, window, names)


def _values(
    scenario: Scenario,
    inputs: Inputs,
    grid: Grid,
    window: Window,
    names: Sequence[str],
    floats: type[np.floating[Any]] = np.float32,
) -> Values:
    # Rasters store 32-bit floats; half the memory of a block in flight.
    compiled = grid.cells >= COMPILED_FROM_CELLS and kernels.ready()
    # Loops make few intermediate arrays, but rain goes through the plain formulas in any case.
    height = window.height if compiled and scenario.weather is None else STRIP_ROWS
    values: Values = {}
    for first in range(0, window.height, height):
        rows = slice(first, min(first + height, window.height))
        strip = Window(window.row + first, window.column, rows.stop - first, window.width)
        made = evaluate(scenario, grid.block(strip), names, inputs=inputs, compiled=compiled)
        if height == window.height and compiled:
            return made
        for name, part in made.items():
            if name not in values:
                kind = floats if part.dtype == np.float64 else part.dtype
                values[name] = np.empty((window.height, window.width), dtype=kind)
            values[name][rows] = part
    return values


def pending_blocks(
    scenario: Scenario, inputs: Inputs, grid: Grid, names: Sequence[str]
) -> Iterator[tuple[Window, Callable[[], Values]]]:
    """All blocks of a grid in order, each as a function that computes its values where it is called.

    For a consumer with workers of its own, so that one worker computes a block while another one stores one.
    """
    for window in grid.windows():
        yield window, partial(_values, scenario, inputs, grid, window, names)


def computed_blocks(
    scenario: Scenario, inputs: Inputs, grid: Grid, names: Sequence[str], *, workers: int | None = None
) -> Iterator[Block]:
    """All blocks of a grid in order, computed by threads that run at most one block ahead each.

    Memory is bounded by the blocks in flight, whatever the grid's size; the values do not depend on
    the number of workers. numpy works outside of the interpreter's lock, so threads are enough. For
    further calculation: plain formulas keep their 64-bit floats.
    """
    compute = partial(_values, scenario, inputs, grid, names=names, floats=np.float64)
    workers = workers or os.cpu_count() or 1
    waiting: deque[tuple[Window, Future[Values]]] = deque()

    def first() -> Block:
        window, future = waiting.popleft()
        return window, future.result()

    with ThreadPoolExecutor(max_workers=workers) as pool:
        try:
            for window in grid.windows():
                waiting.append((window, pool.submit(compute, window)))
                if len(waiting) > workers:
                    yield first()
            while waiting:
                yield first()
        finally:
            for _, future in waiting:
                future.cancel()
