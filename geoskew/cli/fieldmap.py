"""``geoskew fieldmap``."""

from __future__ import annotations

from pathlib import Path

import click

from geoskew.cli import console, options


class Wanted(click.ParamType):
    """COLUMN=VALUE."""

    name = "COLUMN=VALUE"

    def convert(
        self, value: object, param: click.Parameter | None, ctx: click.Context | None
    ) -> tuple[str, str]:
        """Column and value."""
        if isinstance(value, tuple):
            return value
        column, equals, text = str(value).partition("=")
        if not equals or not column:
            self.fail(f"{value!r} is not COLUMN=VALUE, as in --only crew=North", param, ctx)
        return column, text


@click.command(
    "fieldmap", epilog="Example: geoskew fieldmap plan.toml --out map.html --only crew=North --blur 5"
)
@options.scenario
@options.out_file(".html")
@options.layer
@click.option(
    "--only", type=Wanted(), multiple=True, help="Keep only some sites, as crew=North or district=Jujuy."
)
@click.option(
    "--blur", type=float, default=None, metavar="KM", help="Coarsen the sites' places to about so many km."
)
@options.tiles
@options.overwrite
@options.strict
@options.common
def command(
    scenario: Path,
    out: Path,
    layers: tuple[str, ...],
    only: tuple[tuple[str, str], ...],
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
    from geoskew.outputs.files import require_free
    from geoskew.study.core import Study
    from geoskew.study.fieldmap import content_of

    if out.suffix.lower() not in (".html", ".htm"):
        raise InputError(f"{out}: the map is an HTML file; give a name that ends in .html")
    study = Study(scenario, strict=strict)
    require_free([out], overwrite=overwrite)
    with console.progress(quiet=quiet) as report:
        content = content_of(
            study, layers, beside=out.parent, tiles=tiles, only=dict(only), blur_km=blur, report=report
        )
        size = write_fieldmap(out, content)
    console.say(f"wrote {out}, {size / 1e6:.1f} MB; {study.judged}", quiet=quiet)
    if remark := size_remark(size):
        console.say(remark, quiet=quiet)
