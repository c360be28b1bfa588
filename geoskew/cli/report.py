"""``geoskew report``."""

from __future__ import annotations

from pathlib import Path

import click

from geoskew.cli import console, options


@click.command(
    "report",
    epilog="Examples: geoskew report plan.toml --out report.pdf; "
    "geoskew report plan.toml --against other.toml --out difference.html",
)
@options.scenario
@options.out_file(".html or .pdf")
@click.option(
    "--against",
    type=click.Path(path_type=Path),
    default=None,
    metavar="OTHER",
    help="Another scenario, or the folder of a run: report what differs, with a table, points and "
    "rasters of the differences beside the file.",
)
@options.overwrite
@options.strict
@options.common
def command(
    scenario: Path,
    out: Path,
    against: Path | None,
    overwrite: bool,
    strict: bool,
    quiet: bool,
    verbose: bool,
    debug: bool,
) -> None:
    """The planner's report: what changes, for whom, and how sure that is, on a few pages."""
    from geoskew.outputs.report import require_known_ending, write_report
    from geoskew.study.comparison import open_other
    from geoskew.study.comparisonreport import comparison_names, comparison_of, write_beside
    from geoskew.study.core import Study
    from geoskew.study.outfiles import require_folder, require_free
    from geoskew.study.report import report_of

    require_known_ending(out)
    require_folder(out.parent)
    study = Study(scenario, strict=strict)
    written = [out]
    with console.progress(quiet=quiet) as progress:
        if against is None:
            require_free(study, [out], overwrite=overwrite)
            remarks = write_report(report_of(study, progress=progress), out)
        else:
            other = open_other(against)
            require_free(study, [out, *comparison_names(study, out)], overwrite=overwrite)
            made = comparison_of(study, other)
            written += write_beside(study, other, out)
            remarks = write_report(made, out)
    for remark in remarks:
        console.say(remark, quiet=quiet)
    console.say(f"wrote {', '.join(str(path) for path in written)}; {study.judged}", quiet=quiet)
