"""``geoskew sites``."""

from __future__ import annotations

from pathlib import Path

import click

from geoskew.cli import console, options


@click.command("sites", epilog="Example: geoskew sites plan.toml --out assessed.gpkg")
@options.scenario
@options.out_file(".csv, .gpkg, .geojson, .parquet or .xlsx")
@options.overwrite
@options.strict
@options.common
def command(
    scenario: Path, out: Path, overwrite: bool, strict: bool, quiet: bool, verbose: bool, debug: bool
) -> None:
    """The assessed site list; rows that cannot be used go to rejected.csv beside it."""
    from geoskew.outputs import tables
    from geoskew.study.core import Study
    from geoskew.study.outfiles import require_free_with_rejected, write_rejected

    tables.require_format(out)
    study = Study(scenario, strict=strict)
    require_free_with_rejected(study, out, overwrite=overwrite)
    assessed = study.assessed
    tables.write_table(out, assessed.table, columns=assessed.columns)
    write_rejected(study, out)
    console.tell_rejected(study, out.parent)
    for warning in study.sites.warnings:
        console.say(warning, quiet=quiet)
    console.say(f"wrote {out}: {len(assessed.table)} sites; {study.judged}", quiet=quiet)
