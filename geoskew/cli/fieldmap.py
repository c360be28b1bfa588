"""``geoskew fieldmap``."""

from __future__ import annotations

from pathlib import Path

import click

from geoskew.cli import console, options


def wanted(context: click.Context, option: click.Parameter, texts: tuple[str, ...]) -> dict[str, str]:
    """Columns and values out of COLUMN=VALUE."""
    pairs = {}
    for text in texts:
        column, equals, value = text.partition("=")
        if not equals or not column:
            message = f"{text!r} is not COLUMN=VALUE, as in --only crew=North"
            raise click.BadParameter(message, context, option)
        pairs[column] = value
    return pairs


@click.command(
    "fieldmap", epilog="Example: geoskew fieldmap plan.toml --out map.html --only crew=North --blur 0.1"
)
@options.scenario
@options.out_file(".html")
@options.layer
@click.option(
    "--only",
    callback=wanted,
    multiple=True,
    metavar="COLUMN=VALUE",
    help="Keep only some sites, as crew=North or district=Jujuy.",
)
@click.option(
    "--blur",
    type=click.FloatRange(min=0.0, max=10.0, min_open=True),
    default=None,
    metavar="DEG",
    help="Move sites to the middle of cells of so many degrees; 0.1 is about 11 km.",
)
@options.tiles
@options.overwrite
@options.strict
@options.common
def command(
    scenario: Path,
    out: Path,
    layers: tuple[str, ...],
    only: dict[str, str],
    blur: float | None,
    tiles: str | None,
    overwrite: bool,
    strict: bool,
    quiet: bool,
    verbose: bool,
    debug: bool,
) -> None:
    """The map as one HTML file that works with no network. It carries the sites' coordinates."""
    from geoskew.errors import InputError
    from geoskew.outputs.fieldmap import size_remark, write_fieldmap
    from geoskew.study.core import Study
    from geoskew.study.fieldmap import content_of
    from geoskew.study.outfiles import require_free_with_rejected, write_rejected

    if out.suffix.lower() not in (".html", ".htm"):
        raise InputError(f"{out}: the map is an HTML file; give a name that ends in .html")
    study = Study(scenario, strict=strict)
    require_free_with_rejected(study, out, overwrite=overwrite)
    with console.progress(quiet=quiet) as report:
        content = content_of(
            study, layers, beside=out.parent, tiles=tiles, only=only, blur_deg=blur, report=report
        )
        size = write_fieldmap(out, content)
    write_rejected(study, out)
    console.tell_rejected(study, out.parent)
    console.say(f"wrote {out}, {size / 1e6:.1f} MB; {study.judged}", quiet=quiet)
    if remark := size_remark(size):
        console.say(remark, quiet=quiet)
