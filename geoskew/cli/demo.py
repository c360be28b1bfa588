"""``geoskew demo``."""

from __future__ import annotations

from pathlib import Path

import click

from geoskew.cli import options


@click.command("demo", epilog="Example: geoskew demo --out demo-result")
@click.option(
    "--out",
    "out",
    type=options.HomePath(),
    default=None,
    metavar="DIR",
    help="Folder for the results. [maps/NAME in a checkout, else geoskew-NAME]",
)
@click.option(
    "--scenario",
    "name",
    default="southern-cone",
    show_default=True,
    metavar="NAME",
    help="southern-cone: a new polarisation tilt at the same slot; slot-change: a slot 0.6° away.",
)
@options.overwrite
@options.workers
@options.common
def command(
    out: Path | None, name: str, overwrite: bool, workers: int | None, quiet: bool, verbose: bool, debug: bool
) -> None:
    """The whole job on a bundled scenario: an invented network on real geography."""
    from geoskew.cli.run import run_and_tell
    from geoskew.resources import demo_scenario
    from geoskew.study.core import Study
    from geoskew.study.run import Settings

    folder = out or _default_folder(name)
    study = Study(demo_scenario(name))
    run_and_tell(study, folder, Settings(overwrite=overwrite, workers=workers), quiet=quiet, verbose=verbose)


def _default_folder(name: str) -> Path:
    """`maps/NAME` where the current folder is a checkout, else a folder of its own."""
    if Path("maps/README.md").is_file() and Path("pyproject.toml").is_file():
        return Path("maps") / name
    return Path(f"geoskew-{name}")
