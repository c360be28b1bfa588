"""``geoskew reports``."""

from __future__ import annotations

from pathlib import Path

import click

from geoskew.cli import console, options


@click.command("reports", epilog="Example: geoskew reports plan.toml --reports week1.csv --out result")
@options.scenario
@click.option(
    "--reports",
    "given",
    type=click.Path(path_type=Path),
    multiple=True,
    required=True,
    metavar="FILE",
    help="Report file of a crew, CSV or XLSX; may stand several times.",
)
@options.out_folder
@options.overwrite
@options.strict
@options.common
def command(
    scenario: Path,
    given: tuple[Path, ...],
    out: Path,
    overwrite: bool,
    strict: bool,
    quiet: bool,
    verbose: bool,
    debug: bool,
) -> None:
    """Reconcile reports from the field with the plan.

    A report file has the columns site, date, setting_scale, setting_inclinometer, quality_before,
    quality_after and note; the field map writes such files. All reports of a folder are kept in its
    history.sqlite; the same row counts once. Leaves sites.csv and .gpkg with what became of each site,
    to_do.csv, visits.* and cards for what is left, fieldmap.html, rejected_reports.csv and reports.json.
    """
    from geoskew.errors import InputError
    from geoskew.study.core import Study
    from geoskew.study.reports import report_on

    study = Study(scenario, strict=strict)
    with console.progress(quiet=quiet) as report:
        outcome = report_on(study, given, out, overwrite=overwrite, report=report)
    console.tell_rejected(study, out)
    for remark in outcome.remarks:
        console.say(remark, quiet=quiet)
    if verbose:
        for path in outcome.files:
            console.say(f"wrote {path}", quiet=quiet)
    states = ", ".join(f"{count} {name}" for name, count in sorted(outcome.states.items()))
    console.say(f"{outcome.added} new reports, {outcome.kept} in all; sites: {states}", quiet=quiet)
    if outcome.rejected:
        rows = "row" if outcome.rejected == 1 else "rows"
        told = f"{outcome.rejected} {rows} of reports could not be used; see {out / 'rejected_reports.csv'}"
        if strict:
            raise InputError(told)
        console.say(told)
    console.say(f"{outcome.left} sites are left to do; see {out / 'to_do.csv'}", quiet=quiet)
