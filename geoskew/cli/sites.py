"""``geoskew sites``."""

from __future__ import annotations

from pathlib import Path

import click

from geoskew.cli import console, options


@click.command("sites", epilog="Example: geoskew sites plan.toml --out assessed.gpkg")
@options.scenario
@options.out_file(".csv, .gpkg, .geojson, .parquet or .xlsx", required=False)
@options.to_database
@options.overwrite
@options.strict
@options.common
def command(
    scenario: Path,
    out: Path | None,
    to_database: bool,
    overwrite: bool,
    strict: bool,
    quiet: bool,
    verbose: bool,
    debug: bool,
) -> None:
    """The assessed site list; rows that cannot be used go to rejected.csv beside it.

    Give --out, --to-database, or both.
    """
    from geoskew.outputs import tables
    from geoskew.study.core import Study
    from geoskew.study.database import require_ready, target_of, write_tables
    from geoskew.study.outfiles import rejected_beside, require_free_with_rejected, write_rejected

    if out is None and not to_database:
        raise click.UsageError("Give --out FILE, --to-database, or both.")
    if out is not None:
        tables.require_format(out)
    study = Study(scenario, strict=strict)
    require_free_with_rejected(study, out, overwrite=overwrite)
    target = target_of(study, sites=True, region=False) if to_database else None
    study.read()
    if target is not None:
        require_ready(target)
    assessed = study.assessed
    if out is not None:
        tables.write_table(out, assessed.table, columns=assessed.columns)
    told = [] if target is None else write_tables(target)
    write_rejected(study, out)
    console.tell_rejected(study, rejected_beside(out).parent)
    for remark in [*study.sites.warnings, *told]:
        console.say(remark, quiet=quiet)
    if out is not None:
        console.say(f"wrote {out}: {len(assessed.table)} sites; {study.judged}", quiet=quiet)
