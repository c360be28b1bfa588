"""What a command says while it works: a bar on a terminal, nothing but its remarks elsewhere."""

from __future__ import annotations

import logging
import sys
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import TYPE_CHECKING

import click

if TYPE_CHECKING:
    from geoskew.study.core import Study

Report = Callable[[str, float, float], None]


@contextmanager
def progress(*, quiet: bool) -> Iterator[Report]:
    """Give a function ``report(phase, done, total)``; on standard error, and only on a terminal."""
    if quiet or not sys.stderr.isatty():
        yield lambda phase, done, total: None
    else:
        with _bars() as report:
            yield report


@contextmanager
def _bars() -> Iterator[Report]:
    from rich.console import Console
    from rich.progress import BarColumn, Progress, TaskID, TextColumn, TimeRemainingColumn

    console = Console(stderr=True)
    columns = (
        TextColumn("{task.description}"),
        BarColumn(),
        TextColumn("{task.percentage:>3.0f} %"),
        TimeRemainingColumn(),
    )
    with Progress(*columns, console=console, transient=True) as bars:
        tasks: dict[str, TaskID] = {}

        def report(phase: str, done: float, total: float) -> None:
            if phase not in tasks:
                tasks[phase] = bars.add_task(phase, total=total)
            bars.update(tasks[phase], completed=done, total=total)

        yield report


def say(text: str, *, quiet: bool = False) -> None:
    """One line on standard error."""
    if not quiet:
        click.echo(f"geoskew: {text}", err=True)


class Told(logging.Handler):
    """Says what the package's modules log."""

    def emit(self, record: logging.LogRecord) -> None:
        """One line on standard error."""
        say(record.getMessage())


def listen(*, quiet: bool, verbose: bool) -> None:
    """Say warnings of the package's modules; nothing with `quiet`, more with `verbose`."""
    logger = logging.getLogger("geoskew")
    if not any(isinstance(handler, Told) for handler in logger.handlers):
        logger.addHandler(Told())
    logger.setLevel(logging.ERROR if quiet else logging.INFO if verbose else logging.WARNING)


def tell_rejected(study: Study, folder: Path) -> None:
    """One line on rows that could not be used; with `-q` too, since those sites are missing everywhere."""
    scenario = study.scenario
    if not scenario.has_sites:
        return
    rejected = study.sites.rejected
    if rejected:
        rows = "row" if len(rejected) == 1 else "rows"
        source = study.sites.source.name
        say(f"{len(rejected)} {rows} of {source} could not be used; see {folder / 'rejected.csv'}")
