"""``geoskew contours``."""

from __future__ import annotations

from pathlib import Path

import click

from geoskew.cli import console, options


@click.command(
    "contours", epilog="Example: geoskew contours plan.toml --out skew.gpkg --layer skew_after --every 2"
)
@options.scenario
@options.out_file(".gpkg")
@options.layer
@click.option(
    "--every",
    type=float,
    default=None,
    metavar="STEP",
    help="Distance between levels, in the layer's unit. [each layer's own]",
)
@options.to_database
@options.overwrite
@options.common
def command(
    scenario: Path,
    out: Path,
    layers: tuple[str, ...],
    every: float | None,
    to_database: bool,
    overwrite: bool,
    quiet: bool,
    verbose: bool,
    debug: bool,
) -> None:
    """Isolines of layers as vector lines with their level, one GeoPackage layer each."""
    from geoskew.study.core import Study
    from geoskew.study.database import require_ready, target_of, write_tables
    from geoskew.study.outfiles import require_folder, require_free
    from geoskew.study.rasters import write_study_contours

    study = Study(scenario, needs_sites=False)
    study.scenario.require("region", for_what="contours")
    require_folder(out.parent)
    require_free(study, [out], overwrite=overwrite)
    target = target_of(study, sites=False, region=True) if to_database else None
    if target is not None:
        require_ready(target)
    with console.progress(quiet=quiet) as report:
        remarks = write_study_contours(study, out, layers or None, every=every, report=report)
    if target is not None:
        remarks += write_tables(target, contours=out)
    for remark in remarks:
        console.say(remark, quiet=quiet)
    console.say(f"wrote {out}; {study.judged}", quiet=quiet)
