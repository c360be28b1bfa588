"""The address of a database, out of an environment variable; what is secret in it is never shown."""

from __future__ import annotations

import os
import re
from dataclasses import dataclass, field
from pathlib import Path
from typing import TYPE_CHECKING, Any, Final
from urllib.parse import quote, quote_plus

from geoskew.errors import GeoskewError, InputError, Problem

if TYPE_CHECKING:
    from geoskew.scenario import Scenario

_SCHEMES: Final = ("postgresql", "postgres", "postgresql+psycopg")
_SECRETS: Final = ("password", "sslpassword")
_EXAMPLE: Final = "postgresql://user@host:5432/name"
_MASK: Final = "***"


@dataclass(frozen=True)
class Address:
    """Where a database is.

    Attributes
    ----------
    url : sqlalchemy.URL
        For the library alone; not part of the text of an address.
    variable : str
        The environment variable that it came from, for messages.
    file : Path
        The scenario file that names the variable, for messages.
    """

    url: Any = field(repr=False)
    variable: str
    file: Path

    def problem(self, message: str, *, key: str = "database.url_env") -> InputError:
        """Something that the user gave is wrong; secrets in the message are masked."""
        return InputError(Problem(self.masked(message), file=self.file, key=key))

    def masked(self, text: str) -> str:
        """Text without the password, however it is written."""
        secrets = {self.url.password, os.environ.get("PGPASSWORD")}
        secrets |= {str(self.url.query[name]) for name in _SECRETS if name in self.url.query}
        for secret in sorted(filter(None, secrets), key=len, reverse=True):
            for written in (secret, quote(secret, safe=""), quote(secret), quote_plus(secret)):
                text = text.replace(written, _MASK)
        return text


def address_of(scenario: Scenario) -> Address:
    """The address that the scenario's environment variable holds.

    Raises
    ------
    MissingPartError
        The scenario has no ``[database]``.
    InputError
        The variable is not set, or holds no address of a PostgreSQL server.
    GeoskewError
        The libraries of the extra ``[postgis]`` are not installed.
    """
    scenario.require("database", for_what="work with a database")
    assert scenario.database is not None  # for the type checker: require() has seen it
    variable = scenario.database.url_env
    require_libraries()
    from sqlalchemy import make_url
    from sqlalchemy.exc import ArgumentError

    def wrong(message: str) -> InputError:
        return InputError(Problem(message, file=scenario.path, key="database.url_env"))

    text = os.environ.get(variable, "").strip()
    if not text:
        raise wrong(
            f"the environment variable {variable} is not set: "
            f"set it to the database's address, such as {_EXAMPLE}"
        )
    # The library's own words would repeat the text, so that it must not be their cause either.
    try:
        url = make_url(text)
    except (ArgumentError, ValueError):
        url = None
    if url is None or not url.database:
        raise wrong(
            f"what {variable} holds (not shown) is no address of a database: write it like {_EXAMPLE}; "
            "signs such as @ : / in a password are written as %40 %3A %2F"
        )
    if url.drivername not in _SCHEMES:
        shown = url.drivername if re.fullmatch(r"[a-z0-9+]{1,20}", url.drivername) else "something else"
        raise wrong(
            f"the address in {variable} begins with {shown}: only PostgreSQL with PostGIS is spoken to; "
            "begin it with postgresql://"
        )
    return Address(url.set(drivername="postgresql+psycopg"), variable, scenario.path)


def require_libraries() -> None:
    """Stop with one line where the extra is not installed.

    Raises
    ------
    GeoskewError
        Names the library and how to install it.
    """
    try:
        import geoalchemy2  # noqa: F401
        import psycopg  # noqa: F401
        import sqlalchemy  # noqa: F401
    except ImportError as error:
        raise GeoskewError(
            f"[database] needs the library {error.name or 'psycopg'}, which is not installed: "
            "pip install 'geoskew[postgis]'"
        ) from None
