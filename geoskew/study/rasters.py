"""Layers of a region as GeoTIFFs, and their contours."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Sequence
from contextlib import ExitStack
from pathlib import Path
from tempfile import TemporaryDirectory
from typing import Any, Literal

from geoskew import __version__
from geoskew.engine import pending_blocks
from geoskew.errors import InputError
from geoskew.evaluate import chosen
from geoskew.layers import REGISTRY
from geoskew.outputs import contours, raster
from geoskew.region import Window
from geoskew.study.cluster import blocks_of_cluster
from geoskew.study.core import Study
from geoskew.study.foretold import bytes_of_rasters, require_room
from geoskew.study.outfiles import folder_of_results, require_free

Report = Callable[[str, float, float], None]


def raster_tags(study: Study) -> dict[str, str]:
    """What every GeoTIFF says of itself besides its layer."""
    scenario = study.scenario
    tags = {
        "TITLE": scenario.title,
        "SOFTWARE": f"geoskew {__version__}",
        "SCENARIO_SHA256": scenario.digest,
        "SATELLITE_BEFORE": _satellite(scenario.outgoing),
        "SATELLITE_AFTER": _satellite(scenario.incoming),
        "ANGLES": "degrees; azimuth clockwise from true north; skew, settings and turns clockwise positive "
        "for a person who looks towards the satellite, modulo 180 in (-90, 90]",
        "JUDGED_IN": study.judged,
    }
    if scenario.changeover is not None:
        tags["CHANGEOVER"] = scenario.changeover.isoformat()
    if scenario.weather is not None:
        from geoskew.weather import EDITIONS

        tags["EDITIONS"] = "; ".join(EDITIONS)
    return tags


def _satellite(satellite: object) -> str:
    name, longitude, tilt = (getattr(satellite, key) for key in ("name", "longitude_deg", "tilt_deg"))
    return f"{name}, {longitude:g} degrees east, tilt {tilt:g} degrees"


def write_study_rasters(
    study: Study,
    folder: Path,
    names: Iterable[str] | None,
    *,
    nodata: float | None = None,
    precision: Literal["standard", "full"] = "standard",
    compress: str = "DEFLATE",
    workers: int | None = None,
    cluster: str | None = None,
    overwrite: bool = False,
    report: Report | None = None,
) -> list[Path]:
    """Compute layers block by block, here or on a cluster, and write them into a folder."""
    if cluster is not None and workers is not None:
        raise InputError("--workers and --cluster exclude each other: --cluster local:N takes N processes")
    wanted = chosen(study.scenario, names, sites=False)
    study.read()
    grid, inputs = study.grid, study.inputs
    require_free(study, [folder / f"{name}.tif" for name in wanted], overwrite=overwrite)
    # Work files and results stand side by side until the last one is done.
    require_room(folder, 2.0 * bytes_of_rasters(grid.cells, wanted))
    phases = {"cells": "computing cells", "tiles": "computing tiles", "files": "finishing GeoTIFFs"}

    def told(phase: str, done: int, total: int) -> None:
        if report is not None:
            report(phases.get(phase, phase), done, total)

    with folder_of_results(folder), ExitStack() as stack:
        blocks: Iterable[tuple[Window, Any]]
        if cluster is None:
            blocks = pending_blocks(study.scenario, inputs, grid, wanted)
        else:
            blocks = stack.enter_context(
                blocks_of_cluster(study, folder, wanted, where=cluster, precision=precision, report=told)
            )
        return raster.write_rasters(
            blocks,
            grid=grid,
            layers=[REGISTRY[name] for name in wanted],
            folder=folder,
            tags=raster_tags(study),
            nodata=nodata,
            precision=precision,
            compress=compress,
            workers=workers,
            on_progress=told,
        )


def contoured(names: Sequence[str] | None, study: Study) -> tuple[str, ...]:
    """Layers to contour: those asked for, or all that have a usual step."""
    if names:
        return chosen(study.scenario, names, sites=False)
    return tuple(name for name in study.raster_names if contours.has_contours(REGISTRY[name]))


def write_study_contours(
    study: Study,
    path: Path,
    names: Sequence[str] | None,
    *,
    every: float | None = None,
    report: Report | None = None,
) -> list[str]:
    """Contours of layers computed for the purpose; nothing but the lines stays. Returns remarks."""
    if path.suffix.lower() != ".gpkg":
        raise InputError(f"{path}: contours are written as GeoPackage; give a name that ends in .gpkg")
    wanted = contoured(names, study)
    for name in wanted:
        if REGISTRY[name].is_class:
            raise InputError(f"layer {name} holds classes, which have no contours; leave it out")
    # Beside the result, since the system's folder for temporary files may be small.
    with TemporaryDirectory(prefix=".contours-", dir=path.parent) as scratch:
        made = write_study_rasters(study, Path(scratch), wanted, report=report)
        return contours.write_contours(
            path,
            dict(zip(wanted, made, strict=True)),
            layers=[REGISTRY[name] for name in wanted],
            every=every,
        )
