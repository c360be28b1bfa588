"""What a field map is made of: plain data, no scenario object and no path."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, field
from typing import TYPE_CHECKING, Any, Literal, Protocol

import numpy as np
from numpy.typing import NDArray

from geoskew.layers import Layer

if TYPE_CHECKING:
    import pandas as pd

# West, south, east, north in degrees; east may run past 180.
Box = tuple[float, float, float, float]


class ColumnFact(Protocol):
    """What is to be known of a column of the assessed table."""

    @property
    def name(self) -> str:
        """Name of the column."""

    @property
    def unit(self) -> str:
        """Unit, empty for none."""

    @property
    def meaning(self) -> str:
        """One line of what it holds."""


@dataclass(frozen=True, slots=True)
class SatelliteFacts:
    """A satellite as the page needs it; degrees. ``aim`` is (longitude, latitude) or None for nadir."""

    name: str
    longitude: float
    latitude: float = 0.0
    tilt: float = 0.0
    aim: tuple[float, float] | None = None


@dataclass(frozen=True, slots=True)
class GeometryFacts:
    """What the page needs to work out directions and mismatch at a place without a site.

    ``port_offset`` (degrees) is what is added to the angle that suits the new carrier: 90 where one
    port has to take a carrier of the other polarisation, else 0. ``linear`` is False as soon as a
    carrier is circular: then there is no turn and no mismatch.
    """

    outgoing: SatelliteFacts
    incoming: SatelliteFacts
    lowest_elevation: float = 5.0
    port_offset: float = 0.0
    linear: bool = True


@dataclass(frozen=True, slots=True, eq=False)
class Overlay:
    """Values of one layer on a grid; ``transform`` maps (column, row) corners to ``crs`` as affine does."""

    layer: Layer
    values: NDArray[Any]
    crs: str
    transform: tuple[float, float, float, float, float, float]


@dataclass(frozen=True, slots=True, eq=False)
class ContourLine:
    """One isoline: ``coordinates`` is (N, 2) longitude and latitude in degrees."""

    layer: str
    level: float
    coordinates: NDArray[np.float64]
    unit: str = ""


@dataclass(frozen=True, slots=True, eq=False)
class Route:
    """One crew's day on the road: its track, and the ids of its sites in the order of the visits."""

    crew: str
    day: str
    coordinates: NDArray[np.float64]
    sites: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True, eq=False)
class Basemap:
    """Outlines in degrees, each (N, 2) longitude and latitude, and who is to be thanked for them."""

    land: Sequence[NDArray[np.float64]] = ()
    borders: Sequence[NDArray[np.float64]] = ()
    attribution: str = ""


@dataclass(frozen=True, slots=True)
class PlaceName:
    """A name to write on the map."""

    name: str
    longitude: float
    latitude: float


@dataclass(frozen=True, slots=True)
class Tiles:
    """An online background that stays off until it is asked for."""

    url: str
    attribution: str


@dataclass(frozen=True, slots=True, eq=False)
class MapContent:
    """Everything that one page shows.

    ``sites`` is the assessed table: ``id``, ``lat``, ``lon``, then reserved columns, layers by name
    (``action`` as its name) and passed-through columns. ``provenance`` is shown line by line, the date
    of making included, so that the same content gives the same bytes. ``judged_in`` says which margins
    decide, ``reserve_db`` where the line of the reserve stands. ``identity`` keeps ticks made on one map
    apart from those of another; the digest of the scenario serves well. ``basemap`` may be a function
    that gives the outlines of a box: the map shows more than its sites and layers, and how much more
    is settled when it is written.
    """

    title: str
    geometry: GeometryFacts
    provenance: Mapping[str, str] = field(default_factory=dict)
    cautions: Sequence[str] = ()
    judged_in: Literal["clear", "rain"] = "clear"
    reserve_db: float = 1.0
    identity: str = ""
    sites: pd.DataFrame | None = None
    columns: Sequence[ColumnFact] = ()
    overlays: Sequence[Overlay] = ()
    contours: Sequence[ContourLine] = ()
    coverage: Sequence[ContourLine] = ()
    routes: Sequence[Route] = ()
    basemap: Basemap | Callable[[Box], Basemap] = field(default_factory=Basemap)
    places: Sequence[PlaceName] = ()
    tiles: Tiles | None = None
    privacy_note: str = ""
