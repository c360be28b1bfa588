"""``geoskew raster``."""

from __future__ import annotations

from pathlib import Path
from typing import Literal

import click

from geoskew.cli import console, options


@click.command(
    "raster", epilog="Example: geoskew raster plan.toml --out layers --layer skew_after --layer action"
)
@options.scenario
@options.out_folder
@options.layer
@options.overwrite
@options.precision
@options.nodata
@options.compress
@options.workers
@options.cluster
@options.common
def command(
    scenario: Path,
    out: Path,
    layers: tuple[str, ...],
    overwrite: bool,
    precision: Literal["standard", "full"],
    nodata: float | None,
    compress: str,
    workers: int | None,
    cluster: str | None,
    quiet: bool,
    verbose: bool,
    debug: bool,
) -> None:
    """Layers of the region as cloud-optimised GeoTIFFs, DIR/NAME.tif each."""
    from geoskew.study.core import Study
    from geoskew.study.rasters import write_study_rasters

    study = Study(scenario, needs_sites=False)
    study.scenario.require("region", for_what="a raster")
    with console.progress(quiet=quiet) as report:
        made = write_study_rasters(
            study,
            out,
            layers or None,
            nodata=nodata,
            precision=precision,
            compress=compress.upper(),
            workers=workers,
            cluster=cluster,
            overwrite=overwrite,
            report=report,
        )
    console.say(f"wrote {len(made)} layers into {out}; {study.judged}", quiet=quiet)
