"""Zones of one setting over a study's region, and what one number in the place of many costs."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING, Any, Final, Literal

import numpy as np
from numpy.typing import NDArray

from geoskew.engine import computed_blocks
from geoskew.errors import InputError
from geoskew.fieldwork.zones import NO_ZONE, Partition, partition
from geoskew.outputs.zones import Zone, write_zones
from geoskew.region import Grid, Window
from geoskew.region.districts import read_districts
from geoskew.situation import Situation
from geoskew.situation.carriers import BEFORE, REALIGNED, UNTOUCHED

if TYPE_CHECKING:
    from geoskew.study.core import Study

Of = Literal["before", "after", "shared"]
Progress = Callable[[str, float, float], None]

# The layer whose values a zone's setting stands for.
WANTED: Final[dict[str, str]] = {
    "before": "skew_before",
    "after": "setting_realigned",
    "shared": "setting_shared",
}
MEANING: Final[dict[str, str]] = {
    "before": "aligned to the satellite in service",
    "after": "dish and feed set for the new satellite",
    "shared": "shared setting that serves both satellites",
}
# More zones than these are of no use to a crew, and slow to draw.
MOST_ZONES: Final = 2_000


@dataclass(frozen=True)
class Zones:
    """The zones of a region: their rows, the cells' labels, and how they were made."""

    rows: tuple[Zone, ...]
    labels: NDArray[np.int32]
    parted: Partition
    of: Of
    tolerance: float
    split: tuple[str, ...] = ()

    @property
    def worst_deviation(self) -> float:
        """Degrees, over all zones."""
        return max(one.worst_deviation_deg for one in self.rows)

    @property
    def worst_cost(self) -> float | None:
        """Decibels, over all zones."""
        return max((one.cost_worst_db for one in self.rows if one.cost_worst_db is not None), default=None)


def zones_of(
    study: Study,
    tolerance: float,
    *,
    of: Of = "shared",
    districts: Path | None = None,
    progress: Progress = lambda phase, done, total: None,
) -> Zones:
    """Part the region into the fewest zones within which one setting is within a tolerance of every place.

    Parameters
    ----------
    study : Study
        With a region; cells are of the scenario's default terminal.
    tolerance : float
        Degrees.
    of : "before", "after" or "shared"
        Whose setting.
    districts : Path, optional
        Polygons that zones keep whole where they can.

    Raises
    ------
    MissingPartError
        The scenario has no region.
    InputError
        The tolerance is out of range, no cell has such a setting, or the districts cannot be read.
    """
    study.scenario.require("region", for_what="zones")
    if not 0.0 < tolerance <= 90.0:
        raise InputError(f"--tolerance {tolerance:g} is not above 0 and at most 90 degrees")
    grid = study.grid
    wanted = _wanted(study, WANTED[of], progress)
    if not np.isfinite(wanted).any():
        raise InputError(
            f"no cell of the region has a value in {WANTED[of]}: the satellites are out of sight or the "
            "carriers circular; zones need a setting to part by"
        )
    # Bands of twice the tolerance from the lowest to the highest setting are enough without districts.
    if np.ceil(180.0 / (2.0 * tolerance)) > MOST_ZONES:
        least = 180.0 / (2.0 * MOST_ZONES)
        raise InputError(
            f"--tolerance {tolerance:g} asks for too many zones; give at least {least:g} degrees"
        )
    labels, names = (None, ()) if districts is None else read_districts(districts, grid)
    parted = partition(wanted, tolerance, districts=labels)
    rows = _rows(study, grid, parted, wanted, of, progress)
    return Zones(rows, parted.labels, parted, of, tolerance, tuple(names[number] for number in parted.split))


def _wanted(study: Study, name: str, progress: Progress) -> NDArray[np.float64]:
    grid = study.grid
    values = np.full(grid.shape, np.nan)
    done = 0
    for window, block in computed_blocks(study.scenario, study.inputs, grid, [name]):
        values[_slices(window)] = block[name]
        done += window.height * window.width
        progress("computing settings", done, grid.cells)
    return values


def _slices(window: Window) -> tuple[slice, slice]:
    return slice(window.row, window.row + window.height), slice(window.column, window.column + window.width)


def _rows(
    study: Study, grid: Grid, parted: Partition, wanted: NDArray[np.float64], of: Of, progress: Progress
) -> tuple[Zone, ...]:
    """Each zone's row: what it holds, and what its one setting costs."""
    count = len(parted.settings)
    sums = {name: np.zeros(count) for name in ("cells", "weight", "costly", "cost")}
    worst, worst_cost, least = (np.full(count, -np.inf), np.full(count, -np.inf), np.full(count, np.inf))
    done = 0
    for window in grid.windows():
        here = _slices(window)
        labels = parted.labels[here]
        known = labels != NO_ZONE
        of_zone = labels[known]
        weight = _weights(grid, window)[known]
        np.add.at(sums["cells"], of_zone, 1.0)
        np.add.at(sums["weight"], of_zone, weight)
        deviation = np.abs(_apart(wanted[here][known], parted.settings[of_zone]))
        np.maximum.at(worst, of_zone, deviation)
        margin, cost = (one[known] for one in _cost(study, window, parted, of))
        judged = np.isfinite(cost)
        np.add.at(sums["costly"], of_zone[judged], weight[judged])
        np.add.at(sums["cost"], of_zone[judged], (weight * cost)[judged])
        np.maximum.at(worst_cost, of_zone[judged], cost[judged])
        np.minimum.at(least, of_zone[judged], margin[judged])
        done += window.height * window.width
        progress("cost of the zones", done, grid.cells)
    total = float(sums["weight"].sum())
    with np.errstate(invalid="ignore"):
        mean = sums["cost"] / sums["costly"]
    return tuple(
        Zone(
            number + 1,
            float(parted.settings[number]),
            int(sums["cells"][number]),
            100.0 * float(sums["weight"][number]) / total,
            float(worst[number]),
            _or_none(worst_cost[number]),
            _or_none(mean[number]),
            _or_none(least[number]),
        )
        for number in range(count)
    )


def _or_none(value: float) -> float | None:
    return float(value) if np.isfinite(value) else None


def _apart(one: NDArray[np.float64], other: NDArray[np.float64]) -> NDArray[np.float64]:
    from geoskew.angles import fold

    return fold(one - other)


def _weights(grid: Grid, window: Window) -> NDArray[np.float64]:
    """A cell's area but for a constant: cells of a geographic grid shrink by the cosine of latitude."""
    shape = (window.height, window.width)
    if not grid.is_geographic:
        return np.ones(shape)
    return np.asarray(np.broadcast_to(np.cos(np.deg2rad(grid.block(window).latitude)), shape))


def _cost(study: Study, window: Window, parted: Partition, of: Of) -> tuple[NDArray[Any], NDArray[Any]]:
    """Deciding margin at the zone's setting, and what it lacks against the place's own; both (H, W).

    Of the shared setting the lesser margin of both moments counts. NaN where there is no margin or no zone.
    """
    places = study.grid.block(window)
    situation = Situation(study.scenario, places, study.inputs)
    labels = parted.labels[_slices(window)]
    given = np.where(labels == NO_ZONE, np.nan, parted.settings[np.maximum(labels, 0)])

    def margin(setting: Any) -> NDArray[np.float64]:
        if of == "before":
            return situation.deciding_margin(BEFORE, setting)
        if of == "after":
            return situation.deciding_margin(REALIGNED, setting)
        before, after = (situation.deciding_margin(stand, setting) for stand in (BEFORE, UNTOUCHED))
        return np.minimum(before, after)

    own = {
        "before": lambda: situation.before.skew,
        "after": lambda: situation.setting_realigned,
        "shared": lambda: situation.setting_shared,
    }[of]()
    with np.errstate(invalid="ignore"):
        at_zone = np.broadcast_to(margin(given), labels.shape)
        return at_zone, np.broadcast_to(margin(own), labels.shape) - at_zone


def write(zones: Zones, study: Study, path: Path) -> None:
    """Write the zones as polygons."""
    about = (
        f"Zones within which one setting ({MEANING[zones.of]}) is within {zones.tolerance:g} degrees of "
        "every place. A zone is one setting and may consist of several pieces. Made by geoskew from scenario "
        f"{study.scenario.digest[:12]}; {study.judged}; default terminal."
    )
    write_zones(path, zones.rows, zones.labels, study.grid, about)
