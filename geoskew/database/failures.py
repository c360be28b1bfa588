"""What a server or its library answers, in one clear line without a secret."""

from __future__ import annotations

import re
from typing import Any, Final, NoReturn

from geoskew.database.address import Address
from geoskew.errors import GeoskewError, OutputError

# SQLSTATE (PostgreSQL, appendix A) of faults that the user's input has, by key of the scenario.
_OF_QUERY: Final = {
    "25006": "the query would change the database; give one that only reads",
    "42601": "the query is not SQL",
    "42P01": "the query names a table that does not exist or is not on the search path",
    "42703": "the query names a column that does not exist",
    "42883": "the query calls a function that does not exist; PostGIS's need CREATE EXTENSION postgis",
}
_DENIED: Final = "42501"
# Texts of failed connections, which come without a code.
_CONNECTIONS: Final = (
    (r"password authentication failed|no password supplied", "the server refuses the user or the password"),
    (r'role "[^"]*" does not exist', "the server does not know the user"),
    (r'database "[^"]*" does not exist', "the server has no database of that name"),
    (r"no pg_hba.conf entry", "the server lets no such user in from here"),
    (r"translate host name|Name or service not known|resolve host", "the host's name is not known"),
)
_UNREACHABLE: Final = (
    (r"Connection refused", "no server answers there"),
    (r"timeout|timed out", "the server does not answer in time"),
    (r"server closed the connection|connection.*(lost|closed)|terminating connection", "the server has gone"),
)


def raise_clear(error: Any, address: Address) -> NoReturn:
    """Raise an error of ours for one of SQLAlchemy or psycopg, with neither as its cause.

    Raises
    ------
    InputError
        For faults of the address or of the query.
    OutputError
        For a right that the user lacks.
    GeoskewError
        For all others.
    """
    own = getattr(error, "orig", None) or error
    state = getattr(own, "sqlstate", None) or ""
    said, whole = address.masked(_first_line(own)), str(own)
    # `from None`: a trace of the library's error could show the address.
    if state in _OF_QUERY:
        raise address.problem(f"{_OF_QUERY[state]}: {said}", key="database.query") from None
    if state == _DENIED:
        raise OutputError(f"database: {said}; ask its owner for the right, or give another user") from None
    for pattern, told in _CONNECTIONS:
        if re.search(pattern, whole):
            raise address.problem(f"{told} of {address.variable} ({where(address)})") from None
    for pattern, told in _UNREACHABLE:
        if re.search(pattern, whole, re.IGNORECASE):
            raise GeoskewError(
                address.masked(f"database of {address.variable} ({where(address)}): {told}; is it running?")
            ) from None
    code = f" (SQLSTATE {state})" if state else ""
    raise GeoskewError(f"database of {address.variable}: {said}{code}") from None


def where(address: Address) -> str:
    """User, host, port and database of an address."""
    url = address.url
    user = f"{url.username}@" if url.username else ""
    return address.masked(f"{user}{url.host or 'this machine'}:{url.port or 5432}/{url.database}")


def _first_line(error: Any) -> str:
    """The server's own main line where there is one, else the first of the library's."""
    primary = getattr(getattr(error, "diag", None), "message_primary", None)
    lines = [line.strip() for line in str(primary or error).splitlines() if line.strip()]
    return lines[0] if lines else type(error).__name__
