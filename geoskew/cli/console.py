"""What a command says while it works: a bar on a terminal, a plain line now and then elsewhere."""

from __future__ import annotations

import sys
import time
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import Final

# Without a terminal: one line in this many seconds, so that a log shows that work goes on.
PLAIN_EVERY_SECONDS: Final = 30.0

Report = Callable[[str, float, float], None]


@contextmanager
def progress(*, quiet: bool) -> Iterator[Report]:
    """Give a function ``report(phase, done, total)``; standard error only."""
    if quiet:
        yield lambda phase, done, total: None
    elif sys.stderr.isatty():
        with _bars() as report:
            yield report
    else:
        yield _plain()


@contextmanager
def _bars() -> Iterator[Report]:
    from rich.console import Console
    from rich.progress import BarColumn, Progress, TextColumn, TimeRemainingColumn

    console = Console(stderr=True)
    columns = (
        TextColumn("{task.description}"),
        BarColumn(),
        TextColumn("{task.percentage:>3.0f} %"),
        TimeRemainingColumn(),
    )
    with Progress(*columns, console=console, transient=True) as bars:
        tasks: dict[str, object] = {}

        def report(phase: str, done: float, total: float) -> None:
            if phase not in tasks:
                tasks[phase] = bars.add_task(phase, total=total)
            bars.update(tasks[phase], completed=done, total=total)  # type: ignore[arg-type]  # rich's TaskID is an int

        yield report


def _plain() -> Report:
    last = time.monotonic()

    def report(phase: str, done: float, total: float) -> None:
        nonlocal last
        if time.monotonic() - last >= PLAIN_EVERY_SECONDS:
            last = time.monotonic()
            share = 100.0 * done / total if total else 100.0
            print(f"geoskew: {phase}: {share:.0f} %", file=sys.stderr)

    return report


def say(text: str, *, quiet: bool = False) -> None:
    """One line on standard error."""
    if not quiet:
        print(f"geoskew: {text}", file=sys.stderr)


def tell_rejected(study: object, folder: Path, *, quiet: bool = False) -> None:
    """One line on rows that could not be used."""
    scenario = study.scenario  # type: ignore[attr-defined]  # a Study; naming it would import everything
    if scenario.sites is None:
        return
    rejected = study.sites.rejected  # type: ignore[attr-defined]
    if rejected:
        rows = "row" if len(rejected) == 1 else "rows"
        say(
            f"{len(rejected)} {rows} of {scenario.sites.file.name} could not be used; see {folder / 'rejected.csv'}"
        )
