"""The site list as the reports leave it, assessed anew."""

from __future__ import annotations

import copy
from dataclasses import replace
from typing import TYPE_CHECKING, Any, Final

import numpy as np

from geoskew.fieldwork.reports import AIM_LOSSES_DB, STATES, Reconciled
from geoskew.outputs.tables import ColumnInfo
from geoskew.places import Places
from geoskew.study.reports.meter import aim_errors
from geoskew.study.table import Assessed

if TYPE_CHECKING:
    from geoskew.sites import SiteList
    from geoskew.study.core import Study

COLUMNS: Final = (
    ColumnInfo("action_planned", "", "action that was planned before the reports came in"),
    ColumnInfo(
        "state", "", "what became of the site by its reports: " + ", ".join(one.name for one in STATES)
    ),
    ColumnInfo("accused", "", "1 where the chance of a fault exceeds the threshold", "flag"),
    ColumnInfo("reported", "", "day of the last report"),
    ColumnInfo("setting_error", "deg", "root mean square error of the setting, after the reports", "layer"),
    ColumnInfo("aim_loss", "dB", "estimated loss of a dish out of aim", "layer"),
    *(
        ColumnInfo(
            f"chance_{one.name.replace('-', '_')}", "", f"chance that the site is {one.meaning}", "layer"
        )
        for one in STATES
    ),
)


def updated(study: Study, found: Reconciled) -> Study:
    """The study with estimated settings and dishes out of aim, and with what the reports say as columns."""
    after = copy.copy(study)
    for name in ("sites", "assessed"):
        after.__dict__.pop(name, None)
    after.sites = _sites(study, found)
    after.assessed = _with_columns(after.assessed, study.assessed, found)
    return after


def _sites(study: Study, found: Reconciled) -> SiteList:
    sites = study.sites
    known = np.asarray(np.isfinite(found.probability).all(axis=0))
    given = sites.numbers.get("setting_deg", np.full(len(sites), np.nan))
    setting = np.where(known, np.round(found.setting, 3), given)
    columns = dict(sites.places.columns) | {"setting_deg": setting}
    if (found.lost > 0.0).any():
        columns["pointing_error_deg"] = _aims(study, found)
    frame = sites.frame.copy()
    source = (
        frame["setting_source"].astype(object).tolist() if "setting_source" in frame else [""] * len(sites)
    )
    frame["setting_source"] = [
        f"reports up to {day}" if is_known else text
        for is_known, day, text in zip(known.tolist(), found.day, source, strict=True)
    ]
    more = tuple(name for name in ("setting_deg", "setting_source") if name not in sites.reserved)
    places = sites.places
    return replace(
        sites,
        frame=frame,
        places=Places(places.longitude, places.latitude, places.height, places.inside, columns),
        reserved=(*sites.reserved, *more),
        extra=tuple(name for name in sites.extra if name != "setting_source"),
        numbers=sites.numbers | {"setting_deg": setting},
    )


def _aims(study: Study, found: Reconciled) -> np.ndarray:
    """Pointing errors: the stated ones, and for a dish out of aim that of its estimated loss."""
    errors = aim_errors(study, study.sites.places)
    losses = (0.0, *AIM_LOSSES_DB)
    # Loss grows with the square of the angle; between two of the list a straight line is near enough.
    stacked = np.stack(errors)
    return np.array(
        [np.interp(lost, losses, stacked[:, row]) for row, lost in enumerate(found.lost)], dtype=np.float64
    )


def _with_columns(assessed: Assessed, before: Assessed, found: Reconciled) -> Assessed:
    table = assessed.table.copy()
    clash = {name: f"given_{name}" for name in (one.name for one in COLUMNS) if name in table}
    table = table.rename(columns=clash)
    columns = tuple(
        replace(info, name=clash[info.name]) if info.name in clash else info for info in assessed.columns
    )
    values: dict[str, Any] = {
        "action_planned": before.table["action"].to_numpy(),
        "state": found.state,
        "accused": found.accused.astype(float),
        "reported": [None if day is None else day.isoformat() for day in found.day],
        "setting_error": found.error,
        "aim_loss": found.lost,
    }
    values |= {
        f"chance_{one.name.replace('-', '_')}": found.probability[number] for number, one in enumerate(STATES)
    }
    for name, column in values.items():
        table[name] = column
    return Assessed(table, (*columns, *COLUMNS))
