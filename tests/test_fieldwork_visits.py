"""The plan of visits: feasible by a checker that shares no code, never worse than driving to the nearest."""

from __future__ import annotations

import math
from collections.abc import Iterable
from dataclasses import dataclass
from datetime import UTC, date, datetime, timedelta
from pathlib import Path
from typing import Any

import numpy as np
import pandas as pd
import pytest
from pyproj import Geod

from geoskew.errors import InputError
from geoskew.fieldwork.visits import Plan, place_numbers, plan_visits, read_distances

WEEK = ("monday", "tuesday", "wednesday", "thursday", "friday")
FIRST = date(2027, 4, 19)  # a Monday
CHANGEOVER = datetime(2027, 5, 18, 3, tzinfo=UTC)  # a Tuesday, midnight at 45° W
DETOUR = 1.3
GEOD = Geod(ellps="WGS84")
AT = ("turn-at-changeover", "re-aim")


@dataclass(frozen=True)
class Base:
    lon_deg: float
    lat_deg: float


@dataclass(frozen=True)
class Crew:
    name: str
    base: Base
    visits_per_day: int = 6
    km_per_day: float = 400.0
    days: tuple[str, ...] = WEEK
    off: tuple[date, ...] = ()


def network(sites: int, crews: int, *, spread: float, seed: int) -> tuple[pd.DataFrame, list[Crew]]:
    """Invented sites around 33.5° S, 64° W, and crews based at some of them."""
    draw = np.random.default_rng(seed)
    lon = -64.0 + draw.uniform(-spread, spread, sites)
    lat = -33.5 + draw.uniform(-spread, spread, sites)
    based = draw.choice(sites, crews, replace=False)
    table = pd.DataFrame(
        {
            "id": [f"S{k:05d}" for k in range(sites)],
            "lat": lat,
            "lon": lon,
            "action": draw.choice(["preset", *AT, "leave", "upgrade"], sites, p=[0.6, 0.05, 0.05, 0.2, 0.1]),
            "weight": draw.integers(1, 4, sites),
            "fail_probability": draw.uniform(0.0, 100.0, sites),
            "turn_shared": draw.uniform(-30.0, 30.0, sites),
            "turn_realigned": draw.uniform(-60.0, 60.0, sites),
        }
    )
    return table, [Crew(f"Crew {k}", Base(float(lon[b]), float(lat[b]))) for k, b in enumerate(based)]


def plan(table: pd.DataFrame, crews: Iterable[Crew], **more: Any) -> Plan:
    given: dict[str, Any] = {
        "first_day": FIRST,
        "changeover": CHANGEOVER,
        "overlap_hours": 24.0,
        "detour": DETOUR,
    }
    return plan_visits(table, crews=list(crews), **(given | more))


def road(lon: Iterable[float], lat: Iterable[float]) -> float:
    """Kilometres along a line of places, by PROJ's geodesics: the outside reference for distances."""
    return GEOD.line_length(list(lon), list(lat)) / 1000.0 * DETOUR


def working(crew: Crew, day: date) -> bool:
    return day.strftime("%A").lower() in crew.days and day not in crew.off


def hours(crew: Crew, day: date) -> tuple[datetime, datetime]:
    """8 to 18 h of mean solar time at the base, in UTC."""
    noon = datetime(day.year, day.month, day.day, 12, tzinfo=UTC) - timedelta(hours=crew.base.lon_deg / 15.0)
    return noon - timedelta(hours=4), noon + timedelta(hours=6)


def check(found: Plan, table: pd.DataFrame, crews: Iterable[Crew], *, overlap_hours: float = 24.0) -> None:
    """Every rule of a plan, checked from its tables alone."""
    by_name = {crew.name: crew for crew in crews}
    sites = table.set_index("id")
    due = sites.index[sites["action"].isin(["preset", *AT])]
    visited, lost = list(found.visits["id"]), list(found.unreached["id"])
    assert sorted(visited + lost) == sorted(due), "each due site once: visited, or listed with a reason"
    assert all(found.unreached["reason"].str.len() > 10)
    assert not found.days.duplicated(["crew", "day"]).any()
    assert found.days["visits"].sum() == len(visited)
    stops_of = dict(list(found.visits.groupby(["crew", "day"])))
    assert set(stops_of) == {(d.crew, d.day) for d in found.days.itertuples() if d.visits}
    for name, days in found.days.sort_values("day").groupby("crew"):
        crew = by_name[str(name)]
        base = (crew.base.lon_deg, crew.base.lat_deg)
        here, slept = base, None
        since = 0.0  # driven since the last stop or the base
        for load in days.itertuples():
            assert working(crew, load.day)
            assert load.day >= FIRST
            if slept is not None:  # a round goes on where the night was, on the very next day
                assert load.day == slept + timedelta(days=1)
            assert (load.start_lon, load.start_lat) == pytest.approx(here)
            stops = stops_of.get((name, load.day), found.visits[:0])
            place = sites.loc[stops["id"]]
            assert load.visits == len(stops) <= crew.visits_per_day
            assert list(stops["order"]) == list(range(1, len(stops) + 1))
            assert stops["action"].tolist() == place["action"].tolist()
            assert load.km <= crew.km_per_day + 1e-5
            lon = [load.start_lon, *place["lon"], load.end_lon]
            lat = [load.start_lat, *place["lat"], load.end_lat]
            # A sphere against the ellipsoid: at most 0.6 % (flattening 1/298, twice that on a meridian).
            assert load.km == pytest.approx(road(lon, lat), rel=0.006, abs=1e-3)
            for k, leg in enumerate(stops["km_leg"]):
                since += road(lon[k : k + 2], lat[k : k + 2])
                assert leg == pytest.approx(since, rel=0.006, abs=1e-3)
                since = 0.0
            since += road(lon[-2:], lat[-2:])
            if load.night == "base":
                assert (load.end_lon, load.end_lat) == pytest.approx(base)
                here, slept, since = base, None, 0.0
            else:
                here, slept = (load.end_lon, load.end_lat), load.day
            _check_time(crew, load.day, place["action"], overlap_hours)
        assert slept is None, "every round ends at the base"


def _check_time(crew: Crew, day: date, actions: pd.Series, overlap_hours: float) -> None:
    """Visits ahead end before the changeover; the others do not, and stay near it."""
    starts, ends = hours(crew, day)
    if (actions == "preset").any():
        assert (actions == "preset").all()
        assert ends <= CHANGEOVER
    elif len(actions):
        assert ends > CHANGEOVER
        assert starts <= CHANGEOVER + timedelta(hours=overlap_hours) + timedelta(days=3)


def greedy(table: pd.DataFrame, crews: list[Crew], days: dict[str, list[date]]) -> tuple[set[str], float]:
    """The plain plan: day by day each crew drives on to the nearest open site that it can still do."""
    left = {str(r["id"]): (float(r["lon"]), float(r["lat"])) for _, r in table.iterrows()}
    total = 0.0
    served: set[str] = set()
    for day in sorted({day for some in days.values() for day in some}):
        for crew in crews:
            if day not in days[crew.name]:
                continue
            base = here = (crew.base.lon_deg, crew.base.lat_deg)
            driven, stops = 0.0, 0
            while left and stops < crew.visits_per_day:
                names = list(left)
                lon, lat = np.array([left[name] for name in names]).T
                ones = np.ones(len(names))
                leg = GEOD.inv(here[0] * ones, here[1] * ones, lon, lat)[2] / 1000.0 * DETOUR
                home = GEOD.inv(lon, lat, base[0] * ones, base[1] * ones)[2] / 1000.0 * DETOUR
                leg = np.where(driven + leg + home <= crew.km_per_day, leg, np.inf)
                nearest = int(np.argmin(leg))
                if not math.isfinite(leg[nearest]):
                    break
                here = left.pop(names[nearest])
                served.add(names[nearest])
                driven, stops = driven + float(leg[nearest]), stops + 1
            if stops:
                total += driven + road((here[0], base[0]), (here[1], base[1]))
    return served, total


CASES = [
    (60, 2, 0.6, 1),
    (240, 3, 0.8, 2),
    (240, 3, 2.0, 3),
    (150, 5, 1.2, 4),
    (400, 3, 1.5, 5),
    (30, 1, 0.3, 6),
]


@pytest.mark.parametrize(("sites", "crews", "spread", "seed"), CASES)
def test_plan_is_feasible_and_not_worse_than_the_nearest_next(
    sites: int, crews: int, spread: float, seed: int
) -> None:
    table, teams = network(sites, crews, spread=spread, seed=seed)
    found = plan(table, teams)
    check(found, table, teams)
    worth = table.set_index("id")["weight"] * (table.set_index("id")["fail_probability"] + 1.0)
    span = [FIRST + timedelta(days=k) for k in range(40)]
    ahead = {
        crew.name: [d for d in span if working(crew, d) and hours(crew, d)[1] <= CHANGEOVER] for crew in teams
    }
    at = {
        crew.name: [
            d
            for d in span
            if working(crew, d)
            and hours(crew, d)[1] > CHANGEOVER
            and hours(crew, d)[0] <= CHANGEOVER + timedelta(hours=24)
        ]
        for crew in teams
    }
    for actions, days in ((["preset"], ahead), (AT, at)):
        due = table[table["action"].isin(actions)]
        plain, km = greedy(due, teams, days)
        ours = found.visits[found.visits["action"].isin(actions)]
        driven = found.days.merge(ours[["crew", "day"]].drop_duplicates())["km"].sum()
        # Where time is short the plan serves those at risk first; it must then be worth no less.
        assert worth[ours["id"]].sum() >= worth[list(plain)].sum() - 1e-6
        if set(ours["id"]) == plain:
            assert driven <= km * 1.006
        if len(plain) == len(due):
            assert len(ours) == len(due)


def test_all_that_fits_is_served_and_tours_are_shorter_than_the_plain_ones() -> None:
    table, teams = network(120, 3, spread=0.8, seed=11)
    table["action"] = "preset"
    found = plan(table, teams)
    check(found, table, teams)
    assert len(found.visits) == 120
    assert found.missing_crew_days == 0
    span = [FIRST + timedelta(days=k) for k in range(29)]
    days = {
        crew.name: [d for d in span if working(crew, d) and hours(crew, d)[1] <= CHANGEOVER] for crew in teams
    }
    served, km = greedy(table, teams, days)
    assert len(served) == 120
    assert found.km < km


def test_one_day_is_routed_as_short_as_can_be() -> None:
    # Six sites on a circle around the base: by hand, the best closed tour follows the circle, whatever the
    # order in the list. Compared with all 720 orders, measured by PROJ.
    import itertools

    angle = np.radians([0, 240, 60, 300, 120, 180])
    lon, lat = -64 + 0.3 * np.sin(angle), -33.5 + 0.3 * np.cos(angle)
    table = pd.DataFrame({"id": list("abcdef"), "lat": lat, "lon": lon, "action": "preset"})
    crew = Crew("one", Base(-64.0, -33.5))
    found = plan(table, [crew], first_day=date(2027, 5, 17))
    assert len(found.days) == 1
    best = min(
        road([-64.0, *lon[list(tour)], -64.0], [-33.5, *lat[list(tour)], -33.5])
        for tour in itertools.permutations(range(6))
    )
    assert found.km == pytest.approx(best, rel=0.006)


def test_risk_and_weight_go_first_where_time_is_short() -> None:
    table = pd.DataFrame(
        {
            "id": list("abcd"),
            "lat": [-33.5, -33.51, -33.52, -33.53],
            "lon": [-64.0] * 4,
            "action": "preset",
            "weight": [1, 1, 3, 1],
            "fail_probability": [10.0, 90.0, 40.0, 20.0],
        }
    )
    # Two visits in all, worth by hand 11, 91, 123 and 21: b and c are served.
    crew = Crew("one", Base(-64.0, -33.5), visits_per_day=2)
    found = plan(table, [crew], first_day=date(2027, 5, 17))
    assert sorted(found.visits["id"]) == ["b", "c"]
    assert sorted(found.unreached["id"]) == ["a", "d"]
    assert all("out of time" in reason for reason in found.unreached["reason"])
    assert found.missing_crew_days == 1
    # With two days the tour that is worth more goes on the first of them.
    two = plan(table, [crew], first_day=date(2027, 5, 14))
    first = two.visits[two.visits["day"] == date(2027, 5, 14)]
    rest = two.visits[two.visits["day"] == date(2027, 5, 17)]
    worth = {"a": 11, "b": 91, "c": 123, "d": 21}
    assert sum(worth[site] for site in first["id"]) >= sum(worth[site] for site in rest["id"])


def test_missing_crew_days_and_reasons() -> None:
    lat = [-33.5 - 0.01 * k for k in range(7)]
    table = pd.DataFrame({"id": list("abcdefg"), "lat": lat, "lon": -64.0, "action": "preset"})
    table.loc[6, "lat"] = -38.0  # 500 km away, 650 km on the road
    crew = Crew("one", Base(-64.0, -33.5), visits_per_day=2)
    found = plan(table, [crew], first_day=date(2027, 5, 17))
    # One day of two visits; four near sites are left: two more days of this crew.
    assert len(found.visits) == 2
    assert found.missing_crew_days == 2
    (far,) = found.unreached.loc[found.unreached["id"] == "g", "reason"]
    assert far.startswith("out of reach")
    assert "one working day of 400 km" in far
    none = plan(table, [crew], first_day=date(2027, 5, 18))
    assert len(none.visits) == 0
    assert any("works in the time" in reason for reason in none.unreached["reason"])
    nobody = plan(table, [])
    assert set(nobody.unreached["reason"]) == {"no crew is named"}


def test_far_site_takes_a_round_with_nights_on_the_road() -> None:
    # 4.5° of latitude are 500.4 km on the sphere of R = 6371.0088 km, 650.5 km on the road. By hand, with
    # 400 km a day: 400 | 250.5 and the visit, 149.5 back | 400 | 101.0 home: four days.
    table = pd.DataFrame({"id": ["far"], "lat": [-38.0], "lon": [-64.0], "action": ["preset"]})
    crew = Crew("one", Base(-64.0, -33.5))
    found = plan(table, [crew], first_day=date(2027, 5, 10))
    check(found, table, [crew])
    assert found.days["day"].tolist() == [date(2027, 5, 10) + timedelta(days=k) for k in range(4)]
    leg = math.radians(4.5) * 6371.0088 * DETOUR
    assert found.days["km"].tolist() == pytest.approx([400.0, 400.0, 400.0, 2 * leg - 1200.0])
    assert found.days["night"].tolist() == ["road", "road", "road", "base"]
    assert found.days["visits"].tolist() == [0, 1, 0, 0]
    # The first night falls after 400 of 650.5 km: 4.5° × 0.6149 south of the base.
    assert found.days["end_lat"].iloc[0] == pytest.approx(-33.5 - 4.5 * 400.0 / leg)
    # Three working days in a row are one too few.
    short = Crew("one", Base(-64.0, -33.5), days=("monday", "tuesday", "wednesday"))
    (reason,) = plan(table, [short], first_day=date(2027, 5, 10)).unreached["reason"]
    assert "3 working days in a row of 400 km" in reason


def test_round_keeps_visits_a_day_and_does_not_displace_more_than_it_serves() -> None:
    # Five sites side by side, 400 km away (520 km on the road), two visits a day, and sites near the base.
    far = pd.DataFrame(
        {"id": [f"f{k}" for k in range(5)], "lat": -33.5 - 3.6 - 0.01 * np.arange(5), "lon": -64.0}
    )
    near = pd.DataFrame({"id": [f"n{k}" for k in range(6)], "lat": -33.5 - 0.01 * np.arange(6), "lon": -64.0})
    table = pd.concat([far, near], ignore_index=True).assign(action="preset")
    crew = Crew("one", Base(-64.0, -33.5), visits_per_day=2)
    wide = plan(table, [crew], first_day=date(2027, 5, 3))
    check(wide, table, [crew])
    assert len(wide.visits) == 11
    # Six days are two too few for both. A day near the base serves two, a day of the round one: by hand it
    # takes five (out; 2, 2 and 1 visits with 400 km a day; home).
    tight = plan(table, [crew], first_day=date(2027, 5, 10))
    check(tight, table, [crew])
    assert sorted(tight.visits["id"]) == sorted(near["id"])
    assert tight.missing_crew_days == 5


@pytest.mark.parametrize(
    ("lon", "changeover", "overlap", "last_ahead", "first_at"),
    [
        # 8 to 18 h at 64.5° W are 12.3 to 22.3 h UTC: a changeover at 3 h UTC lies in the night before.
        (-64.5, datetime(2027, 5, 18, 3, tzinfo=UTC), 0.0, date(2027, 5, 17), date(2027, 5, 18)),
        # At 15 h UTC it falls into Tuesday's work: that day serves those who must wait for it.
        (-64.5, datetime(2027, 5, 18, 15, tzinfo=UTC), 0.0, date(2027, 5, 17), date(2027, 5, 18)),
        # At 23 h UTC Tuesday's work is over: Tuesday still counts as ahead.
        (-64.5, datetime(2027, 5, 18, 23, tzinfo=UTC), 0.0, date(2027, 5, 18), date(2027, 5, 19)),
        # At 165° E the work of the 18th runs from 21 h UTC of the 17th to 7 h UTC of the 18th.
        (165.0, datetime(2027, 5, 17, 20, tzinfo=UTC), 0.0, date(2027, 5, 17), date(2027, 5, 18)),
        # A Saturday's changeover: the nearest working day after it is Monday.
        (-64.5, datetime(2027, 5, 22, 3, tzinfo=UTC), 0.0, date(2027, 5, 21), date(2027, 5, 24)),
    ],
)
def test_days_ahead_and_at_the_changeover(
    lon: float, changeover: datetime, overlap: float, last_ahead: date, first_at: date
) -> None:
    count = 60
    table = pd.DataFrame({"id": [f"p{k}" for k in range(count)] + ["t"], "lat": -33.5, "lon": lon})
    table["action"] = ["preset"] * count + ["turn-at-changeover"]
    crew = Crew("one", Base(lon, -33.5), visits_per_day=1)
    found = plan_visits(
        table, crews=[crew], first_day=date(2027, 5, 3), changeover=changeover, overlap_hours=overlap
    )
    presets = found.visits[found.visits["action"] == "preset"]
    assert presets["day"].max() == last_ahead
    (turned,) = found.visits.loc[found.visits["id"] == "t", "day"]
    assert turned == first_at


def test_days_off_and_weekdays_are_kept() -> None:
    table = pd.DataFrame({"id": [f"p{k}" for k in range(60)], "lat": -33.5, "lon": -64.0, "action": "preset"})
    crew = Crew("one", Base(-64.0, -33.5), visits_per_day=1, days=("monday", "sat"), off=(date(2027, 5, 3),))
    days = set(plan(table, [crew]).visits["day"])
    assert days == {
        date(2027, 4, 19), date(2027, 4, 24), date(2027, 4, 26), date(2027, 5, 1), date(2027, 5, 8),
        date(2027, 5, 10), date(2027, 5, 15), date(2027, 5, 17),
    }  # fmt: skip


def test_a_plan_repeats_and_the_order_of_sites_does_not_change_what_is_served() -> None:
    table, teams = network(150, 3, spread=1.0, seed=21)
    one, two = plan(table, teams), plan(table, teams)
    pd.testing.assert_frame_equal(one.visits, two.visits)
    pd.testing.assert_frame_equal(one.days, two.days)
    shuffled = plan(table.sample(frac=1.0, random_state=3).reset_index(drop=True), teams)
    assert set(shuffled.visits["id"]) == set(one.visits["id"])


def test_interrupted_planning_gives_the_best_plan_so_far() -> None:
    table, teams = network(240, 3, spread=0.8, seed=2)
    seen: list[tuple[int, int]] = []

    def stop(done: int, total: int) -> None:
        seen.append((done, total))
        raise KeyboardInterrupt

    found = plan(table, teams, on_progress=stop)
    assert found.interrupted
    assert any("interrupted" in note for note in found.notes)
    check(found, table, teams)
    whole = plan(table, teams)
    assert len(found.visits) > 0.9 * len(whole.visits)
    assert seen[0][0] == 1


def test_progress_runs_to_its_end() -> None:
    table, teams = network(150, 3, spread=1.0, seed=21)
    seen: list[tuple[int, int]] = []
    plan(table, teams, on_progress=lambda done, total: seen.append((done, total)))
    assert [done for done, _ in seen] == sorted(done for done, _ in seen)
    assert seen[-1][0] == seen[-1][1]


def test_no_time_for_the_solver_is_said() -> None:
    table, teams = network(150, 3, spread=1.0, seed=21)
    found = plan(table, teams, solver_seconds=0.0)
    check(found, table, teams)
    assert any("ran out" in note for note in found.notes)


def test_large_plan_is_feasible() -> None:
    table, teams = network(3000, 12, spread=3.0, seed=31)
    check(plan(table, teams, solver_seconds=1.0), table, teams)


def test_nothing_to_visit() -> None:
    table = pd.DataFrame({"id": ["a"], "lat": [-33.5], "lon": [-64.0], "action": ["leave"]})
    found = plan(table, [Crew("one", Base(-64.0, -33.5))])
    assert found.visits.empty
    assert found.unreached.empty
    assert found.missing_crew_days == 0
    assert found.km == 0.0


def test_site_without_coordinates_is_listed() -> None:
    table = pd.DataFrame({"id": ["a"], "lat": [np.nan], "lon": [-64.0], "action": ["preset"]})
    found = plan(table, [Crew("one", Base(-64.0, -33.5))])
    assert found.unreached["reason"].tolist() == ["it has no coordinates"]


def test_roads_out_of_a_file(tmp_path: Path) -> None:
    table = pd.DataFrame({"id": ["a", "b"], "lat": [-33.5, -33.5], "lon": [-64.1, -63.9], "action": "preset"})
    crew = Crew("North", Base(-64.0, -33.5))
    file = tmp_path / "roads.csv"
    file.write_text("from,to,km\nbase:North,a,40\na,b,70\nb,base:North,50\nb,a,75\nx,a,3\n", encoding="utf-8")
    roads = read_distances(file, place_numbers(table, [crew]))
    found = plan(table, [crew], distances=roads)
    # One day by hand: 40 + 75 (of two directions the longer) + 50, either way round.
    assert found.km == pytest.approx(165.0)
    assert sorted(found.visits["km_leg"]) in ([40.0, 75.0], [50.0, 75.0])


@pytest.mark.parametrize(
    ("text", "message"),
    [
        ("from,to\na,b\n", "roads.csv:1: the column km is missing; give from,to,km"),
        ("from,to,km\na,b,12\nb,a,-3\na,a,far\n", "roads.csv:3: '-3' is not a distance in km from 0 up"),
        ("from,to,km\na,b,nan\n", "roads.csv:2: 'nan' is not a distance"),
    ],
)
def test_bad_file_of_roads(text: str, message: str, tmp_path: Path) -> None:
    file = tmp_path / "roads.csv"
    file.write_text(text, encoding="utf-8")
    with pytest.raises(InputError) as caught:
        read_distances(file, {"a": 0, "b": 1})
    assert message in str(caught.value)


def test_missing_or_foreign_file_of_roads(tmp_path: Path) -> None:
    with pytest.raises(InputError, match="cannot be read"):
        read_distances(tmp_path / "none.csv", {})
    file = tmp_path / "roads.csv"
    file.write_bytes("from,to,km\nñ,b,1\n".encode("latin-1"))
    with pytest.raises(InputError, match="is not UTF-8"):
        read_distances(file, {})


def test_a_stop_bears_the_turn_within_the_stops_of_the_feed_and_its_remark() -> None:
    table, crews = network(4, 1, spread=0.2, seed=5)
    told = table.assign(turn_to_make=[-140.0, np.nan, 3.0, 4.0], turn_remark=["a", "b", "", ""])
    found = plan(told, crews).visits.set_index("id")
    for identity, turn, remark in zip(told["id"], told["turn_to_make"], told["turn_remark"], strict=True):
        if identity in found.index:
            assert found.loc[identity, "turn"] == pytest.approx(turn, nan_ok=True)
            assert found.loc[identity, "turn_remark"] == remark
    assert len(found) > 0
    assert "turn_remark" not in plan(table, crews).visits


def test_weights_as_given_may_have_a_decimal_comma() -> None:
    table = pd.DataFrame({"id": list("abc"), "lat": -33.5, "lon": -64.0, "action": "preset"})
    table["weight"] = ["1", "2,5", ""]
    crew = Crew("one", Base(-64.0, -33.5), visits_per_day=1)
    assert plan(table, [crew], first_day=date(2027, 5, 17)).visits["id"].tolist() == ["b"]
