"""Arguments and options that several commands share."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import click

scenario = click.argument("scenario", type=click.Path(path_type=Path))

out_folder = click.option(
    "--out",
    "out",
    type=click.Path(path_type=Path),
    required=True,
    metavar="DIR",
    help="Folder for the results.",
)


def out_file(endings: str) -> Any:
    """`--out FILE`, with the endings that choose the format."""
    return click.option(
        "--out",
        "out",
        type=click.Path(path_type=Path),
        required=True,
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
tiles = click.option(
    "--tiles",
    metavar="URL",
    default=None,
    help="Online background with {z}, {x}, {y} for the map, off until ticked. [none]",
)


def common(function: Any) -> Any:
    """`-q`, `-v` and `--debug`, which every command takes."""
    function = click.option("--debug", is_flag=True, help="Show the program's own trace on an error.")(
        function
    )
    function = click.option("-v", "--verbose", is_flag=True, help="Say more about what is done.")(function)
    return click.option("-q", "--quiet", is_flag=True, help="Say nothing but errors.")(function)
