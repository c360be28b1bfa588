"""What a report consists of: a flow of blocks that HTML and PDF set alike."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field
from datetime import date, datetime
from typing import Literal, TypeAlias

import numpy as np
from numpy.typing import NDArray

from geoskew.layers import Layer

Array: TypeAlias = NDArray[np.float64]
Bounds: TypeAlias = tuple[float, float, float, float]


@dataclass(frozen=True)
class Heading:
    """Title of a section; with ``new_page`` on paper at the top of one."""

    text: str
    new_page: bool = False


@dataclass(frozen=True)
class Words:
    """A paragraph; ``small`` for remarks."""

    text: str
    small: bool = False


@dataclass(frozen=True)
class Bullets:
    """A list; ``small`` for long ones."""

    items: tuple[str, ...]
    small: bool = False


@dataclass(frozen=True)
class Grid:
    """A table. ``align``: a letter a column, ``l`` or ``r``; ``widths``: shares of the page's width."""

    caption: str
    headings: tuple[str, ...]
    rows: tuple[tuple[str, ...], ...]
    align: str
    widths: tuple[float, ...]

    def __post_init__(self) -> None:
        counts = {len(self.headings), len(self.align), len(self.widths), *(len(row) for row in self.rows)}
        if len(counts) != 1:
            raise ValueError(
                f"table {self.caption!r} has rows, letters or widths of different numbers: {counts}"
            )


@dataclass(frozen=True)
class Isoline:
    """One line of equal value: its level and points (N, 2) of longitude and latitude."""

    level: float
    points: Array


@dataclass(frozen=True)
class Field:
    """Values of a layer at cell centres.

    ``values`` (H, W): NaN (or 255 for classes) where there is none; ``longitude`` (W,) ascending,
    ``latitude`` (H,) descending, degrees. ``limits``: what the colours span, where not the layer's own.
    """

    layer: Layer
    values: NDArray[np.generic]
    longitude: Array
    latitude: Array
    lines: tuple[Isoline, ...] = ()
    thick: tuple[float, ...] = ()
    limits: tuple[float, float] | None = None


@dataclass(frozen=True)
class Marks:
    """Sites on a map: positions in degrees and class code of each."""

    longitude: Array
    latitude: Array
    codes: NDArray[np.int64]
    classes: tuple[tuple[int, str], ...]


@dataclass(frozen=True)
class Base:
    """The base map: land as rings, borders as lines, each (N, 2), and the part of the world that is shown."""

    bounds: Bounds
    land: Sequence[Array] = ()
    borders: Sequence[Array] = ()


@dataclass(frozen=True)
class MapFigure:
    """A map of one layer, of sites, or of both."""

    caption: str
    alt: str
    base: Base
    shown: Field | None = None
    marks: Marks | None = None


@dataclass(frozen=True)
class LoadFigure:
    """Visits a day, stacked by crew: ``visits`` (crews, days)."""

    caption: str
    alt: str
    days: tuple[date, ...]
    crews: tuple[str, ...]
    visits: NDArray[np.int64]
    changeover: date


@dataclass(frozen=True)
class Figures:
    """Figures beside each other: one or two."""

    items: tuple[MapFigure | LoadFigure, ...]


Block: TypeAlias = Heading | Words | Bullets | Grid | Figures
Ending: TypeAlias = Literal[".html", ".pdf"]


@dataclass(frozen=True)
class Report:
    """A whole report. ``dated`` is the file's time, so that the same input gives the same bytes."""

    title: str
    subtitle: str
    foot: str
    dated: datetime
    blocks: tuple[Block, ...] = field(default_factory=tuple)
