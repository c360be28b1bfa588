"""``geoskew database``."""

from __future__ import annotations

from pathlib import Path

import click

from geoskew.cli import console, options


@click.command(
    "database", epilog="Example: geoskew database plan.toml | less; geoskew database plan.toml --create"
)
@options.scenario
@click.option("--create", is_flag=True, help="Run the SQL instead of printing it.")
@options.common
def command(scenario: Path, create: bool, quiet: bool, verbose: bool, debug: bool) -> None:
    """The SQL of the tables that take results: [database] table, and the same name with _contours.

    Safe to run again: it makes what is missing, adds columns that older tables lack, and touches no row.
    """
    from geoskew.study.core import Study
    from geoskew.study.database import create_tables, schema_text, target_of

    study = Study(scenario)
    given = study.scenario
    target = target_of(study, sites=given.has_sites, region=given.region is not None)
    study.read()
    if not create:
        click.echo(schema_text(target), nl=False)
        return
    create_tables(target)
    names = " and ".join(table.fullname for table in target.tables)
    console.say(f"{names}: there, with every column", quiet=quiet)
