"""The field map on its own: rasters are made for it, thinned, and forgotten."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import replace
from pathlib import Path
from tempfile import TemporaryDirectory

from geoskew.outputs import fieldmap
from geoskew.outputs.fieldmap import MapContent
from geoskew.study.core import Study
from geoskew.study.mapcontent import background, contour_names, map_content, overlay_names
from geoskew.study.plan import can_plan, plan_of
from geoskew.study.rasters import write_study_rasters

Report = Callable[[str, float, float], None]


def content_of(
    study: Study,
    layers: Sequence[str],
    *,
    beside: Path,
    tiles: str | None,
    only: Mapping[str, str],
    blur_deg: float | None,
    report: Report,
) -> MapContent:
    """Everything that the page shows, with fewer sites or coarser places where asked for."""
    study.scenario.require_any("region", "sites", for_what="a field map")
    study.read()
    background(tiles)
    overlays = overlay_names(study, layers) if study.scenario.region is not None else ()
    planned = None
    if can_plan(study):
        planned = plan_of(study, on_progress=lambda done, total: report("plan of visits", done, total))
        if planned.plan.interrupted:
            raise KeyboardInterrupt
    with TemporaryDirectory(prefix=".fieldmap-", dir=beside) as scratch:
        rasters: dict[str, Path] = {}
        if study.scenario.region is not None:
            names = tuple(dict.fromkeys((*overlays, *contour_names(study))))
            made = write_study_rasters(study, Path(scratch), names, report=report)
            rasters = dict(zip(names, made, strict=True))
        content = map_content(study, rasters, overlays=overlays, planned=planned, tiles=tiles)
    if only or blur_deg is not None:
        # Districts are named amid all their sites: not for those who need not see them.
        content = replace(content, places=())
    if only:
        content = fieldmap.only(content, only)
    if blur_deg is not None:
        content = fieldmap.blurred(content, blur_deg)
    return content
