"""``geoskew new``."""

from __future__ import annotations

from pathlib import Path

import click

from geoskew.cli import console, options


@click.command("new", epilog="Example: geoskew new plan.toml")
@click.argument("file", type=options.HomePath())
@options.overwrite
@options.common
def command(file: Path, overwrite: bool, quiet: bool, verbose: bool, debug: bool) -> None:
    """Write a commented scenario to start from."""
    from geoskew.outputs.files import require_free, writing
    from geoskew.scenario import TEMPLATE
    from geoskew.study.outfiles import require_folder

    require_folder(file.parent)
    require_free([file], overwrite=overwrite)
    with writing(file) as part:
        part.write_text(TEMPLATE, encoding="utf-8")
    console.say(f"wrote {file}; edit it, then: geoskew check {file}", quiet=quiet)
