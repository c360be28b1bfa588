"""Where results go: names that are free and none of the scenario's inputs, folders that can be written."""

from __future__ import annotations

import os
from collections.abc import Iterator, Sequence
from contextlib import contextmanager
from pathlib import Path
from typing import TYPE_CHECKING, Final

from geoskew.errors import ExistingFileError, InputError, OutputError
from geoskew.outputs import files, tables

if TYPE_CHECKING:
    from geoskew.study.core import Study

REJECTED: Final = "rejected.csv"


def require_free(study: Study, paths: Sequence[Path], *, overwrite: bool) -> None:
    """Check, before the work, that results replace nothing that is not ours, inputs least of all.

    Raises
    ------
    ExistingFileError
        A final name is that of an input of the scenario, whatever `overwrite` says, or of a file that
        is not ours to replace.
    """
    scenario = study.scenario
    inputs = {scenario.path.resolve()}
    inputs |= {(scenario.path.parent / name).resolve() for name in scenario.input_files}
    for path in paths:
        if path.resolve() in inputs:
            raise ExistingFileError(f"{path} is an input of this scenario; give another name for the result")
    files.require_free(paths, overwrite=overwrite)


def require_folder(folder: Path) -> None:
    """Check, before the work, that the folder of a single file is there and may be written.

    Raises
    ------
    InputError
        There is no such folder.
    OutputError
        It may not be written.
    """
    if not folder.is_dir():
        what = "is a file, not a folder" if folder.exists() else "does not exist"
        raise InputError(f"the folder {folder} {what}; make it, or give another path for the result")
    if not os.access(folder, os.W_OK | os.X_OK):
        raise OutputError(f"the folder {folder} may not be written; give another path for the result")


@contextmanager
def folder_of_results(folder: Path) -> Iterator[Path]:
    """Make a folder for results; when the work fails before there is any, it is gone again.

    Raises
    ------
    ExistingFileError
        A file stands where the folder, or one above it, is to be.
    OutputError
        The folder cannot be made or written.
    """
    above = [folder, *folder.parents]
    for place in above:
        if place.exists() and not place.is_dir():
            raise ExistingFileError(f"{place} is a file, not a folder; give another name for the results")
    missing = [place for place in above if not place.exists()]
    record = folder / files.RECORD
    unmarked = not record.exists()
    files.make_folder(folder)
    try:
        yield folder
    except BaseException:
        if unmarked and files.is_empty_record(record):
            record.unlink()
        for place in missing:
            if not any(place.iterdir()):
                place.rmdir()
        raise


def require_free_with_rejected(study: Study, out: Path | None, *, overwrite: bool) -> None:
    """Check the name of a result of the site list, and that of the rejected rows beside it.

    A list of rejected rows is known by its header, so that the next result into the same folder may
    replace it. Without a file, for results in a database alone, it comes to lie in the current folder.

    Raises
    ------
    InputError
        The result is to bear the name of the list of rejected rows.
    ExistingFileError
        As `require_free`.
    """
    rejected = rejected_beside(out)
    require_folder(rejected.parent)
    if out is not None and out.name == REJECTED:
        raise InputError(f"{out}: {REJECTED} is the list of rows that cannot be used; give another name")
    names = [] if out is None else [out]
    if study.scenario.has_sites and not tables.is_rejected_list(rejected):
        names.append(rejected)
    require_free(study, names, overwrite=overwrite)


def rejected_beside(out: Path | None) -> Path:
    """Where the rejected rows go: beside a result, else into the current folder."""
    return Path(REJECTED) if out is None else out.parent / REJECTED


def write_rejected(study: Study, out: Path | None) -> None:
    """Write the rejected rows beside a result of the site list; the header alone where there is none.

    Raises
    ------
    OutputError
        The file could not be written.
    """
    if study.scenario.has_sites:
        tables.write_rejected(rejected_beside(out), study.sites.rejected)
