"""Results in a database, against a real server: what is written, twice, in part, and what is refused."""

from __future__ import annotations

import csv
from pathlib import Path

import psycopg
import pyogrio
import pytest
import shapely
from conftest import POSTGIS_PASSWORD
from database_sample import (
    REGION,
    VARIABLE,
    Command,
    as_user,
    command,
    fetch,
    scenario,
    session,
    sites_database,
)

from geoskew.errors import InputError
from geoskew.outputs import database

__all__ = ["command", "sites_database"]  # fixtures

QUERY = (
    "SELECT code, ST_SetSRID(ST_MakePoint(lon, lat), 4326) AS geom, dish_m, staff FROM places ORDER BY code"
)


def plan(folder: Path, **more: str) -> Path:
    return scenario(folder, **{"query": QUERY, "id": "code", "table": "assessed", **more})


@pytest.fixture
def ready(sites_database: str, tmp_path: Path, command: Command) -> str:
    """The address of a database with the tables of a plan with sites and a region."""
    status, _, said = command("database", plan(tmp_path, more=REGION), "--create")
    assert status == 0, said
    return sites_database


def test_the_tables_hold_what_the_files_hold(ready: str, tmp_path: Path, command: Command) -> None:
    path = plan(tmp_path, more=REGION)
    status, _, said = command("sites", path, "--out", tmp_path / "out.csv", "--to-database")
    assert status == 0, said
    assert "table assessed: 3 sites of run 'plan' written" in said
    with (tmp_path / "out.csv").open(newline="") as file:
        expected = list(csv.DictReader(file))
    with session(ready) as connection, connection.cursor(row_factory=psycopg.rows.dict_row) as cursor:
        found = cursor.execute(
            "SELECT *, ST_X(geom) AS x, ST_Y(geom) AS y FROM assessed ORDER BY id"
        ).fetchall()
    assert [row["id"] for row in found] == ["007", "B", "C"]
    for given, row in zip(expected, found, strict=True):
        assert (row["x"], row["y"]) == (row["lon"], row["lat"])
        for name, text in given.items():
            if text == "":
                assert row[name] in (None, ""), name
            elif isinstance(row[name], str):
                assert row[name] == text, name
            else:
                assert float(row[name]) == float(text), name
    assert {row["run"] for row in found} == {"plan"}
    assert all(len(row["scenario_sha256"]) == 64 for row in found)
    assert all(row["software"].startswith("geoskew ") for row in found)


def test_contours_go_beside_the_sites(ready: str, tmp_path: Path, command: Command) -> None:
    lines = tmp_path / "lines.gpkg"
    arguments = ("--out", lines, "--layer", "skew_after", "--layer", "azimuth_after", "--to-database")
    status, _, said = command("contours", plan(tmp_path, more=REGION), *arguments)
    assert status == 0, said
    for layer in ("skew_after", "azimuth_after"):
        expected = pyogrio.read_dataframe(lines, layer=layer).sort_values("level")
        found = fetch(
            ready,
            f"SELECT level, unit, ST_AsBinary(geom) FROM assessed_contours WHERE layer = '{layer}' ORDER BY 1",
        )
        assert [row[0] for row in found] == expected["level"].tolist()
        assert {row[1] for row in found} == {"deg"}
        assert all(
            shapely.equals_exact(shapely.from_wkb(bytes(row[2])), shape)
            for row, shape in zip(found, expected.geometry, strict=True)
        )
    assert fetch(ready, "SELECT DISTINCT ST_SRID(geom) FROM assessed_contours") == [(4326,)]
    # another step leaves other levels, of that layer alone
    count = "SELECT count(*) FROM assessed_contours WHERE layer = 'azimuth_after'"
    kept = fetch(ready, count)
    command(
        "contours",
        plan(tmp_path, more=REGION),
        *arguments[:4],
        "--every",
        "5",
        "--to-database",
        "--overwrite",
    )
    assert fetch(ready, count) == kept
    levels = {
        row[0] for row in fetch(ready, "SELECT level FROM assessed_contours WHERE layer = 'skew_after'")
    }
    assert levels
    assert all(level % 5.0 == 0.0 for level in levels)


def test_contours_of_a_projected_region_are_stored_in_wgs84(
    sites_database: str, tmp_path: Path, command: Command
) -> None:
    region = '[region]\nbounds_deg = [-72.0, -36.0, -68.0, -32.0]\ncrs = "EPSG:32719"\nstep_m = 25000\n'
    path = plan(tmp_path, more=region)
    assert command("database", path, "--create")[0] == 0
    arguments = ("--out", tmp_path / "lines.gpkg", "--layer", "skew_after", "--to-database")
    assert command("contours", path, *arguments)[0] == 0
    west, south, east, north = fetch(
        sites_database,
        "SELECT ST_XMin(e), ST_YMin(e), ST_XMax(e), ST_YMax(e) FROM (SELECT ST_Extent(geom)::geometry AS e "
        "FROM assessed_contours) AS whole",
    )[0]
    assert -73.0 < west < east < -67.0
    assert -37.0 < south < north < -31.0


def test_a_second_run_updates_and_does_not_double(ready: str, tmp_path: Path, command: Command) -> None:
    path = plan(tmp_path, more=REGION)
    assert command("sites", path, "--to-database")[0] == 0
    before = dict(fetch(ready, "SELECT id, azimuth_after FROM assessed"))
    with session(ready) as connection:
        connection.execute("ALTER TABLE assessed ADD COLUMN remark text")
        connection.execute("UPDATE assessed SET remark = 'kept'")
        connection.execute("UPDATE places SET lon = lon + 1 WHERE code = 'B'")
        connection.execute("DELETE FROM places WHERE code = 'C'")
        connection.execute("INSERT INTO places VALUES ('D', -33, -70, 1, 1)")
    status, _, said = command("sites", path, "--to-database")
    assert status == 0
    assert "3 sites of run 'plan' written, 1 of an earlier write removed" in said
    assert fetch(ready, "SELECT id, remark FROM assessed ORDER BY id") == [
        ("007", "kept"),
        ("B", "kept"),
        ("D", None),
    ]
    after = dict(fetch(ready, "SELECT id, azimuth_after FROM assessed"))
    assert after["007"] == before["007"]
    assert after["B"] != before["B"]


def test_runs_of_other_names_stay_apart(ready: str, tmp_path: Path, command: Command) -> None:
    for name in ("first", "second", "first"):
        path = plan(tmp_path, more=REGION, run=name)
        assert command("sites", path, "--to-database")[0] == 0
    assert fetch(ready, "SELECT run, count(*) FROM assessed GROUP BY run ORDER BY run") == [
        ("first", 3),
        ("second", 3),
    ]


def test_a_failure_in_the_middle_leaves_the_old_rows(ready: str, tmp_path: Path, command: Command) -> None:
    path = plan(tmp_path, more=REGION)
    assert command("run", path, "--out", tmp_path / "result")[0] == 0
    old = (
        fetch(ready, "SELECT * FROM assessed ORDER BY id"),
        fetch(ready, "SELECT count(*) FROM assessed_contours"),
    )
    assert old[1][0][0] > 0
    with session(ready) as connection:
        # The server stops the work at a contour, when all sites have been written already.
        connection.execute("UPDATE places SET lon = lon + 1")
        connection.execute(
            "ALTER TABLE assessed_contours ADD CONSTRAINT barrier CHECK (layer <> 'skew_after') NOT VALID"
        )
    status, _, said = command("run", path, "--out", tmp_path / "result")
    assert status == 1
    assert len([line for line in said.splitlines() if "barrier" in line]) == 1
    new = (
        fetch(ready, "SELECT * FROM assessed ORDER BY id"),
        fetch(ready, "SELECT count(*) FROM assessed_contours"),
    )
    assert new == old
    assert fetch(ready, "SELECT count(*) FROM pg_class WHERE relname = 'geoskew_staging'") == [(0,)]


def test_check_foretells_the_tables(ready: str, tmp_path: Path, command: Command) -> None:
    status, printed, said = command("check", plan(tmp_path, more=REGION))
    assert (status, said) == (0, "")
    assert "and, in the database, rows of run 'plan' in assessed and assessed_contours" in printed


def test_a_run_writes_both_tables(ready: str, tmp_path: Path, command: Command) -> None:
    status, _, said = command("run", plan(tmp_path, more=REGION), "--out", tmp_path / "result")
    assert status == 0, said
    assert fetch(ready, "SELECT count(*) FROM assessed") == [(3,)]
    layers = {row[0] for row in fetch(ready, "SELECT DISTINCT layer FROM assessed_contours")}
    assert layers <= {name for name, _ in pyogrio.list_layers(tmp_path / "result" / "contours.gpkg")}
    assert "skew_after" in layers
    for file in (tmp_path / "result").rglob("*"):
        assert file.is_dir() or POSTGIS_PASSWORD.encode() not in file.read_bytes()


def test_the_printed_schema_makes_the_same_tables(
    sites_database: str, tmp_path: Path, command: Command
) -> None:
    status, printed, _ = command("database", plan(tmp_path, more=REGION))
    assert status == 0
    assert POSTGIS_PASSWORD not in printed
    with session(sites_database) as connection:
        assert connection.execute("SELECT to_regclass('assessed')").fetchone() == (None,)
        for _ in range(2):  # may run again
            connection.execute(printed)
    comments = dict(
        fetch(
            sites_database,
            "SELECT a.attname, col_description(a.attrelid, a.attnum) FROM pg_attribute a "
            "WHERE a.attrelid = 'assessed'::regclass AND a.attnum > 0",
        )
    )
    assert comments["azimuth_after"].endswith("(deg)")
    assert all(comments.values())
    keys = fetch(
        sites_database,
        "SELECT conrelid::regclass::text, pg_get_constraintdef(oid) FROM pg_constraint WHERE contype = 'p' "
        "AND conrelid::regclass::text LIKE 'assessed%' ORDER BY 1",
    )
    assert keys == [
        ("assessed", "PRIMARY KEY (run, id)"),
        ("assessed_contours", "PRIMARY KEY (run, layer, level)"),
    ]
    assert command("sites", plan(tmp_path, more=REGION), "--to-database")[0] == 0


def test_a_table_may_lie_in_a_schema_and_bear_any_name(
    sites_database: str, tmp_path: Path, command: Command
) -> None:
    with session(sites_database) as connection:
        connection.execute('CREATE SCHEMA "Plans"')
    path = plan(tmp_path, table='Plans.The "sites" 50%')
    assert command("database", path, "--create")[0] == 0
    status, _, said = command("sites", path, "--to-database")
    assert status == 0, said
    assert fetch(sites_database, 'SELECT count(*) FROM "Plans"."The ""sites"" 50%"') == [(3,)]


def test_columns_that_are_new_are_added(sites_database: str, tmp_path: Path, command: Command) -> None:
    assert command("database", plan(tmp_path), "--create")[0] == 0
    wider = plan(tmp_path, query=QUERY.replace("staff", "staff, 'x' AS run, 2.5 AS \"Mast\""))
    status, _, said = command("sites", wider, "--to-database")
    assert status == 2
    assert "table assessed lacks given_run, Mast; add with: geoskew database SCENARIO --create" in said
    assert command("database", wider, "--create")[0] == 0
    assert command("sites", wider, "--to-database")[0] == 0
    assert fetch(sites_database, 'SELECT run, given_run, "Mast" FROM assessed LIMIT 1') == [
        ("plan", "x", 2.5)
    ]


UNFIT = {
    "no table": ("", 2, ("there is no table assessed", "geoskew database SCENARIO --create")),
    "another key": (
        "ALTER TABLE assessed DROP CONSTRAINT assessed_pkey",
        2,
        ("another primary key than (run, id): none",),
    ),
    "another CRS": (
        "ALTER TABLE assessed ALTER geom TYPE geometry(Point, 3857) USING ST_Transform(geom, 3857)",
        2,
        ("geom of table assessed is in SRID 3857",),
    ),
    "another shape": (
        "ALTER TABLE assessed DROP geom; ALTER TABLE assessed ADD geom geometry(Polygon, 4326)",
        2,
        ("takes POLYGON, not POINT",),
    ),
    "a column less": ("ALTER TABLE assessed DROP azimuth_after", 2, ("lacks azimuth_after",)),
}


@pytest.mark.parametrize("case", UNFIT)
@pytest.mark.parametrize("name", ["sites", "run", "check"])
def test_a_table_that_does_not_fit_gets_one_clear_line_before_the_work(
    sites_database: str, tmp_path: Path, command: Command, case: str, name: str
) -> None:
    statement, expected, parts = UNFIT[case]
    path = plan(tmp_path)
    if statement:
        assert command("database", path, "--create")[0] == 0
        with session(sites_database) as connection:
            connection.execute(statement)
    arguments = {"run": ["--out", tmp_path / "result"], "sites": ["--to-database"], "check": ["-q"]}
    status, printed, said = command(name, path, *arguments[name])
    assert (status, printed, len(said.splitlines())) == (expected, "", 1), said
    assert all(part in said for part in parts), said
    assert {file.name for file in tmp_path.iterdir()} == {"plan.toml"}


def test_a_read_only_role_gets_one_clear_line(
    ready: str, tmp_path: Path, command: Command, monkeypatch: pytest.MonkeyPatch
) -> None:
    secret = "only/reads@here"
    with session(ready) as connection:
        connection.execute("DROP ROLE IF EXISTS reader")
        connection.execute(f"CREATE ROLE reader LOGIN PASSWORD '{secret}'")
        connection.execute("GRANT SELECT ON ALL TABLES IN SCHEMA public TO reader")
    path = plan(tmp_path)
    monkeypatch.setenv(VARIABLE, as_user(ready, "reader", secret))
    status, _, said = command("sites", path, "--to-database")
    assert status == 2
    assert len(said.splitlines()) == 1
    assert "user reader lacks the right to INSERT, UPDATE, DELETE in table assessed" in said
    assert "GRANT INSERT, UPDATE, DELETE ON assessed TO reader" in said
    wanted = plan(tmp_path, table="another")
    status, _, said = command("database", wanted, "--create")
    assert (status, len(said.splitlines())) == (1, 1)
    assert "permission denied for schema public" in said
    assert secret not in said
    # reading alone is what such a role is for
    assert command("sites", plan(tmp_path), "--out", tmp_path / "a.csv")[0] == 0
    with session(ready) as connection:
        connection.execute("DROP OWNED BY reader")
        connection.execute("DROP ROLE reader")


def test_what_is_missing_is_named(sites_database: str, tmp_path: Path, command: Command) -> None:
    path = scenario(tmp_path, query=QUERY, id="code")
    status, _, said = command("sites", path, "--to-database")
    assert status == 2
    assert "database.table" in said
    assert command("sites", path)[0] == 2
    status, _, said = command("sites", plan(tmp_path, table="a.b.c"), "--to-database")
    assert (status, "schema.name" in said) == (2, True)
    status, _, said = command("sites", plan(tmp_path, table="x" * 60), "--to-database")
    assert (status, "too long" in said) == (2, True)


def test_names_that_a_server_would_cut_are_refused() -> None:
    with pytest.raises(InputError, match="too long for a database"):
        database.stored_names(["é" * 32])
    assert database.stored_names(["id", "geom", "ctid", "é" * 31]) == {
        "id": "id",
        "geom": "given_geom",
        "ctid": "given_ctid",
        "é" * 31: "é" * 31,
    }
