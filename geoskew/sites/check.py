"""Checking the rows of a site list: every fault of every row, a whole column at a time."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from geoskew.region import Grid
from geoskew.sites.cells import Column, as_text, decimal_sign, numbers, yes_no
from geoskew.sites.exchanged import exchanged_rows
from geoskew.sites.faults import Faults
from geoskew.sites.headers import Headers
from geoskew.sites.meanings import CHOICES, NUMBERS, YES_NO, refusal, refusals
from geoskew.sites.table import RawTable
from geoskew.sites.vector import to_wgs84

if TYPE_CHECKING:
    from pandas import Series


@dataclass(frozen=True)
class Checked:
    """What the cells of all rows (N,) say, and what is wrong with them.

    Longitude and latitude are in degrees; `numbers` holds the other columns with a meaning that are
    numbers or yes/no (1 and 0), by our names. Values of faulty rows mean nothing.
    """

    ids: Series
    longitude: NDArray[np.float64]
    latitude: NDArray[np.float64]
    numbers: dict[str, NDArray[np.float64]]
    faults: Faults


def check_rows(table: RawTable, found: Headers, *, crs: str | None, grid: Grid | None = None) -> Checked:
    """Turn cells into values and find every fault of every row.

    Parameters
    ----------
    table : RawTable
        As read; positions from geometries, where there are any, are used instead of columns.
    found : Headers
        Which column is which.
    crs : str, optional
        CRS of the columns of the position; WGS 84 when absent.
    grid : Grid, optional
        The region, by which single rows with exchanged latitude and longitude are told.

    Raises
    ------
    InputError
        If the decimal sign cannot be told.
    """
    faults = Faults(len(table.frame))
    position = [found.source[name] for name in ("lat", "lon") if name in found.source]
    of_numbers = [name for name in NUMBERS if name in found.source]
    sign = decimal_sign(table, position, [found.source[name] for name in of_numbers])
    ids = as_text(table.frame[found.source["id"]])
    faults.add(ids.eq("").to_numpy(dtype=np.bool_), lambda row: "id is empty")
    longitude, latitude = _positions(table, position, crs, sign, faults)
    values = {}
    for name in of_numbers:
        column = numbers(table, found.source[name], sign=sign)
        _check_rules(faults, name, column)
        values[name] = column.values
    for name in YES_NO:
        if name in found.source:
            column = yes_no(table, found.source[name])
            _check_yes_no(faults, name, column)
            values[name] = column.values
    for name in CHOICES:
        if name in found.source:
            _check_choice(faults, name, as_text(table.frame[found.source[name]]))
    _check_stops(faults, values)
    _name_empty_rows(faults, table)
    if grid is not None and crs is None:
        _check_exchanged(faults, latitude, longitude, grid)
    _check_repeated(faults, ids, table)
    return Checked(ids, longitude, latitude, values, faults)


def _positions(
    table: RawTable, names: list[str], crs: str | None, sign: str, faults: Faults
) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Longitude and latitude of every row, with faults where there is none."""
    if table.positions is not None:
        wrong = table.positions.faults
        mask = np.isin(np.arange(len(table.frame)), list(wrong))
        faults.add(mask, lambda row: wrong[row])
        longitude, latitude = table.positions.longitude, table.positions.latitude
        _check_range(faults, latitude, longitude)
        return longitude, latitude
    north, east = (numbers(table, name, sign=sign) for name in names)
    for name, column in (("lat", north), ("lon", east)):
        _check_given(faults, name, column)
    if crs is None:
        _check_range(faults, north.values, east.values)
        return east.values, north.values
    longitude, latitude = to_wgs84(east.values, north.values, crs)
    lost = np.isfinite(north.values + east.values) & ~np.isfinite(longitude + latitude)
    faults.add(
        lost,
        lambda row: (
            f"lon {east.text.iloc[row]}, lat {north.text.iloc[row]} is no place in {crs}; "
            "lon is the easting and lat the northing"
        ),
    )
    _check_range(faults, latitude, longitude)
    return longitude, latitude


def _check_range(faults: Faults, latitude: NDArray[np.float64], longitude: NDArray[np.float64]) -> None:
    far, around = np.abs(latitude) > 90.0, np.abs(longitude) > 180.0
    swapped = far & (np.abs(latitude) <= 180.0) & (np.abs(longitude) <= 90.0)
    exchanged = "; lat and lon look swapped"
    faults.add(
        far,
        lambda row: f"lat {latitude[row]:.12g} is out of range: −90 to 90{exchanged if swapped[row] else ''}",
    )
    faults.add(around, lambda row: f"lon {longitude[row]:.12g} is out of range: −180 to 180, west negative")


def _check_given(faults: Faults, name: str, column: Column) -> None:
    faults.add(column.empty, lambda row: f"{name} is empty")
    _check_number(faults, name, column)


def _check_number(faults: Faults, name: str, column: Column) -> None:
    faults.add(
        column.wrong,
        lambda row: f"{name} {column.text.iloc[row]!r} is not a number{_hint(column.text.iloc[row])}",
    )


def _check_rules(faults: Faults, name: str, column: Column) -> None:
    _check_number(faults, name, column)
    refused = refusals(name, column.values)
    if refused:
        mask = np.isin(column.values, list(refused))
        faults.add(mask, lambda row: f"{name} {refused[float(column.values[row])]}")


def _check_yes_no(faults: Faults, name: str, column: Column) -> None:
    faults.add(
        column.wrong, lambda row: f"{name} {column.text.iloc[row]!r} is neither yes nor no: give 1 or 0"
    )


def _check_choice(faults: Faults, name: str, text: Series) -> None:
    refused = {value: reason for value in text.unique() if value and (reason := refusal(name, value))}
    if refused:
        faults.add(
            text.isin(list(refused)).to_numpy(dtype=np.bool_), lambda row: f"{name} {refused[text.iloc[row]]}"
        )


def _check_stops(faults: Faults, values: dict[str, NDArray[np.float64]]) -> None:
    if "feed_low_deg" in values and "feed_high_deg" in values:
        low, high = values["feed_low_deg"], values["feed_high_deg"]
        faults.add(
            low >= high, lambda row: f"feed_low_deg {low[row]:g} is not below feed_high_deg {high[row]:g}"
        )


def _name_empty_rows(faults: Faults, table: RawTable) -> None:
    """Say that a row is empty instead of listing its empty cells."""
    if table.positions is not None:
        return
    for row, reasons in faults.reasons.items():
        if reasons[0] == "id is empty" and not table.row_text(row).strip(',;\t "'):
            faults.reasons[row] = ["the row is empty"]


def _check_exchanged(
    faults: Faults, latitude: NDArray[np.float64], longitude: NDArray[np.float64], grid: Grid
) -> None:
    """Reject single rows that lie in the region only with latitude and longitude exchanged."""
    faults.add(
        exchanged_rows(longitude, latitude, ~faults.bad, grid),
        lambda row: (
            "latitude and longitude look exchanged: "
            f"lat {latitude[row]:.12g}, lon {longitude[row]:.12g} lies outside of the region, "
            "but inside it the other way round; exchange them"
        ),
    )


def _check_repeated(faults: Faults, ids: Series, table: RawTable) -> None:
    """Reject later rows of an id; a row that is rejected for another reason holds no id."""
    usable = ids[~faults.bad]
    repeated = usable[usable.duplicated()]
    if repeated.empty:
        return
    first = usable[~usable.duplicated()]
    rows = first[first.isin(repeated)]
    lines = dict(zip(rows, table.lines[rows.index.to_numpy()].tolist(), strict=True))
    mask = np.zeros(len(ids), dtype=np.bool_)
    mask[repeated.index.to_numpy()] = True
    faults.add(
        mask, lambda row: f"id {ids.iloc[row]!r} is that of {table.word} {lines[ids.iloc[row]]} already"
    )


def _hint(text: str) -> str:
    if "," in text and "." not in text:
        return "; a decimal comma is read only where all numbers have one and no comma parts the cells"
    if "°" in text or (text[:1].isdigit() and text[-1:].upper() in ("N", "S", "E", "W", "O")):
        return "; write decimal degrees, south and west negative"
    if text.lstrip("+-").replace(".", "", 1).isdigit():
        return "; the other numbers of this file have a decimal comma"
    return ""
