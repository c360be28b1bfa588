"""A database with sites and a scenario around it, for the tests of both ways."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import Any
from urllib.parse import quote

import psycopg
import pytest

from geoskew.cli import main

VARIABLE = "TEST_SITES_DATABASE"
SCENARIO = """
title = "Sites of a database"
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
required_es_n0_db = 7.9
"""
REGION = "[region]\nbounds_deg = [-72.0, -36.0, -68.0, -32.0]\nstep_deg = 0.25\n"
ROWS = """
CREATE TABLE places (code text, lat double precision, lon double precision, dish_m numeric(4,2), staff integer);
INSERT INTO places VALUES ('007', -33.5, -70.25, 1.20, 3), ('B', -34, -71, NULL, NULL), ('C', -35, -69, 0.9, 5);
"""


def scenario(folder: Path, *, more: str = "", **database: str) -> Path:
    """Write a scenario whose sites come from the database."""
    keys = {"url_env": VARIABLE, **database}
    lines = "".join(f"{key} = '''{value}'''\n" for key, value in keys.items())
    path = folder / "plan.toml"
    path.write_text(f"{SCENARIO}{more}[database]\n{lines}", encoding="utf-8")
    return path


@contextmanager
def session(url: str) -> Iterator[psycopg.Connection[Any]]:
    """A connection that commits at the end."""
    with psycopg.connect(url) as connection:
        yield connection


def fetch(url: str, query: str) -> list[tuple[Any, ...]]:
    """Rows of a query."""
    with session(url) as connection:
        return connection.execute(query).fetchall()  # type: ignore[call-overload]


def as_user(url: str, name: str, password: str) -> str:
    """The same address for another user."""
    return f"postgresql://{name}:{quote(password, safe='')}@{url.rpartition('@')[2]}"


@pytest.fixture
def sites_database(postgis_url: str, monkeypatch: pytest.MonkeyPatch, tmp_path: Path) -> Iterator[str]:
    """A database with a table of places and no other; the environment variable holds its address.

    The test's own folder is the current one, since lists of rejected rows may come to lie there.
    """
    monkeypatch.chdir(tmp_path)
    with psycopg.connect(postgis_url, autocommit=True) as connection:
        connection.execute("DROP DATABASE IF EXISTS sites WITH (FORCE)")
        connection.execute("CREATE DATABASE sites TEMPLATE postgres")
    url = postgis_url.rpartition("/")[0] + "/sites"
    with session(url) as connection:
        connection.execute(ROWS)
    monkeypatch.setenv(VARIABLE, url)
    yield url
    with psycopg.connect(postgis_url, autocommit=True) as connection:
        connection.execute("DROP DATABASE IF EXISTS sites WITH (FORCE)")


Command = Callable[..., tuple[int, str, str]]


@pytest.fixture
def command(capfd: pytest.CaptureFixture[str]) -> Command:
    """Run a command line; its exit status, what it printed and what it said."""

    def run(*arguments: object) -> tuple[int, str, str]:
        status = main([str(one) for one in arguments])
        printed = capfd.readouterr()
        return status, printed.out, printed.err

    return run
