"""The finished plan as tables: stops, days, and who is not reached."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any, Final

import numpy as np
from numpy.typing import NDArray

from geoskew.fieldwork.visits.allot import legs_of
from geoskew.fieldwork.visits.days import Crew, CrewDay
from geoskew.fieldwork.visits.draft import Draft, Round
from geoskew.fieldwork.visits.rounds import Itinerary, itinerary
from geoskew.fieldwork.visits.unreached import reasons

if TYPE_CHECKING:
    import pandas

AHEAD: Final = ("preset",)
AT_CHANGEOVER: Final = ("turn-at-changeover", "re-aim")
# Columns of the assessed table that a day sheet carries on, where they exist.
_CARRIED: Final = ("turn_remark", "name", "district", "access", "weight", "fail_probability")
_DAY_COLUMNS: Final = [
    "crew", "day", "visits", "km", "base_lon", "base_lat", "start_lon", "start_lat", "end_lon", "end_lat",
    "night",
]  # fmt: skip


@dataclass(frozen=True)
class Plan:
    """A plan of visits.

    Attributes
    ----------
    visits : DataFrame
        ``crew``, ``day`` (date), ``order`` (from 1), ``id``, ``action``, ``turn`` (degrees from the present
        setting, positive clockwise seen from behind), ``km_leg`` (from the stop before or the base, a night
        on the way included), ``lon``, ``lat``, and the columns turn_remark, name, district, access, weight,
        fail_probability where given.
    days : DataFrame
        ``crew``, ``day``, ``visits``, ``km`` (with the way out and home), ``base_lon``, ``base_lat``,
        ``start_lon``, ``start_lat``, ``end_lon``, ``end_lat`` (the base, or where the night is spent; on a
        long road a point of the great circle), ``night`` ("base" or "road"). A day of a round may be
        spent driving alone.
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
        for crew, dates, tour in _dated(draft):
            cut = itinerary(legs_of(crew, tour, draft.distances), draft.limits[crew])
            visits += _stops(rows, crews, draft, Round(crew, dates, tour), cut)
            days += _days(crews, draft, Round(crew, dates, tour), cut)
            served.update(tour)
    lost, missing = reasons(rows.table, crews, drafts, served, interrupted=interrupted)
    order = ["crew", "day", "order"]
    columns = [*order, "id", "action", "turn", "km_leg", "lon", "lat"]
    columns += [name for name in _CARRIED if name in rows.table]
    sheet = pandas.DataFrame(visits, columns=columns).sort_values(order, kind="stable", ignore_index=True)
    loads = pandas.DataFrame(days, columns=_DAY_COLUMNS)
    loads = loads.sort_values(["crew", "day"], kind="stable", ignore_index=True)
    unreached = pandas.DataFrame(lost, columns=["id", "action", "reason", "lon", "lat"])
    return Plan(sheet, loads, unreached, missing, notes, interrupted)


def _dated(draft: Draft) -> list[tuple[int, tuple[CrewDay, ...], list[int]]]:
    """Each crew's tours and rounds with their days: the tour that is worth most goes first."""
    dated = [(one.crew, one.days, one.tour) for one in draft.rounds]
    for crew in range(draft.crews):
        own = [tour for number, tour in draft.tours if number == crew and tour]
        own.sort(key=lambda tour: (-draft.worth(tour), tour))
        # An interrupt may leave more tours than days: what is worth least then stays out.
        dated += [(crew, (day,), tour) for day, tour in zip(draft.days[crew], own, strict=False)]
    return dated


def _stops(
    rows: Rows, crews: Sequence[Crew], draft: Draft, one: Round, cut: Itinerary
) -> list[dict[str, Any]]:
    legs = legs_of(one.crew, one.tour, draft.distances)
    stops: list[dict[str, Any]] = []
    for k, place in enumerate(one.tour):
        row = rows.table.iloc[place - len(crews)]
        planned = "turn_shared" if row["action"] in AHEAD else "turn_realigned"
        # The turn within the feed's stops, where the table holds it: that of the job card.
        turn = row.get("turn_to_make" if "turn_to_make" in row.index else planned, np.nan)
        order = 1 + sum(1 for day in cut.day_of_stop[:k] if day == cut.day_of_stop[k])
        stop = {"crew": crews[one.crew].name, "day": one.days[cut.day_of_stop[k]].day, "order": order}
        stop |= {"id": row["id"], "action": row["action"], "turn": turn, "km_leg": float(legs[k])}
        stop |= {
            "lon": float(draft.distances.longitude[place]),
            "lat": float(draft.distances.latitude[place]),
        }
        stops.append(stop | {name: row[name] for name in _CARRIED if name in row.index})
    return stops


def _days(crews: Sequence[Crew], draft: Draft, one: Round, cut: Itinerary) -> list[dict[str, Any]]:
    base = (float(crews[one.crew].base.lon_deg), float(crews[one.crew].base.lat_deg))
    places = [one.crew, *one.tour, one.crew]
    nights = [draft.distances.between(places[k], places[k + 1], share) for k, share in cut.nights]
    starts, ends = [base, *nights], [*nights, base]
    return [
        {
            "crew": crews[one.crew].name,
            "day": one.days[k].day,
            "visits": cut.day_of_stop.count(k),
            "km": km,
            "base_lon": base[0],
            "base_lat": base[1],
            "start_lon": starts[k][0],
            "start_lat": starts[k][1],
            "end_lon": ends[k][0],
            "end_lat": ends[k][1],
            "night": "base" if k == len(nights) else "road",
        }
        for k, km in enumerate(cut.km_of_day)
    ]
