"""Fingerprints of a scenario and of the files that it names."""

from __future__ import annotations

import hashlib
import json
import os
from collections.abc import Collection, Iterator, Mapping
from pathlib import Path

from pydantic import BaseModel

from geoskew.errors import InputError, Problem


def of_files(table: BaseModel, folder: Path, *, may_be_missing: Collection[Path] = ()) -> dict[str, str]:
    """Return the SHA-256 of every file that a table names, by path relative to ``folder``, sorted.

    Files of ``may_be_missing`` are left out where they do not exist.

    Raises
    ------
    InputError
        A file cannot be read.
    """
    found: dict[str, str] = {}
    for path in _paths(table):
        for file in (
            sorted(inner for inner in path.rglob("*") if inner.is_file()) if path.is_dir() else [path]
        ):
            if file.exists() or file not in may_be_missing:
                found[relative(file, folder)] = _sha256(file)
    return dict(sorted(found.items()))


def of_scenario(table: BaseModel, files: Mapping[str, str], folder: Path) -> str:
    """Return the SHA-256 of a table's values, its own path left out, and of the files' checksums."""
    content = {"values": _plain(table, folder), "files": dict(files)}
    return hashlib.sha256(json.dumps(content, sort_keys=True).encode()).hexdigest()


def relative(path: Path, folder: Path) -> str:
    """Return a path relative to a folder, with forward slashes; whole where there is no way between them."""
    try:
        return Path(os.path.relpath(path, folder)).as_posix()
    except ValueError:  # another drive
        return path.as_posix()


def _paths(value: object) -> Iterator[Path]:
    """Yield every path in a table and the tables within it, but the scenario's own."""
    if isinstance(value, BaseModel):
        for name in type(value).model_fields:
            if name != "path":
                yield from _paths(getattr(value, name))
    elif isinstance(value, tuple):
        for item in value:
            yield from _paths(item)
    elif isinstance(value, Path):
        yield value


def _plain(value: object, folder: Path) -> object:
    """Return a value as JSON can write it; paths relative to the folder."""
    if isinstance(value, BaseModel):
        fields = (name for name in type(value).model_fields if name != "path")
        return {name: _plain(getattr(value, name), folder) for name in fields}
    if isinstance(value, tuple):
        return [_plain(item, folder) for item in value]
    if isinstance(value, Path):
        return relative(value, folder)
    if value is None or isinstance(value, bool | int | float | str | dict):
        return value
    return str(value)


def _sha256(path: Path) -> str:
    """Return the SHA-256 of a file's content, read in pieces."""
    try:
        with path.open("rb") as stream:
            return hashlib.file_digest(stream, "sha256").hexdigest()
    except OSError as error:
        raise InputError(Problem(f"cannot be read: {error.strerror}", file=path)) from error
