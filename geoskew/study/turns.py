"""The turn that a crew makes at each site, once for cards, map, sheets and calendar."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, Any, Final

import numpy as np
from numpy.typing import NDArray

from geoskew.angles import fold
from geoskew.geometry import Array
from geoskew.turning import Feed, Turning, plan_turning

if TYPE_CHECKING:
    import pandas as pd

AHEAD: Final = "preset"
TURNED: Final = (AHEAD, "turn-at-changeover", "re-aim")


@dataclass(frozen=True)
class Turns:
    """What is done at N sites, all (N,).

    Attributes
    ----------
    turn : ndarray
        The turn to make, degrees, positive clockwise seen from behind; NaN where there is none.
    remark : ndarray of str
        What goes with it; empty where nothing does.
    setting : ndarray
        The setting that the signal then feels, degrees, folded; NaN where no feed is turned. With the
        leads exchanged the V mark stands 90° from it.
    """

    turn: Array
    remark: NDArray[Any]
    setting: Array


def turns_of(table: pd.DataFrame, ports: Any) -> Turns:
    """Ways to the targets of a table's actions, within each feed's stops.

    Parameters
    ----------
    table : DataFrame
        The assessed table: ``action``, ``skew_before``, ``turn_shared``, ``turn_realigned``, ``window_low``,
        ``window_high``, and ``setting_deg``, ``feed_low_deg``, ``feed_high_deg``, ``feed_fixed`` where given.
        A column that it lacks counts as without values.
    ports : array_like
        Ports of the feeds, broadcastable to the rows.
    """
    action = table["action"].to_numpy(dtype=object)
    ahead = action == AHEAD
    wanted = np.where(ahead, numbers(table, "turn_shared"), numbers(table, "turn_realigned"))
    wanted[~np.isin(action.astype(str), TURNED)] = np.nan
    measured = numbers(table, "setting_deg")
    present = np.where(np.isnan(measured), numbers(table, "skew_before"), measured)
    low, high = numbers(table, "feed_low_deg"), numbers(table, "feed_high_deg")
    fixed = numbers(table, "feed_fixed") > 0
    ports = np.broadcast_to(np.asarray(ports, dtype=np.float64), wanted.shape)
    known = np.isfinite(wanted) & np.isfinite(present)
    turn = np.where(known, wanted, np.nan)
    remark = np.full(wanted.shape, "", dtype=object)
    setting = np.asarray(fold(present + turn))
    slack = np.stack([numbers(table, "window_low"), numbers(table, "window_high")], axis=1)
    slack = np.where((ahead & np.isfinite(slack).all(axis=1))[:, None], slack, wanted[:, None])
    # Without stops the direct turn is open, and up to 45° no exchange of ports is shorter.
    bound = np.isfinite(low) | np.isfinite(high) | fixed | ((ports > 1) & (np.abs(wanted) > 45.0))
    for row in np.flatnonzero(known & bound).tolist():
        feed = Feed(float(low[row]), float(high[row]), bool(fixed[row]), round(float(ports[row])))
        window = (float(slack[row, 0]), float(slack[row, 1]))
        found = plan_turning(float(present[row]), float(wanted[row]), feed, slack=window)
        remark[row] = _remark(found)
        way = found.way
        turn[row] = np.nan if way is None else way.turn
        setting[row] = np.nan if way is None else fold(way.target + (90.0 if way.swap else 0.0))
    return Turns(turn, remark, setting)


def _remark(found: Turning) -> str:
    """What must be said with a turn, for a list that has no room for steps."""
    way = found.way
    why = found.obstacle.rstrip(".")
    why = why[:1].lower() + why[1:]
    if way is None:
        return f"cannot reach: {why}; do not force it, report to the planner"
    if way.short > 0.0:
        return "up to the feed's stop, short of the target but within what does"
    if way.swap:
        return f"exchange the leads: {why}"
    if found.obstacle:
        return f"the long way round: {why}"
    return "" if found.shorter is None else "shorter with the leads exchanged, see the job card"


def numbers(table: pd.DataFrame, name: str) -> Array:
    """A column as floats; NaN where there is no value or no such column."""
    if name not in table:
        return np.full(len(table), np.nan)
    return table[name].to_numpy(dtype=np.float64, na_value=np.nan).copy()
