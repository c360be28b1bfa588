"""One transaction on a database: done as a whole, or not at all."""

from __future__ import annotations

from collections.abc import Iterator
from contextlib import contextmanager
from typing import Any, Final

from geoskew.database.address import Address
from geoskew.database.failures import raise_clear

_CONNECT_SECONDS: Final = 10


@contextmanager
def transaction(address: Address, *, read_only: bool = False) -> Iterator[Any]:
    """Give a connection within one transaction, which an error in the body takes back.

    Parameters
    ----------
    address : Address
    read_only : bool
        The server refuses whatever would change the database.

    Yields
    ------
    sqlalchemy.Connection

    Raises
    ------
    InputError
        The address is wrong (host, user, password, database), or what was asked for does not exist.
    GeoskewError
        The server does not answer, refuses the work, or is lost on the way. No text of any of these,
        nor of what caused them, holds the password.
    """
    import psycopg
    from sqlalchemy import create_engine
    from sqlalchemy.exc import SQLAlchemyError
    from sqlalchemy.pool import NullPool

    url = address.url
    if "connect_timeout" not in url.query:
        url = url.update_query_dict({"connect_timeout": str(_CONNECT_SECONDS)})
    engine = create_engine(
        url, poolclass=NullPool, hide_parameters=True, execution_options={"postgresql_readonly": read_only}
    )
    try:
        with engine.begin() as connection:
            yield connection
    except (SQLAlchemyError, psycopg.Error) as error:
        raise_clear(error, address)
    finally:
        engine.dispose()
