"""What comes out of reading a site list: the sites that can be used, and the rows that cannot."""

from __future__ import annotations

from dataclasses import dataclass, field
from pathlib import Path
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from geoskew.places import Places
from geoskew.sites.meanings import NUMBERS, WHOLE_NUMBERS, YES_NO

if TYPE_CHECKING:
    from pandas import DataFrame


@dataclass(frozen=True, slots=True)
class Rejected:
    """A row that could not be used.

    Attributes
    ----------
    line : int
        Line of the file where the row begins, counted from 1; row of the sheet in XLSX; number of
        the feature, counted from 1, in vector files and Parquet, of the row in a query's result.
    id : str
        As far as it could be read.
    reason : str
        Every fault of the row: value, rule and remedy.
    row : str
        The row as it stands in the file; rows of other files than CSV are joined by commas.
    """

    line: int
    id: str
    reason: str
    row: str


@dataclass(frozen=True)
class SiteList:
    """The usable rows of a site list, in their order.

    Attributes
    ----------
    frame : pandas.DataFrame
        Every column of the file in its order and with its own values, columns with a meaning under
        our names; cells of CSV and XLSX are text.
    ids : tuple of str
        One a site, all different.
    places : Places
        Positions as (N,) arrays, degrees; height in metres where ``height_m`` gave it, else NaN; the
        columns that override values of ``[terminal]``, NaN where a cell is empty.
    rejected : list of Rejected
        By line.
    reserved, extra : tuple of str
        The other columns of `frame`: those with a meaning, and those passed through.
    warnings : list of str
        What was read, but looks wrong.
    lines : ndarray of int
        Line of each site in the file, as in `Rejected`.
    numbers : mapping of str to ndarray
        Every column that holds numbers or yes/no (1 and 0), as (N,) floats; NaN where empty.
    source : Path
        The file, or the words for a database's query: where rows are counted, for messages.
    """

    frame: DataFrame
    ids: tuple[str, ...]
    places: Places
    rejected: list[Rejected]
    reserved: tuple[str, ...]
    extra: tuple[str, ...]
    warnings: list[str]
    lines: NDArray[np.int64]
    numbers: dict[str, NDArray[np.float64]] = field(default_factory=dict)
    source: Path = Path("sites")

    def __len__(self) -> int:
        """Number of usable sites."""
        return len(self.ids)

    def front(self) -> DataFrame:
        """Columns that stand before the layers in an assessed table.

        Returns
        -------
        pandas.DataFrame
            ``id``, ``lat``, ``lon`` (WGS 84), then the reserved columns that were given: numbers as
            floats, whole numbers and yes/no (1, 0) as nullable integers, all else as it stands.
        """
        import pandas

        table = {
            "id": pandas.Series(self.ids, dtype="str"),
            "lat": pandas.Series(self.places.latitude),
            "lon": pandas.Series(self.places.longitude),
        }
        for name in self.reserved:
            if name in WHOLE_NUMBERS or name in YES_NO:
                table[name] = pandas.Series(self.numbers[name]).astype("Int64")
            elif name in NUMBERS:
                table[name] = pandas.Series(self.numbers[name])
            else:
                table[name] = self.frame[name]
        return pandas.DataFrame(table)

    def back(self) -> DataFrame:
        """Columns that stand behind the layers in an assessed table, as they came."""
        return self.frame[list(self.extra)]
