"""Have all tiles of a job computed, and hand out their blocks as they come in."""

from __future__ import annotations

import queue
import time
from collections.abc import Callable, Iterator
from logging import getLogger
from typing import Any, Final, NoReturn

from geoskew.engine.blocks import Block
from geoskew.engine.cluster.jobs import Job, compute_tile
from geoskew.engine.cluster.tiles import tile_side
from geoskew.errors import GeoskewError
from geoskew.region import Window

_LOOK_SECONDS: Final = 1.0
_LOST_SECONDS: Final = 60.0
_log = getLogger(__name__)


def cluster_blocks(
    client: Any, job: Job, *, on_tiles: Callable[[int, int], None] | None = None
) -> Iterator[Block]:
    """All blocks of a job's grid, of finished tiles first, then as tiles come in.

    Tiles that an earlier try left are not computed again. A tile whose worker is lost is given to
    another one by the scheduler.

    Parameters
    ----------
    client : distributed.Client
    job : Job
        With a folder that is prepared.
    on_tiles : callable, optional
        Called with the tiles that are finished and those there are in all.

    Raises
    ------
    GeoskewError
        A tile fails, or the cluster is lost. Finished tiles stay for the next try.
    """
    report = on_tiles or (lambda done, total: None)
    windows = list(job.grid.windows(tile_side(job.grid)))
    finished = [window for window in windows if job.folder.is_finished(window)]
    missing = [window for window in windows if window not in set(finished)]
    if finished:
        _log.info("%d of %d tiles were finished before", len(finished), len(windows))
    report(len(finished), len(windows))
    futures = _submit(client, job, missing)
    try:
        for window in finished:
            yield from job.folder.blocks(window)
        for done, window in enumerate(_as_they_come(client, job, futures), len(finished) + 1):
            report(done, len(windows))
            job.folder.wait_for(window)
            yield from job.folder.blocks(window)
    finally:
        if client.status == "running":
            client.cancel(list(futures), force=False)


def _submit(client: Any, job: Job, windows: list[Window]) -> dict[Any, Window]:
    """One task a tile, in the grid's order; the job itself goes to each worker once, as a task of its own."""
    if not windows:
        return {}
    # Had it been scattered, it would be lost with its last worker: a task is run again.
    shared = client.submit(_job, job, key=f"geoskew-job-{job.folder.key}", pure=False)
    return {
        client.submit(
            compute_tile,
            shared,
            window,
            key=f"geoskew-tile-{job.folder.key}-{window.row}-{window.column}",
            pure=False,
            priority=-index,
        ): window
        for index, window in enumerate(windows)
    }


def _job(job: Job) -> Job:
    return job


def _as_they_come(client: Any, job: Job, futures: dict[Any, Window]) -> Iterator[Window]:
    """Windows of tiles in the order in which they are finished."""
    ready: queue.SimpleQueue[Any] = queue.SimpleQueue()
    for future in futures:
        future.add_done_callback(ready.put)
    seen = time.monotonic()
    for _ in range(len(futures)):
        while True:
            try:
                future = ready.get(timeout=_LOOK_SECONDS)
                break
            except queue.Empty:
                seen = time.monotonic() if client.status == "running" else seen
                if client.status == "closed" or time.monotonic() - seen > _LOST_SECONDS:
                    _lost(job)
        if future.status != "finished":
            _failed(future, futures[future], job)
        yield futures[future]


def _lost(job: Job) -> NoReturn:
    raise GeoskewError(
        "the scheduler of the cluster was lost; finished tiles stay in "
        f"{job.folder.path}: the same command goes on from there"
    )


def _failed(future: Any, window: Window, job: Job) -> NoReturn:
    """Say why a tile has failed: in our own words where the worker gave them."""
    from distributed.scheduler import KilledWorker

    if future.status in ("cancelled", "lost"):
        _lost(job)
    error = future.exception()
    if isinstance(error, GeoskewError):
        raise error
    place = f"the tile at row {window.row}, column {window.column}"
    if isinstance(error, KilledWorker):
        raise GeoskewError(
            f"{place} ended {error.allowed_failures + 1} workers, most likely for want of memory; "
            "give each worker more, or start fewer on a machine; the same command goes on from there"
        ) from error
    raise GeoskewError(
        f"{place} failed on a worker: {type(error).__name__}: {error}; the same command goes on from there"
    ) from error
