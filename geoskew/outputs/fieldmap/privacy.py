"""Maps for those who need not see everything: fewer sites, or coarser places."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import replace
from typing import TYPE_CHECKING, Final

import numpy as np

from geoskew.errors import InputError
from geoskew.layers import REGISTRY
from geoskew.outputs.fieldmap.content import MapContent
from geoskew.outputs.fieldmap.table import NUMBERS, as_text

if TYPE_CHECKING:
    import pandas as pd

# From two of these at a hundredth of a degree a place can be worked out again.
TELLTALE: Final = (
    "azimuth_",
    "elevation_",
    "range_",
    "skew_",
    "seen_",
    "setting_",
    "horizon_",
    "clearance_",
    "diffraction_",
    "height_m",
)
# Turns say what to do; whole degrees are enough for that and tell little of the place.
COARSE: Final = ("turn_", "window_")


def only(content: MapContent, wanted: Mapping[str, str]) -> MapContent:
    """Keep the sites whose columns hold the wanted text, and the routes that go with them.

    ``crew`` and ``day`` are those of the routes where the table has no such columns.

    Raises
    ------
    InputError
        A column does not exist, or no site is left.
    """
    table = content.sites
    if table is None:
        raise InputError("--only: there is no site list, so there is nothing to keep; leave --only out")
    keep = np.ones(len(table), dtype=bool)
    routes = list(content.routes)
    for column, value in wanted.items():
        if column in ("crew", "day"):
            routes = [route for route in routes if getattr(route, column) == value]
        if column in table.columns:
            keep &= np.asarray([cell == value for cell in as_text(table[column])], dtype=bool)
        elif column in ("crew", "day") and content.routes:
            visited = {identity for route in routes for identity in route.sites}
            keep &= np.asarray([cell in visited for cell in as_text(table["id"])], dtype=bool)
        else:
            raise InputError(
                f"--only {column}={value}: the assessed sites have no column {column!r}; they have "
                + ", ".join([*(("crew", "day") if content.routes else ()), *map(str, table.columns)])
            )
    if not keep.any():
        asked = ", ".join(f"{column}={value}" for column, value in wanted.items())
        raise InputError(f"--only {asked}: no site is left; check the value's spelling")
    left = table[keep].reset_index(drop=True)
    note = (
        f"This map shows {len(left)} of {len(table)} sites: "
        + ", ".join(f"{column} {value}" for column, value in wanted.items())
        + "."
    )
    return replace(content, sites=left, routes=routes, privacy_note=_joined(content.privacy_note, note))


def blurred(content: MapContent, step: float = 0.1) -> MapContent:
    """Move every site to the middle of a cell of `step` degrees and drop what gives its place away.

    Directions, settings, heights and routes go; turns and windows are rounded to whole degrees. Texts
    that were passed through stay: leave out columns with addresses before.

    Raises
    ------
    InputError
        The step is not above 0 and at most 10 degrees.
    """
    if not 0.0 < step <= 10.0:
        raise InputError(f"--blur {step:g}: a cell is above 0 and at most 10 degrees; 0.1 is about 11 km")
    if content.sites is None:
        return content
    left = _coarse(content.sites, step)
    note = f"Sites stand at the middle of cells of {step:g}°, not at their places; directions are left out."
    return replace(content, sites=left, routes=(), privacy_note=_joined(content.privacy_note, note))


def _coarse(table: pd.DataFrame, step: float) -> pd.DataFrame:
    gone = [name for name in table.columns if str(name).startswith(TELLTALE)]
    left = table.drop(columns=gone).copy()
    for name, most in (("lat", 90.0), ("lon", np.inf)):
        cells = (np.floor(left[name].to_numpy(dtype=np.float64) / step) + 0.5) * step
        left[name] = np.round(np.clip(cells, -most, most), 6)
    for name in left.columns:
        if str(name).startswith(COARSE) and (str(name) in REGISTRY or str(name) in NUMBERS):
            left[name] = np.round(left[name].to_numpy(dtype=np.float64))
    return left


def _joined(*notes: str) -> str:
    return " ".join(note for note in notes if note)
