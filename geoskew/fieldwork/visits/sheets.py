"""The finished plan as tables: stops, days, and who is not reached."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any, Final

import numpy as np
from numpy.typing import NDArray

from geoskew.fieldwork.visits.allot import tour_km
from geoskew.fieldwork.visits.days import Crew, CrewDay
from geoskew.fieldwork.visits.draft import Draft
from geoskew.fieldwork.visits.unreached import reasons

if TYPE_CHECKING:
    import pandas

AHEAD: Final = ("preset",)
AT_CHANGEOVER: Final = ("turn-at-changeover", "re-aim")
# Columns of the assessed table that a day sheet carries on, where they exist.
_CARRIED: Final = ("name", "district", "access", "weight", "fail_probability")


@dataclass(frozen=True)
class Plan:
    """A plan of visits.

    Attributes
    ----------
    visits : DataFrame
        ``crew``, ``day`` (date), ``order`` (from 1), ``id``, ``action``, ``turn`` (degrees from the present
        setting, positive clockwise seen from behind), ``km_leg`` (from the stop before, or the base),
        ``lon``, ``lat``, and the columns name, district, access, weight, fail_probability where given.
    days : DataFrame
        ``crew``, ``day``, ``visits``, ``km`` (with the way out and home), ``base_lon``, ``base_lat``.
    unreached : DataFrame
        ``id``, ``action``, ``reason``, ``lon``, ``lat``.
    missing_crew_days : int
        Further days of crews that would serve those who are out of time, though not out of reach.
    notes : tuple of str
        Assumptions and what the reader should know.
    interrupted : bool
        The planning was stopped; this is the best plan so far.
    """

    visits: pandas.DataFrame
    days: pandas.DataFrame
    unreached: pandas.DataFrame
    missing_crew_days: int
    notes: tuple[str, ...]
    interrupted: bool = False

    @property
    def km(self) -> float:
        """Kilometres of all days together."""
        return float(self.days["km"].sum())


@dataclass(frozen=True)
class Rows:
    """The columns of the table that planning needs, as arrays of one value a row."""

    table: pandas.DataFrame
    longitude: NDArray[np.float64]
    latitude: NDArray[np.float64]
    action: NDArray[Any]
    value: NDArray[np.float64]

    @classmethod
    def of(cls, table: pandas.DataFrame) -> Rows:
        """Take them from the assessed table; what is missing counts as the docstring of the plan says."""
        weight = np.nan_to_num(_column(table, "weight", 1.0), nan=1.0)
        chance = np.nan_to_num(_column(table, "fail_probability", 100.0), nan=100.0)
        return cls(
            table,
            _column(table, "lon", np.nan),
            _column(table, "lat", np.nan),
            table["action"].astype(str).to_numpy(),
            weight * (chance + 1.0),
        )

    def places(self, actions: Sequence[str], crews: int) -> NDArray[np.intp]:
        """Numbers of the places whose action is one of these and whose coordinates exist."""
        known = np.isfinite(self.longitude) & np.isfinite(self.latitude)
        return np.flatnonzero(np.isin(self.action, actions) & known) + crews


def _column(table: pandas.DataFrame, name: str, otherwise: float) -> NDArray[np.float64]:
    import pandas

    if name not in table:
        return np.full(len(table), otherwise)
    cells = table[name]
    if cells.dtype.kind not in "if":  # a cell as it was given may have a decimal comma
        cells = cells.astype("string").str.replace(",", ".")
    numbers = pandas.to_numeric(cells, errors="coerce")
    return np.asarray(numbers.to_numpy(dtype=np.float64, na_value=np.nan), dtype=np.float64)


def plan_of(
    rows: Rows,
    crews: Sequence[Crew],
    drafts: Sequence[tuple[Draft, NDArray[np.intp]]],
    notes: tuple[str, ...],
    *,
    interrupted: bool,
) -> Plan:
    """Make the plan out of finished drafts and the places of their sites."""
    import pandas

    visits: list[dict[str, Any]] = []
    days: list[dict[str, Any]] = []
    served: set[int] = set()
    for draft, _ in drafts:
        for day, tour in _dated(draft):
            visits += _stops(rows, crews, draft, day, tour)
            days.append(_day(crews, draft, day, tour))
            served.update(tour)
    lost, missing = reasons(rows.table, crews, drafts, served, interrupted=interrupted)
    order = ["crew", "day", "order"]
    columns = [*order, "id", "action", "turn", "km_leg", "lon", "lat"]
    columns += [name for name in _CARRIED if name in rows.table]
    sheet = pandas.DataFrame(visits, columns=columns).sort_values(order, kind="stable", ignore_index=True)
    loads = pandas.DataFrame(days, columns=["crew", "day", "visits", "km", "base_lon", "base_lat"])
    loads = loads.sort_values(["crew", "day"], kind="stable", ignore_index=True)
    unreached = pandas.DataFrame(lost, columns=["id", "action", "reason", "lon", "lat"])
    return Plan(sheet, loads, unreached, missing, notes, interrupted)


def _dated(draft: Draft) -> list[tuple[CrewDay, list[int]]]:
    """Each crew's tours on its days: what is worth most goes first."""
    dated: list[tuple[CrewDay, list[int]]] = []
    for crew in range(draft.crews):
        own = [tour for number, tour in draft.tours if number == crew and tour]
        own.sort(key=lambda tour: (-draft.worth(tour), tour))
        # An interrupt may leave more tours than days: what is worth least then stays out.
        dated += list(zip(draft.days[crew], own, strict=False))
    return dated


def _stops(
    rows: Rows, crews: Sequence[Crew], draft: Draft, day: CrewDay, tour: list[int]
) -> list[dict[str, Any]]:
    legs = draft.distances.km(np.array([day.crew, *tour[:-1]]), np.array(tour))
    stops = []
    for order, (place, leg) in enumerate(zip(tour, legs, strict=True), start=1):
        row = rows.table.iloc[place - len(crews)]
        turn = row.get("turn_shared" if row["action"] in AHEAD else "turn_realigned", np.nan)
        stop = {"crew": crews[day.crew].name, "day": day.day, "order": order, "id": row["id"]}
        stop |= {"action": row["action"], "turn": turn, "km_leg": float(leg)}
        stop |= {
            "lon": float(rows.longitude[place - len(crews)]),
            "lat": float(rows.latitude[place - len(crews)]),
        }
        stops.append(stop | {name: row[name] for name in _CARRIED if name in row.index})
    return stops


def _day(crews: Sequence[Crew], draft: Draft, day: CrewDay, tour: list[int]) -> dict[str, Any]:
    base = crews[day.crew].base
    return {
        "crew": crews[day.crew].name,
        "day": day.day,
        "visits": len(tour),
        "km": tour_km(day.crew, tour, draft.distances),
        "base_lon": base.lon_deg,
        "base_lat": base.lat_deg,
    }
