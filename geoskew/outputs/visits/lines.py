"""The plan as a GeoPackage: driving lines, stops, and those who are not reached."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Any, Final

from geoskew.outputs import geopackage
from geoskew.outputs.geopackage import About
from geoskew.outputs.visits.sheet import DAY_MEANINGS, MEANINGS, VisitSheets, stops

if TYPE_CHECKING:
    import pandas

_NUMBERS: Final = (
    "turn", "km_leg", "lon", "lat", "km", "base_lon", "base_lat", "weight", "fail_probability",
)  # fmt: skip


def write_lines(part: Path, sheets: VisitSheets) -> None:
    """Write the layers ``tours`` (a line a crew and day), ``visits``, ``unreached``.

    A line that crosses 180° of longitude runs on past it, so that it stays short on a map.
    """
    import shapely

    table = stops(sheets)
    lost = sheets.unreached[sheets.unreached["lon"].notna() & sheets.unreached["lat"].notna()]
    with geopackage.reproducible():
        _add(part, "tours", "LineString", sheets.days, _tours(sheets), "Driving lines of each crew's days")
        points = shapely.points(_numbers(table, "lon"), _numbers(table, "lat"))
        _add(part, "visits", "Point", table, points, "Stops in order of driving")
        points = shapely.points(_numbers(lost, "lon"), _numbers(lost, "lat"))
        _add(part, "unreached", "Point", lost, points, "Sites that cannot be reached in time")
    tours = [About(name, meaning) for name, meaning in DAY_MEANINGS.items() if name in sheets.days]
    described = {
        "visits": [About(str(name), MEANINGS[name]) for name in table.columns],
        "unreached": [About(str(name), MEANINGS[name]) for name in lost.columns],
    }
    geopackage.describe(part, {"tours": tours, **described})


def _tours(sheets: VisitSheets) -> list[Any]:
    import numpy as np
    import shapely

    by_day = dict(list(sheets.visits.groupby(["crew", "day"], sort=False)))
    lines = []
    for load in sheets.days.to_dict("records"):
        # A day of a round may be spent driving alone.
        visits = by_day.get((load["crew"], load["day"]), sheets.visits.iloc[:0]).sort_values("order")
        lon = np.array([load["start_lon"], *visits["lon"], load["end_lon"]], dtype=float)
        lat = np.array([load["start_lat"], *visits["lat"], load["end_lat"]], dtype=float)
        lines.append(shapely.LineString(np.column_stack((np.unwrap(lon, period=360.0), lat))))
    return lines


def _numbers(table: pandas.DataFrame, name: str) -> Any:
    return table[name].to_numpy(dtype=float)


def _add(
    part: Path, layer: str, geometry_type: str, table: pandas.DataFrame, geometry: Any, description: str
) -> None:
    import pyarrow
    import shapely

    columns = {str(name): _column(table, str(name)) for name in table.columns}
    columns["geom"] = pyarrow.array(list(shapely.to_wkb(geometry)), pyarrow.binary())
    geopackage.add_layer(
        part,
        pyarrow.table(columns),
        layer=layer,
        geometry_type=geometry_type,
        crs="EPSG:4326",
        title=layer,
        description=description,
    )


def _column(table: pandas.DataFrame, name: str) -> Any:
    """A column with its type, the same whether the table has rows or not."""
    import pandas
    import pyarrow

    if name == "day":
        return pyarrow.array(table[name].tolist(), pyarrow.date32())
    if name in ("order", "visits"):
        return pyarrow.array(table[name].tolist(), pyarrow.int64())
    if name in _NUMBERS:
        cells = table[name]
        if cells.dtype.kind not in "if":  # a cell as it was given may have a decimal comma
            cells = cells.astype("string").str.replace(",", ".")
        numbers = pandas.to_numeric(cells, errors="coerce").to_numpy(dtype=float, na_value=float("nan"))
        return pyarrow.array(numbers, from_pandas=True)
    words = [None if pandas.isna(value) else str(value) for value in table[name]]
    return pyarrow.array(words, pyarrow.string())
