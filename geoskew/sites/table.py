"""A table as it stands in a file, before anything is made of its cells."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass, field
from pathlib import Path
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from geoskew.sites.listing import Rejected

if TYPE_CHECKING:
    from pandas import DataFrame


@dataclass(frozen=True)
class Positions:
    """Positions taken from geometries: longitude and latitude in degrees, (N,), and what is wrong."""

    longitude: NDArray[np.float64]
    latitude: NDArray[np.float64]
    faults: Mapping[int, str]


@dataclass(frozen=True)
class RawTable:
    """Rows of a file with their origin.

    Attributes
    ----------
    path : Path
        The file.
    frame : pandas.DataFrame
        One column a column of the file, under its own names, which are all different.
    lines : ndarray of int
        Where each row begins, counted from 1.
    row_text : callable
        The text of a row, by its index in `frame`.
    word : str
        What `lines` counts: ``line``, ``row`` or ``feature``.
    comma_may_be_decimal : bool
        False where the comma parts cells.
    typed : mapping of str to ndarray of bool
        Cells that the file itself stored as numbers, by column; absent: none.
    positions : Positions, optional
        From geometries.
    rejected : list of Rejected
        Rows that could not even be cut into cells; they are not in `frame`.
    warnings : list of str
        What was read, but looks wrong.
    """

    path: Path
    frame: DataFrame
    lines: NDArray[np.int64]
    row_text: Callable[[int], str]
    word: str = "line"
    comma_may_be_decimal: bool = True
    typed: Mapping[str, NDArray[np.bool_]] = field(default_factory=dict)
    positions: Positions | None = None
    rejected: list[Rejected] = field(default_factory=list)
    warnings: list[str] = field(default_factory=list)
