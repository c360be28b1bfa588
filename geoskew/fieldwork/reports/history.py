"""The history of reports: an append-only table in one SQLite file.

A row's key is a digest of its content, so that the same row is kept once, whatever file it came in and
how often; the table holds no time of writing and no order of arrival, so that the same reports give the
same history. A file's rows are written in one transaction: a process that dies between two rows leaves
the history as it was, and reading the file again adds what is missing. SQLite rolls back by itself.
"""

from __future__ import annotations

import sqlite3
from collections.abc import Iterable
from contextlib import closing
from pathlib import Path
from typing import Final

from geoskew.errors import InputError, OutputError
from geoskew.fieldwork.reports.rows import COLUMNS, NUMBERS, OPTIONAL, Report

# "gskw" in ASCII: tells our file from any other SQLite file.
APPLICATION: Final = 0x67736B77
VERSION: Final = 1
_NAMES: Final = (*COLUMNS, *OPTIONAL)
_CREATE: Final = (
    "CREATE TABLE reports (key TEXT PRIMARY KEY NOT NULL, "
    + ", ".join(f"{name} {'REAL' if name in NUMBERS else 'TEXT NOT NULL'}" for name in _NAMES)
    + ") WITHOUT ROWID",
    "CREATE TRIGGER no_change BEFORE UPDATE ON reports "
    "BEGIN SELECT RAISE(ABORT, 'the history is append-only'); END",
    "CREATE TRIGGER no_removal BEFORE DELETE ON reports "
    "BEGIN SELECT RAISE(ABORT, 'the history is append-only'); END",
    f"PRAGMA application_id = {APPLICATION}",
    f"PRAGMA user_version = {VERSION}",
)
_ADD: Final = f"INSERT OR IGNORE INTO reports VALUES ({', '.join('?' * (len(_NAMES) + 1))})"  # noqa: S608  (question marks)
_ALL: Final = f"SELECT {', '.join(_NAMES)} FROM reports ORDER BY site, date, key"  # noqa: S608  (names of ours)


class History:
    """Reports kept in one file, made when the first are added."""

    def __init__(self, path: Path) -> None:
        self.path = path

    def check(self) -> None:
        """Make sure that the file, where there is one, is a history of ours.

        Raises
        ------
        InputError
            It is something else, or of a later version.
        """
        if not self.path.exists():
            return
        try:
            with closing(self._open()) as database:
                ours = database.execute("PRAGMA application_id").fetchone()[0] == APPLICATION
                version = database.execute("PRAGMA user_version").fetchone()[0]
                empty = not database.execute("SELECT count(*) FROM sqlite_master").fetchone()[0]
        except sqlite3.Error as error:
            raise InputError(
                f"{self.path} is no history of reports ({error}); give another folder"
            ) from error
        if not ours and not empty:
            raise InputError(f"{self.path} is a database of another kind; give another folder")
        if version > VERSION:
            raise InputError(f"{self.path} was written by a later version (layout {version}); update geoskew")

    def add(self, reports: Iterable[Report]) -> int:
        """Add reports in one transaction; returns how many were new.

        Raises
        ------
        OutputError
            The file cannot be written; it then holds what it held before.
        """
        try:
            with closing(self._open()) as database:
                database.execute("BEGIN IMMEDIATE")
                try:
                    self._lay_out(database)
                    before = database.total_changes
                    for report in reports:
                        database.execute(_ADD, (report.key, *report.values()))
                    added = database.total_changes - before
                    database.execute("COMMIT")
                except BaseException:
                    database.execute("ROLLBACK")
                    raise
                return added
        except sqlite3.Error as error:
            raise OutputError(f"{self.path}: the history could not be written: {error}") from error

    def reports(self) -> tuple[Report, ...]:
        """All reports, by site, date and key: the same whatever order they came in.

        Raises
        ------
        OutputError
            The file cannot be read.
        """
        if not self.path.exists():
            return ()
        try:
            with closing(self._open()) as database:
                return tuple(Report(**dict(zip(_NAMES, row, strict=True))) for row in database.execute(_ALL))
        except sqlite3.Error as error:
            raise OutputError(f"{self.path}: the history could not be read: {error}") from error

    def _open(self) -> sqlite3.Connection:
        # Transactions are begun and ended by hand; FULL waits until the disk has them.
        database = sqlite3.connect(self.path, isolation_level=None, timeout=30.0)
        database.execute("PRAGMA synchronous = FULL")
        return database

    @staticmethod
    def _lay_out(database: sqlite3.Connection) -> None:
        if not database.execute("SELECT count(*) FROM sqlite_master WHERE name = 'reports'").fetchone()[0]:
            for statement in _CREATE:
                database.execute(statement)
