"""Two plans compared: sites that change action, margins gained and lost, the difference over the region."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, replace
from pathlib import Path
from typing import TYPE_CHECKING, Any, Final

import numpy as np
from numpy.typing import NDArray

from geoskew.decision import ACTIONS
from geoskew.errors import InputError, Problem
from geoskew.evaluate import evaluate
from geoskew.layers import REGISTRY, Layer
from geoskew.outputs.tables import ColumnInfo
from geoskew.places import Places
from geoskew.region.grid import from_geographic
from geoskew.study.core import Study
from geoskew.study.plan import judged_suffix

if TYPE_CHECKING:
    import pandas as pd

    from geoskew.region import Window

# Deciding margins that are compared, without the ending that says in which weather.
MARGINS: Final = (
    "margin_before",
    "margin_untouched",
    "margin_shared_before",
    "margin_shared_after",
    "margin_realigned",
)
SUMMARY: Final = "summary.json"


@dataclass(frozen=True)
class Other:
    """What a study is compared with: a scenario, or the folder of a run.

    ``table``: id, action and the deciding margins under their plain names; None without a site list.
    """

    name: str
    judged: str
    table: pd.DataFrame | None
    study: Study | None = None
    folder: Path | None = None
    suffix: str = ""

    def values(self, name: str, places: Places) -> NDArray[np.float64]:
        """A deciding margin at places; of a run's folder that of the cell that holds each place.

        Raises
        ------
        InputError
            The folder has no raster of that margin.
        """
        full = f"{name}{self.suffix}"
        if self.study is not None:
            found = evaluate(self.study.scenario, places, [full], inputs=self.study.inputs)
            return np.asarray(found[full], dtype=np.float64)
        assert self.folder is not None  # for the type checker: one of the two is there
        return _sampled(self.folder / "layers" / f"{full}.tif", places)


def open_other(path: Path) -> Other:
    """What a study is to be compared with.

    Raises
    ------
    InputError
        The path is neither a scenario nor the folder of a run.
    """
    if path.is_dir():
        return _run_folder(path)
    other = Study(path)
    suffix = judged_suffix(other.scenario.judged_in)
    table = None if not other.scenario.has_sites else _columns(other.assessed.table, suffix)
    return Other(other.scenario.title, other.judged, table, study=other, suffix=suffix)


def _run_folder(folder: Path) -> Other:
    import json

    summary = folder / SUMMARY
    if not summary.is_file():
        raise InputError(
            Problem(f"holds no {SUMMARY}: give a scenario file or the folder of a finished run", file=folder)
        )
    try:
        content = json.loads(summary.read_text(encoding="utf-8"))
        suffix = judged_suffix(str(content["judged_in"]))
        name, judged = str(content["title"]), str(content["judged"])
    except (ValueError, KeyError, TypeError) as error:
        raise InputError(Problem(f"is not the summary of a run: {error}", file=summary)) from error
    table = _read_table(folder / "sites.csv", suffix) if (folder / "sites.csv").is_file() else None
    return Other(name, judged, table, folder=folder, suffix=suffix)


def _read_table(path: Path, suffix: str) -> pd.DataFrame:
    import pandas as pd

    found = pd.read_csv(path, dtype={"id": "string"}, keep_default_na=False, na_values={})
    wanted = ["id", "lat", "lon", "action", *(f"{name}{suffix}" for name in MARGINS)]
    missing = [name for name in wanted if name not in found.columns]
    if missing:
        raise InputError(
            Problem(f"has no column {', '.join(missing)}; give the folder of a whole run", file=path)
        )
    found["id"] = found["id"].astype(object)
    for name in wanted[4:]:
        found[name] = pd.to_numeric(found[name].replace("", np.nan), errors="coerce")
    found["action"] = found["action"].replace("", None)
    return _columns(found, suffix)


def _columns(table: pd.DataFrame, suffix: str) -> pd.DataFrame:
    """Id, place, action and deciding margins under names that do not say in which weather."""
    names = {f"{name}{suffix}": name for name in MARGINS}
    return table[["id", "lat", "lon", "action", *names]].rename(columns=names)


def _sampled(path: Path, places: Places) -> NDArray[np.float64]:
    """A stored raster at places, in the cell that holds each; NaN beyond it."""
    import rasterio
    from rasterio.errors import RasterioIOError

    x, y = np.broadcast_arrays(places.longitude, places.latitude)
    found = np.full(x.shape, np.nan)
    try:
        with rasterio.open(path) as source:
            if not source.crs.is_geographic:
                x, y = from_geographic(source.crs.to_string()).transform(x, y)
            else:
                x = source.bounds.left + np.mod(x - source.bounds.left, 360.0)
            step = source.transform
            column, row = (x - step.c) / step.a, (y - step.f) / step.e
            inside = (column >= 0) & (column < source.width) & (row >= 0) & (row < source.height)
            if not inside.any():
                return found
            rows, columns = np.floor(row[inside]).astype(np.int64), np.floor(column[inside]).astype(np.int64)
            spans = (rows.min(), rows.max() + 1), (columns.min(), columns.max() + 1)
            values = source.read(1, window=spans).astype(np.float64)
            values[values == source.nodata] = np.nan
            values = values * source.scales[0] + source.offsets[0]
    except RasterioIOError as error:
        raise InputError(Problem(f"cannot be read as a raster: {error}", file=path)) from error
    found[inside] = values[rows - spans[0][0], columns - spans[1][0]]
    return found


def compared_table(study: Study, other: Other) -> pd.DataFrame | None:
    """Every site of either list: actions, deciding margins of both and their difference (this less other).

    Returns
    -------
    DataFrame or None
        ``id``, ``lat``, ``lon``, ``action``, ``action_other``, ``changed`` (1 where both have the site and
        the actions differ), ``only_in`` ("this", "other" or empty), then for each margin its value here,
        ``_other`` and ``gain_``. None where one of the two has no site list.
    """
    if not study.scenario.has_sites or other.table is None:
        return None
    ours = _columns(study.assessed.table, judged_suffix(study.scenario.judged_in))
    joined = ours.merge(
        other.table, on="id", how="outer", suffixes=("", "_other"), indicator="only_in", sort=False
    )
    for name in ("lat", "lon"):
        joined[name] = joined[name].fillna(joined.pop(f"{name}_other"))
    words = {"left_only": "this", "right_only": "other", "both": ""}
    joined["only_in"] = joined["only_in"].astype(object).map(words)
    both = joined["only_in"] == ""
    joined["changed"] = (both & (joined["action"].fillna("") != joined["action_other"].fillna(""))).astype(
        int
    )
    order = ["id", "lat", "lon", "action", "action_other", "changed", "only_in"]
    for name in MARGINS:
        joined[f"gain_{name}"] = joined[name].astype(float) - joined[f"{name}_other"].astype(float)
        order += [name, f"{name}_other", f"gain_{name}"]
    return joined[order]


def table_columns(table: pd.DataFrame) -> tuple[ColumnInfo, ...]:
    """Unit and meaning of each column of the comparison."""
    known = {
        "id": ColumnInfo("id", "", "identifier of the site"),
        "lat": ColumnInfo("lat", "deg", "latitude, WGS 84, positive north"),
        "lon": ColumnInfo("lon", "deg", "longitude, WGS 84, positive east"),
        "action": ColumnInfo("action", "", "what is to be done in this plan"),
        "action_other": ColumnInfo("action_other", "", "what is to be done in the other plan"),
        "changed": ColumnInfo("changed", "", "1 where the two actions differ", "flag"),
        "only_in": ColumnInfo("only_in", "", "the plan that alone has the site: this, other, or neither"),
    }
    for name in MARGINS:
        meaning = REGISTRY[name].description.replace(", clear sky", "") + ", under the conditions that decide"
        known[name] = ColumnInfo(name, "dB", meaning, "layer")
        known[f"{name}_other"] = ColumnInfo(
            f"{name}_other", "dB", f"the same in the other plan: {meaning}", "layer"
        )
        known[f"gain_{name}"] = ColumnInfo(
            f"gain_{name}", "dB", f"this plan less the other: {meaning}", "layer"
        )
    return tuple(known[name] for name in table.columns)


# Margins whose difference is mapped.
MAPPED: Final = ("margin_untouched", "margin_realigned")


def gain_layers() -> tuple[Layer, ...]:
    """The layers of a comparison: deciding margin here less that of the other plan."""
    return tuple(
        replace(
            REGISTRY[name],
            name=f"gain_{name}",
            description=f"This plan less the other: {REGISTRY[name].description.replace(', clear sky', '')}, "
            "under the conditions that decide",
            ramp="margin",
            limits=(-6.0, 6.0),
            contour_step=0.1,
            needs=frozenset(),
        )
        for name in MAPPED
    )


def gain_blocks(study: Study, other: Other) -> Iterator[tuple[Window, dict[str, NDArray[Any]]]]:
    """Differences over the region, block by block."""
    suffix = judged_suffix(study.scenario.judged_in)
    for window in study.grid.windows():
        places = study.grid.block(window)
        ours = evaluate(study.scenario, places, [f"{name}{suffix}" for name in MAPPED], inputs=study.inputs)
        yield (
            window,
            {f"gain_{name}": ours[f"{name}{suffix}"] - other.values(name, places) for name in MAPPED},
        )


def change_counts(table: pd.DataFrame) -> list[tuple[str, ...]]:
    """How many sites go from which action (rows, the other plan) to which (columns, this one)."""
    names = [name for _, name in ACTIONS]
    both = table[table["only_in"] == ""]
    rows = []
    for old in names:
        here = both[both["action_other"] == old]
        if len(here):
            rows.append((old, *(str(int((here["action"] == new).sum())) for new in names), str(len(here))))
    return rows
