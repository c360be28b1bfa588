"""``geoskew check``."""

from __future__ import annotations

from pathlib import Path

import click

from geoskew.cli import console, options


@click.command("check", epilog="Example: geoskew check plan.toml")
@options.scenario
@options.common
def command(scenario: Path, quiet: bool, verbose: bool, debug: bool) -> int:
    """Read and validate all inputs, compute nothing; say what 'run' would write.

    Every problem is one line on standard error, rows of the site list that cannot be used included.
    """
    from geoskew.study.check import check

    problems, lines = check(scenario)
    for problem in problems:
        console.say(str(problem))
    if not quiet:
        for line in lines:
            click.echo(line)
    if problems:
        found = f"{len(problems)} problem{'s' if len(problems) > 1 else ''} found"
        aside = (
            "; a run sets these rows aside in rejected.csv and goes on" if lines else "; a run stops at them"
        )
        console.say(found + aside, quiet=quiet)
    return 2 if problems else 0
