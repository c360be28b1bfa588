"""Arguments and options that several commands share."""

from __future__ import annotations

import os
from collections.abc import Callable
from functools import wraps
from pathlib import Path
from typing import Any, TypeAlias

import click

from geoskew.cli import console

Decorator: TypeAlias = Callable[[Callable[..., Any]], Callable[..., Any]]


class HomePath(click.Path):
    """A path in which ~ stands for the home folder, as behind an equals sign no shell replaces it."""

    def __init__(self) -> None:
        super().__init__(path_type=Path, readable=False)  # whoever reads it says more

    def convert(self, value: Any, param: click.Parameter | None, ctx: click.Context | None) -> Any:
        """The path with the home folder in it."""
        path = Path(os.fsdecode(super().convert(value, param, ctx)))
        try:
            return path.expanduser()
        except RuntimeError:
            self.fail(f"{value!r}: there is no such home folder; give the path in full", param, ctx)


scenario = click.argument("scenario", type=HomePath())

out_folder = click.option(
    "--out",
    "out",
    type=HomePath(),
    required=True,
    metavar="DIR",
    help="Folder for the results.",
)


def out_file(endings: str, *, required: bool = True) -> Decorator:
    """`--out FILE`, with the endings that choose the format."""
    return click.option(
        "--out",
        "out",
        type=HomePath(),
        required=required,
        metavar="FILE",
        help=f"File to write; its ending chooses the format: {endings}.",
    )


layer = click.option(
    "--layer", "layers", multiple=True, metavar="NAME", help="A layer by name; may stand several times. [all]"
)
overwrite = click.option("--overwrite", is_flag=True, help="Replace files that geoskew did not write.")
strict = click.option("--strict", is_flag=True, help="Stop when a row of the site list cannot be used.")
precision = click.option(
    "--precision",
    type=click.Choice(["standard", "full"]),
    default="standard",
    show_default=True,
    help="Values rounded to about 0.001, or unrounded 32-bit floats.",
)
nodata = click.option(
    "--nodata", type=float, default=None, metavar="VALUE", help="Number for 'no value'. [NaN]"
)
compress = click.option(
    "--compress",
    type=click.Choice(["DEFLATE", "ZSTD"], case_sensitive=False),
    default="DEFLATE",
    show_default=True,
    help="Compression of GeoTIFFs.",
)
workers = click.option(
    "--workers",
    type=click.IntRange(min=1),
    default=None,
    metavar="N",
    help="Threads to compute with. [cores]",
)


def _address(context: click.Context, parameter: click.Parameter, value: str | None) -> str | None:
    """Check the address before anything is read."""
    if value is not None:
        from geoskew.engine.cluster import require_address

        require_address(value)
    return value


cluster = click.option(
    "--cluster",
    metavar="ADDRESS",
    default=None,
    callback=_address,
    help="Compute the rasters on a dask cluster: its scheduler's address, or local:N for N processes here.",
)
to_database = click.option(
    "--to-database",
    is_flag=True,
    help="Write into the tables of [database] too; 'geoskew database' makes them.",
)
tiles = click.option(
    "--tiles",
    metavar="URL",
    default=None,
    help="Online background with {z}, {x}, {y} for the map, off until ticked. [none]",
)


def common(function: Callable[..., Any]) -> Callable[..., Any]:
    """`-q`, `-v` and `--debug`, which every command takes."""
    debug = click.option("--debug", is_flag=True, help="Show the program's own trace on an error.")
    verbose = click.option("-v", "--verbose", is_flag=True, help="Say more about what is done.")
    quiet = click.option("-q", "--quiet", is_flag=True, help="Say nothing but errors and unusable rows.")
    return quiet(verbose(debug(listening(function))))


def listening(function: Callable[..., Any]) -> Callable[..., Any]:
    """Let the package's own warnings through as `-q` and `-v` have it."""

    @wraps(function)
    def command(*, quiet: bool, verbose: bool, **rest: Any) -> Any:
        console.listen(quiet=quiet, verbose=verbose)
        return function(quiet=quiet, verbose=verbose, **rest)

    return command
