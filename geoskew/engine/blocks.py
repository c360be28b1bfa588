"""Compute the blocks of a grid ahead of whoever consumes them."""

from __future__ import annotations

import os
from collections import deque
from collections.abc import Iterator, Sequence
from concurrent.futures import Future, ThreadPoolExecutor
from typing import Any

from numpy.typing import NDArray

from geoskew.evaluate import evaluate
from geoskew.region import Grid, Window
from geoskew.scenario import Scenario
from geoskew.situation import Inputs

Block = tuple[Window, dict[str, NDArray[Any]]]


def compute_block(scenario: Scenario, inputs: Inputs, grid: Grid, window: Window, names: Sequence[str]) -> Block:
    """One block: the very function that every worker runs, on this machine or another one."""
    return window, evaluate(scenario, grid.block(window), names, inputs=inputs)


def computed_blocks(
    scenario: Scenario, inputs: Inputs, grid: Grid, names: Sequence[str], *, workers: int | None = None
) -> Iterator[Block]:
    """All blocks of a grid in order, computed by threads that run at most one block ahead each.

    Memory is bounded by the blocks in flight, whatever the grid's size; the values do not depend on
    the number of workers. numpy works outside of the interpreter's lock, so threads are enough.
    """
    workers = workers or os.cpu_count() or 1
    waiting: deque[Future[Block]] = deque()
    with ThreadPoolExecutor(max_workers=workers) as pool:
        try:
            for window in grid.windows():
                waiting.append(pool.submit(compute_block, scenario, inputs, grid, window, names))
                if len(waiting) > workers:
                    yield waiting.popleft().result()
            while waiting:
                yield waiting.popleft().result()
        finally:
            for future in waiting:
                future.cancel()
