"""Several blocks, and later several files, at a time: each worker computes, encodes and stores.

A block is one task: whoever takes it computes its values, if they are not there yet, and stores all its
layers, beginning with another layer than its neighbours so that they seldom wait for each other. While one
worker computes another one compresses. Blocks in flight are as many as workers, and so is the memory.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Mapping, Sequence
from concurrent.futures import FIRST_COMPLETED, Future, ThreadPoolExecutor, wait
from pathlib import Path
from typing import TYPE_CHECKING, Any

from numpy.typing import NDArray

from geoskew.outputs.raster import storage as _storage
from geoskew.outputs.raster.finish import finish
from geoskew.outputs.raster.scratch import Scratch

if TYPE_CHECKING:
    from geoskew.region import Window

Values = Mapping[str, NDArray[Any]]
Given = Values | Callable[[], Values]


def fill(
    blocks: Iterable[tuple[Window, Given]],
    scratches: Sequence[Scratch],
    *,
    workers: int,
    report: Callable[[int], None],
) -> None:
    """Store every block of every layer; `report` takes the number of cells that are done."""

    def store(number: int, window: Window, given: Given) -> int:
        values = given() if callable(given) else given
        for place in range(len(scratches)):
            scratch = scratches[(number + place) % len(scratches)]
            encoded = _storage.encode(values[scratch.layer.name], scratch.layer, scratch.storage)
            scratch.write(window, encoded)
        return window.height * window.width

    # A step that shares few factors with the number of layers keeps neighbours apart.
    apart = max(1, len(scratches) // max(2, workers))
    tasks = (
        lambda number=number, window=window, given=given: store(number * apart, window, given)
        for number, (window, given) in enumerate(blocks)
    )
    _run(tasks, workers=workers, done=report)


def finish_all(
    scratches: Sequence[Scratch],
    parts: Sequence[Path],
    *,
    compress: str,
    workers: int,
    failing: Callable[[int], None],
    report: Callable[[int], None],
) -> None:
    """Make the final files, as many at a time as there are workers; `failing` hears whose turn went wrong."""
    # A lone file is compressed by all workers, several by one each.
    threads = max(1, workers // max(1, len(scratches)))

    def make(index: int) -> int:
        try:
            finish(scratches[index], parts[index], compress=compress, threads=threads)
        except BaseException:
            failing(index)
            raise
        return 1

    tasks = (lambda index=index: make(index) for index in range(len(scratches)))
    _run(tasks, workers=workers, done=report)


def _run(tasks: Iterable[Callable[[], int]], *, workers: int, done: Callable[[int], None]) -> None:
    """Run tasks, as many at a time as there are workers; the next is fetched when one has ended.

    The first failure stops the rest: what runs is waited for, what waits is dropped.
    """
    total = 0
    running: set[Future[int]] = set()
    with ThreadPoolExecutor(max_workers=workers) as pool:
        try:
            for task in tasks:
                if len(running) == workers:
                    ended, running = wait(running, return_when=FIRST_COMPLETED)
                    total += sum(future.result() for future in ended)
                    done(total)
                running.add(pool.submit(task))
            while running:
                ended, running = wait(running, return_when=FIRST_COMPLETED)
                total += sum(future.result() for future in ended)
                done(total)
        finally:
            for future in running:
                future.cancel()
