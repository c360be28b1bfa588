"""``geoskew run``."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Literal

import click

from geoskew.cli import console, options

if TYPE_CHECKING:
    from geoskew.study.core import Study
    from geoskew.study.run import Settings


@click.command("run", epilog="Example: geoskew run plan.toml --out result")
@options.scenario
@options.out_folder
@options.overwrite
@options.strict
@options.precision
@options.nodata
@options.compress
@options.workers
@options.cluster
@options.tiles
@options.common
def command(
    scenario: Path,
    out: Path,
    overwrite: bool,
    strict: bool,
    precision: Literal["standard", "full"],
    nodata: float | None,
    compress: str,
    workers: int | None,
    cluster: str | None,
    tiles: str | None,
    quiet: bool,
    verbose: bool,
    debug: bool,
) -> None:
    """The whole job, everything that the scenario has inputs for, into one folder.

    Leaves layers/NAME.tif, contours.gpkg, sites.gpkg, sites.csv, rejected.csv, fieldmap.html,
    cards.html and .pdf, visits.*, report.html and .pdf, summary.json and columns.csv.
    """
    from geoskew.study.core import Study
    from geoskew.study.run import Settings

    study = Study(scenario, strict=strict)
    settings = Settings(overwrite, precision, compress.upper(), nodata, workers, tiles, cluster)
    run_and_tell(study, out, settings, quiet=quiet, verbose=verbose)


def run_and_tell(study: Study, out: Path, settings: Settings, *, quiet: bool, verbose: bool) -> None:
    """Run a study and say what came of it; `demo` does the same."""
    from geoskew.study.run import run, summary_line

    with console.progress(quiet=quiet) as report:
        written = run(study, out, settings, report)
    console.tell_rejected(study, out)
    for remark in written.remarks:
        console.say(remark, quiet=quiet)
    if verbose:
        for path in written.files:
            console.say(f"wrote {path}", quiet=quiet)
    console.say(summary_line(out), quiet=quiet)
    console.say(f"everything is in {out}; start with {out / 'fieldmap.html'}", quiet=quiet)
