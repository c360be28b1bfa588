"""Names of tables as they stand in a scenario."""

from __future__ import annotations

from typing import Final, NamedTuple

from geoskew.errors import InputError

# PostgreSQL cuts longer names without a word (chapter 4.1.1, NAMEDATALEN).
LONGEST_NAME: Final = 63


class TableName(NamedTuple):
    """A table's name and its schema's, if any; always quoted, so that upper case counts."""

    schema: str | None
    name: str

    def __str__(self) -> str:
        """As people write it."""
        return f"{self.schema}.{self.name}" if self.schema else self.name

    def with_ending(self, ending: str) -> TableName:
        """The name of a table beside this one."""
        return TableName(self.schema, self.name + ending)


def table_name(text: str, *, ending: str = "") -> TableName:
    """Take a name apart; room is kept for an ending.

    >>> table_name("plans.assessed_sites")
    TableName(schema='plans', name='assessed_sites')

    Raises
    ------
    InputError
        There is more than one dot, a part is empty, or the name is too long.
    """
    parts = text.split(".")
    if len(parts) > 2 or not all(part.strip() for part in parts):
        raise InputError(f"database.table {text!r} is no name of a table: give name or schema.name")
    for part in parts:
        if len((part + ending).encode()) > LONGEST_NAME:
            raise InputError(
                f"database.table {text!r} is too long: the server keeps {LONGEST_NAME} bytes of a name, "
                f"of which {len(ending)} go to the ending {ending}"
                if ending
                else f"database.table {text!r} is too long: the server keeps {LONGEST_NAME} bytes of a name"
            )
    return TableName(parts[0] if len(parts) == 2 else None, parts[-1])
