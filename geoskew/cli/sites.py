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
    from geoskew.outputs.files import require_free
    from geoskew.study.core import Study

    tables.require_format(out)
    rejected = out.parent / "rejected.csv"
    study = Study(scenario, strict=strict)
    require_free([out], overwrite=overwrite)
    assessed = study.assessed
    tables.write_table(out, assessed.table, columns=assessed.columns)
    tables.write_rejected(rejected, study.sites.rejected)
    console.tell_rejected(study, out.parent, quiet=quiet)
    for warning in study.sites.warnings:
        console.say(warning, quiet=quiet)
    console.say(f"wrote {out}: {len(assessed.table)} sites; {study.judged}", quiet=quiet)
