"""Maps of a study for the report: fields on a grid of the figure's own, isolines, sites."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from functools import cached_property
from typing import TYPE_CHECKING, Any, Final

import numpy as np
from numpy.typing import NDArray

from geoskew.decision import ACTIONS
from geoskew.evaluate import evaluate
from geoskew.layers import REGISTRY, Layer
from geoskew.outputs import contours
from geoskew.outputs.report import Base, Field, Isoline, Marks
from geoskew.places import Places
from geoskew.resources import outline
from geoskew.study.mapcontent import grid_in_degrees, shown_bounds

if TYPE_CHECKING:
    from geoskew.study.core import Study

# Cells along the longer side of a figure: 0.4 mm on paper.
LONG_SIDE: Final = 260
# Isolines of one figure: more cannot be told apart on half a page's width.
MOST_LINES: Final = 14
# Room around the region, as a share of its longer side.
ROOM_SHARE: Final = 0.04


@dataclass(frozen=True)
class Canvas:
    """Where a study's figures lie: the base map, and the centres of their cells."""

    study: Study
    names: tuple[str, ...]

    @cached_property
    def base(self) -> Base:
        """Land and borders within the part of the world that is shown."""
        import shapely

        bounds = self._bounds
        land = [
            shapely.get_coordinates(shapely.get_exterior_ring(part))
            for part in shapely.get_parts(outline("land", bounds))
        ]
        borders = [shapely.get_coordinates(part) for part in shapely.get_parts(outline("borders", bounds))]
        return Base(bounds, tuple(land), tuple(borders))

    @property
    def _bounds(self) -> tuple[float, float, float, float]:
        """The region with a little room (a far site must not make it small); without one, all sites."""
        if self.study.scenario.region is None:
            west, south, east, north = shown_bounds(self.study)
            return west, south, east + 360.0 * (east < west), north
        west, south, east, north = grid_in_degrees(self.study.grid)
        room = ROOM_SHARE * max(east - west, north - south)
        west, east = (west - room, east + room) if east - west + 2.0 * room <= 360.0 else (west, east)
        return west, max(-90.0, south - room), east, min(90.0, north + room)

    @cached_property
    def places(self) -> Places:
        """Cell centres of the region, or without one of all that is shown."""
        region = self.study.scenario.region
        west, south, east, north = self.base.bounds if region is None else grid_in_degrees(self.study.grid)
        step = max(east - west, north - south) / LONG_SIDE
        if region is not None and self.study.grid.is_geographic:
            step = max(step, self.study.grid.step)
        columns, rows = max(2, round((east - west) / step)), max(2, round((north - south) / step))
        x = west + (np.arange(columns) + 0.5) * (east - west) / columns
        y = north - (np.arange(rows) + 0.5) * (north - south) / rows
        inside = None
        if region is not None:
            inside = self.study.grid.covers(*np.broadcast_arrays(x[np.newaxis, :], y[:, np.newaxis]))
        return Places(x[np.newaxis, :], y[:, np.newaxis], np.full((1, 1), np.nan), inside)

    @cached_property
    def values(self) -> dict[str, NDArray[Any]]:
        """The layers at the cells, for the scenario's default terminal."""
        return evaluate(self.study.scenario, self.places, self.names, inputs=self.study.inputs)

    def field(
        self,
        record: Layer,
        values: NDArray[Any],
        *,
        thick: Sequence[float] = (),
        limits: tuple[float, float] | None = None,
    ) -> Field:
        """A layer's values as a figure takes them, with isolines where it is no class."""
        x, y = self.places.longitude[0], self.places.latitude[:, 0]
        made = Field(record, values, x, y, limits=limits, thick=tuple(thick))
        if record.is_class or not np.isfinite(values).any():
            return made
        return replace(made, lines=_isolines(record, values, x, y, thick))

    def marks(self, longitude: Any, latitude: Any, actions: Sequence[object]) -> Marks:
        """Sites within the figure with an action each, by name; those without one are left out."""
        west, south, east, north = self.base.bounds
        middle = 0.5 * (west + east)
        x, y = np.asarray(longitude, dtype=np.float64), np.asarray(latitude, dtype=np.float64)
        x = middle + np.mod(x - middle + 180.0, 360.0) - 180.0
        codes = {name: code for code, name in ACTIONS}
        found = np.array([codes.get(str(one), -1) for one in actions], dtype=np.int64)
        inside = (x >= west) & (x <= east) & (y >= south) & (y <= north)
        return Marks(x[inside], y[inside], found[inside], ACTIONS)


def _isolines(
    record: Layer, values: NDArray[Any], x: NDArray[Any], y: NDArray[Any], thick: Sequence[float]
) -> tuple[Isoline, ...]:
    step = record.contour_step
    levels, _ = contours.levels_of(values, step, layer=record, widen=True)
    for factor in (2.0, 4.0, 10.0, 20.0, 40.0, 100.0):
        if len(levels) <= MOST_LINES:
            break
        levels, _ = contours.levels_of(values, step * factor, layer=record, widen=True)
    if record.kind != "circular":
        levels = sorted({*levels, *(float(one) for one in thick)})
    found = contours.isolines(values, x, y, levels, kind=record.kind, period=record.period)
    return tuple(Isoline(one.level, np.asarray(part)) for one in found for part in one.parts)


def lesser(suffix: str) -> Layer:
    """The lesser margin of both moments at the shared setting, as a layer of a figure."""
    return replace(
        REGISTRY[f"margin_shared_after{suffix}"],
        name=f"margin at the shared setting{' in rain' if suffix else ''}",
        description="Lesser margin of both moments at the shared setting",
    )
