"""What the plan asked of every site, as arrays for the reconciliation."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any, Final

import numpy as np
from numpy.typing import NDArray

from geoskew.angles import fold
from geoskew.fieldwork.reports import Facts, Orders
from geoskew.geometry import Array
from geoskew.study.turns import AHEAD, numbers, turns_of
from geoskew.turning import sense_of_scale

if TYPE_CHECKING:
    from geoskew.study.core import Study

# How well a setting in the site list is known, degrees: common practice, no source.
MEASURED_DEG: Final = 1.0
AT_CHANGEOVER: Final = ("turn-at-changeover", "re-aim")
VISITED: Final = ("preset", *AT_CHANGEOVER)


def orders_of(study: Study) -> Orders:
    """What was asked of every site, by the scenario's own assessment."""
    table = study.assessed.table
    action = table["action"].astype(str).to_numpy()
    spread = terminal(study, "setting_spread_deg")
    measured = numbers(table, "setting_deg")
    known = np.isfinite(measured)
    realigned = numbers(table, "setting_realigned")
    shared = numbers(table, "setting_shared")
    # Where a stop ends the turn ahead of time the card asks for the stop, and for no more.
    asked = turns_of(table, terminal(study, "ports")).setting
    shared = np.where((action == AHEAD) & np.isfinite(asked), asked, shared)
    return Orders(
        planned=np.isin(action, VISITED),
        at_changeover=np.isin(action, AT_CHANGEOVER),
        present=np.where(known, fold(measured), numbers(table, "skew_before")),
        present_error=np.where(known, MEASURED_DEG, spread),
        shared=shared,
        realigned=realigned,
        spread=spread,
        ports=terminal(study, "ports"),
    )


def facts_of(study: Study) -> dict[str, Facts]:
    """What reading the reports of each site needs, by its identifier."""
    sites = study.sites
    count = len(sites)
    zero = sites.numbers.get("scale_zero_deg", np.full(count, np.nan))
    words = (
        sites.frame["scale_sense"].astype(str).tolist() if "scale_sense" in sites.reserved else [""] * count
    )
    step = terminal(study, "scale_step_deg")
    action = study.assessed.table["action"].astype(str).tolist()
    return {
        site: Facts(
            longitude=float(sites.places.longitude[row]),
            scale_zero=float(zero[row]),
            scale_sense=sense_of_scale(words[row]) or 1,
            scale_step=float(step[row]),
            at_changeover=action[row] in AT_CHANGEOVER,
        )
        for row, site in enumerate(sites.ids)
    }


def terminal(study: Study, key: str) -> Array:
    """A terminal's value at every site."""
    places = study.sites.places
    default = np.full(places.shape, float(getattr(study.scenario.terminal, key)))
    own: NDArray[Any] | None = places.columns.get(key)
    return default if own is None else np.where(np.isnan(own), default, own)
