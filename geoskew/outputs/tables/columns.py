"""The columns of a table: what they are, and their values settled once for every format."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any, Final, Literal

import numpy as np

from geoskew.layers import Layer

if TYPE_CHECKING:
    import pandas as pd

DECIMALS: Final = 6
_NO_CLASS: Final = 255


@dataclass(frozen=True, slots=True)
class ColumnInfo:
    """A column's name, unit and meaning.

    ``kind``: ``given`` values are written as they are; ``layer`` values are numbers of ours, rounded
    to six decimals; ``flag`` values are 1 or 0 (255 and NaN: no value).
    """

    name: str
    unit: str = ""
    meaning: str = ""
    kind: Literal["given", "layer", "flag"] = "given"

    @property
    def description(self) -> str:
        """Meaning with the unit."""
        return f"{self.meaning} ({self.unit})" if self.unit else self.meaning


def layer_column(layer: Layer) -> ColumnInfo:
    """The column of a layer; a category stands in it by the names of its classes."""
    kinds: dict[str, Literal["given", "layer", "flag"]] = {"flag": "flag", "category": "given"}
    return ColumnInfo(layer.name, layer.unit, layer.description, kinds.get(layer.kind, "layer"))


def settled(table: pd.DataFrame, columns: Sequence[ColumnInfo]) -> Any:
    """An Arrow table of text, floats, whole numbers and times, with null for no value.

    Every format is written from it, so that all of them hold the same values.

    Raises
    ------
    ValueError
        A column is missing from the table, or named twice.
    """
    import pyarrow as pa

    names = [column.name for column in columns]
    missing = [name for name in names if name not in table.columns]
    if missing or len(set(names)) < len(names) or not table.columns.is_unique:
        raise ValueError(f"columns {missing or names} are missing from the table or named twice")
    return pa.table([_settle(table[column.name], column.kind) for column in columns], names=names)


def _settle(values: pd.Series[Any], kind: str) -> Any:
    import pandas as pd
    import pyarrow as pa

    if kind == "layer":
        numbers = values.to_numpy(dtype=np.float64, na_value=np.nan)
        return pa.array(np.round(numbers, DECIMALS) + 0.0, from_pandas=True)
    if kind == "flag":
        flags = values.to_numpy(dtype=np.float64, na_value=np.nan)
        empty = np.isnan(flags) | (flags == _NO_CLASS)
        return pa.array(np.where(empty, 0, flags).astype(np.int64), mask=empty)
    if pd.api.types.is_bool_dtype(values):
        return pa.array([None if pd.isna(one) else int(one) for one in values], pa.int64())
    if pd.api.types.is_integer_dtype(values):
        return pa.array(values, pa.int64(), from_pandas=True)
    if pd.api.types.is_float_dtype(values):
        return pa.array(values.to_numpy(dtype=np.float64, na_value=np.nan), from_pandas=True)
    if pd.api.types.is_datetime64_any_dtype(values):
        zone = getattr(values.dtype, "tz", None)
        return pa.array(values.dt.tz_convert("UTC") if zone is not None else values, from_pandas=True)
    return pa.array([_as_text(one) for one in values], pa.string())


def _as_text(value: Any) -> str | None:
    """A cell of a column of text or of mixed values."""
    if isinstance(value, str):
        return value
    if isinstance(value, bool | np.bool_):
        return str(int(value))
    if value is None or (np.ndim(value) == 0 and value != value) or str(value) in ("<NA>", "NaT"):
        return None
    return str(value)
