"""How many bytes results will take, about: for `check`, and before much work ends at a full disk."""

from __future__ import annotations

import math
import shutil
from collections.abc import Sequence
from pathlib import Path
from typing import Final

from geoskew.errors import OutputError
from geoskew.layers import REGISTRY
from geoskew.outputs.contours import has_contours
from geoskew.outputs.contours.source import MOST_CELLS
from geoskew.study.core import Study

# Bytes that a run leaves, as the bundled scenarios have them: of a stored layer by cell, of any GeoTIFF
# besides, of contours by layer and by cell along the side of a square region, of all that is written
# about a site, and of what stands in every folder.
A_CELL: Final = 0.8
A_CLASS_CELL: Final = 0.03
A_RASTER: Final = 5_000
A_CONTOURED_LAYER: Final = 25_000
A_CONTOURED_SIDE: Final = 170
A_SITE: Final = 16_000
A_FOLDER: Final = 700_000
# A foretold size is good to about this factor.
UNSURE: Final = 2.0


def bytes_of_run(study: Study) -> float:
    """About how many bytes a run writes."""
    total = float(A_FOLDER)
    if study.scenario.region is not None:
        cells, names = study.grid.cells, study.raster_names
        total += bytes_of_rasters(cells, names)
        # Contours of very large grids are drawn on fewer cells.
        side = math.sqrt(min(cells, MOST_CELLS))
        drawn = sum(has_contours(REGISTRY[name]) for name in names)
        total += drawn * (A_CONTOURED_LAYER + A_CONTOURED_SIDE * side)
    if study.scenario.has_sites:
        total += A_SITE * len(study.sites)
    return total


def bytes_of_rasters(cells: int, names: Sequence[str]) -> float:
    """About how many bytes some layers of a grid take."""
    classes = sum(REGISTRY[name].is_class for name in names)
    return A_RASTER * len(names) + cells * (A_CLASS_CELL * classes + A_CELL * (len(names) - classes))


def require_room(folder: Path, needed: float) -> None:
    """Check, before the work, that a disk has the room that the results take at the least.

    Raises
    ------
    OutputError
        It has not.
    """
    there = next(place for place in (folder, *folder.absolute().parents) if place.is_dir())
    free = shutil.disk_usage(there).free
    if free * UNSURE < needed:
        raise OutputError(
            f"{folder}: the disk is full; about {in_words(needed)} are needed and {in_words(free)} are free: "
            "free some space or choose another disk"
        )


def in_words(count: float) -> str:
    """A number of bytes for reading.

    Examples
    --------
    >>> in_words(1_234_567)
    '1.23 MB'
    """
    for unit in ("bytes", "kB", "MB", "GB"):
        if count < 1000.0:
            return f"{count:.3g} {unit}"
        count /= 1000.0
    return f"{count:.3g} TB"
