"""Sites from PostGIS through the whole assessment and back, against the same from and to GeoPackage.

    SITES_DATABASE=postgresql://user@host/name python tests/benchmarks/database.py --sites 100000

Makes a table of sites in a schema of its own in that database, and drops it at the end.
"""

from __future__ import annotations

import argparse
import os
import time
from collections.abc import Callable
from pathlib import Path
from tempfile import TemporaryDirectory

import geopandas
import numpy as np
import psycopg
import shapely
from timing import machine, rounds

from geoskew.outputs import tables
from geoskew.study.core import Study
from geoskew.study.database import create_tables, target_of, write_tables

VARIABLE = "SITES_DATABASE"
SCHEMA = "geoskew_benchmark"
SCENARIO = """
title = "Many sites"
[outgoing]
longitude_deg = -66.2
tilt_deg = 21.0
eirp_dbw = 50.0
[incoming]
longitude_deg = -66.2
eirp_dbw = 50.0
[carrier]
polarisation = "V"
frequency_ghz = 11.95
symbol_rate_mbaud = 27.5
modcod = "8PSK 3/4"
[weather]
availability_percent = 99.5
"""
TABLE = f"""
DROP SCHEMA IF EXISTS {SCHEMA} CASCADE;
CREATE SCHEMA {SCHEMA};
CREATE TABLE {SCHEMA}.sites (id text PRIMARY KEY, dish_m double precision, name text, geom geometry(Point, 4326));
"""


def fill(connection: psycopg.Connection[object], folder: Path, count: int) -> None:
    """The same sites as a table and as a GeoPackage."""
    random = np.random.default_rng(20270518)
    longitude, latitude = random.uniform(-75.0, -55.0, count), random.uniform(-45.0, -20.0, count)
    dish = random.choice([0.9, 1.2, 1.8], count)
    points = shapely.points(longitude, latitude)
    frame = {
        "id": [f"S{number:07d}" for number in range(count)],
        "dish_m": dish,
        "name": [f"Site {n}" for n in range(count)],
    }
    geopandas.GeoDataFrame(frame, geometry=points, crs="EPSG:4326").to_file(
        folder / "sites.gpkg", layer="sites"
    )
    connection.execute(TABLE)  # type: ignore[arg-type]  # our own text
    hexes = shapely.to_wkb(shapely.set_srid(points, 4326), hex=True, include_srid=True)
    with connection.cursor() as cursor, cursor.copy(f"COPY {SCHEMA}.sites FROM STDIN") as copy:  # type: ignore[arg-type]
        for row in zip(frame["id"], dish.tolist(), frame["name"], hexes, strict=True):
            copy.write_row(row)
    connection.commit()


def main() -> None:
    """Measure both ways by turns."""
    parser = argparse.ArgumentParser(
        description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter
    )
    parser.add_argument("--sites", type=int, default=100_000)
    parser.add_argument("--rounds", type=int, default=3)
    given = parser.parse_args()
    with TemporaryDirectory() as name, psycopg.connect(os.environ[VARIABLE]) as connection:
        folder = Path(name)
        fill(connection, folder, given.sites)
        by_file, by_query = folder / "file.toml", folder / "query.toml"
        by_file.write_text(SCENARIO + '[sites]\nfile = "sites.gpkg"\n', encoding="utf-8")
        query = f"SELECT id, dish_m, name, geom FROM {SCHEMA}.sites ORDER BY id"
        by_query.write_text(
            SCENARIO
            + f'[database]\nurl_env = "{VARIABLE}"\nquery = "{query}"\ntable = "{SCHEMA}.assessed"\n',
            encoding="utf-8",
        )
        create_tables(target_of(Study(by_query), sites=True, region=False))
        steps: dict[str, float] = {}

        def files() -> None:
            assessed = Study(by_file).assessed
            tables.write_table(folder / "assessed.gpkg", assessed.table, columns=assessed.columns)

        def database() -> None:
            study = Study(by_query)
            _timed(steps, "read", lambda: study.sites)
            _timed(steps, "assess", lambda: study.assessed)
            _timed(steps, "write", lambda: write_tables(target_of(study, sites=True, region=False)))

        found = rounds({"GeoPackage": files, "PostGIS": database}, given.rounds)
        print(f"{machine()}; {given.sites:,} sites")
        for way, times in found.items():
            print(f"  {way:12s} {times.wall:6.1f} s wall {times.cpu:6.1f} s of this process")
        print(
            f"  PostGIS / GeoPackage {found['PostGIS'].over(found['GeoPackage'])}  (the server's own time is in wall)"
        )
        print("  last round: " + ", ".join(f"{step} {seconds:.1f} s" for step, seconds in steps.items()))
        connection.execute(f"DROP SCHEMA {SCHEMA} CASCADE")  # type: ignore[arg-type]


def _timed(steps: dict[str, float], name: str, work: Callable[[], object]) -> None:
    start = time.perf_counter()
    work()
    steps[name] = time.perf_counter() - start


if __name__ == "__main__":
    main()
