"""Files that appear whole or not at all, and that replace nothing of the user's.

A writer works inside a folder ``NAME.part-PID`` beside the final name; only a finished file is moved
to its name, in one step. A folder of ours holds a record of the files written there (size and time of
last change), so that a later run may replace its own results and stops at anything else.
"""

from __future__ import annotations

import errno
import json
import os
import shutil
import threading
import time
from collections.abc import Iterable, Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import Final

from geoskew.errors import ExistingFileError, GeoskewError, OutputError

RECORD: Final = ".geoskew-files.json"
_STALE_SECONDS: Final = 3600.0
_FULL_BELOW_BYTES: Final = 65_536
_record_lock = threading.Lock()

_State = tuple[int, int]


def make_folder(folder: str | Path) -> Path:
    """Make a folder for results, parents included, and mark it as one whose results may be replaced.

    Parts left behind by a run that was killed are removed when they are an hour old and their process
    is gone.

    Raises
    ------
    ExistingFileError
        Something that is no folder stands in the way.
    OutputError
        The folder cannot be made or written.
    """
    folder = Path(folder)
    if folder.exists() and not folder.is_dir():
        raise ExistingFileError(f"{folder} is a file, not a folder; give another name for the results")
    try:
        folder.mkdir(parents=True, exist_ok=True)
        if not (folder / RECORD).exists():
            _save(folder, {})
    except OSError as error:
        raise failure(folder, error) from error
    _remove_stale_parts(folder)
    return folder


def require_free(paths: Iterable[str | Path], *, overwrite: bool = False) -> None:
    """Check, before the work, that every final name is free or holds a result of ours.

    Raises
    ------
    ExistingFileError
        Files that we did not write, or that were changed since, stand there and ``overwrite`` is
        false; or a folder does. All of them are listed.
    OutputError
        A GeoPackage is open in another program.
    """
    taken = []
    for path in map(Path, paths):
        if path.is_dir():
            raise ExistingFileError(f"{path} is a folder; give the name of a file")
        if path.exists() and not overwrite and not is_ours(path):
            taken.append(str(path))
        _require_closed(path)
    if taken:
        what = "already exists and is" if len(taken) == 1 else "already exist and are"
        raise ExistingFileError(
            f"{', '.join(taken)} {what} not a result in a folder of ours, or changed since; "
            "give another name, or --overwrite to replace"
        )


def is_ours(path: str | Path) -> bool:
    """Whether a file is a result that was written here before and has not been changed since."""
    path = Path(path)
    return _state(path) in _load(path.parent).get(path.name, [])


def is_empty_record(path: Path) -> bool:
    """Whether a file is the record of a folder of ours into which nothing has been written yet."""
    return path.name == RECORD and path.is_file() and not _load(path.parent)


@contextmanager
def writing(path: str | Path) -> Iterator[Path]:
    """Give a path to write to; move the file to its final name at the end.

    The path lies in a folder ``NAME.part-PID`` of its own beside the final name (side files of a
    library stay in there) and has the final name's ending. When the body raises, an interrupt
    included, the folder goes and a file under the final name stays as it was.

    Raises
    ------
    OutputError
        The folder is missing or may not be written, the disk is full, nothing was written, or a
        GeoPackage of that name is open in another program.
    """
    path = Path(path)
    if not path.parent.is_dir():
        raise OutputError(f"{path}: the folder {path.parent} does not exist; make it or give another path")
    _require_closed(path)
    parts = path.with_name(f"{path.name}.part-{os.getpid()}")
    part = parts / path.name
    try:
        parts.mkdir(exist_ok=True)
        yield part
        if not part.is_file():
            raise OutputError(f"{path}: nothing was written")
        _remember(path, part)
        part.replace(path)
    except GeoskewError:
        raise
    except OSError as error:
        raise failure(path, error) from error
    finally:
        shutil.rmtree(parts, ignore_errors=True)


def failure(path: str | Path, error: Exception) -> OutputError:
    """An error of the system or of a library, said in one clear line about the file at hand."""
    path = Path(path)
    # Libraries number their own errors under the same name.
    code = error.errno if isinstance(error, OSError) else None
    reasons = {
        errno.EACCES: "permission denied; choose a folder that you may write to",
        errno.EPERM: "permission denied; choose a folder that you may write to",
        errno.EROFS: "the disk is read-only; choose another one",
        errno.ENOENT: f"the folder {path.parent} does not exist any more",
        errno.ENOTDIR: f"{path.parent} is not a folder",
        errno.EISDIR: "a folder of that name is in the way",
        errno.EFBIG: "the file would grow beyond what the system allows",
        errno.ENAMETOOLONG: "the name is too long",
    }
    # A reason of the system's own goes before a guess from the free space, which /proc has none of.
    if code in (errno.ENOSPC, errno.EDQUOT) or (code not in reasons and _disk_is_full(path)):
        reason = "the disk is full; free some space or choose another disk"
    else:
        reason = reasons.get(code or 0, f"could not be written: {str(error) or type(error).__name__}")
    return OutputError(f"{path}: {reason}")


def _disk_is_full(path: Path) -> bool:
    """Libraries often hide the system's reason; then the free space tells."""
    for folder in (path, *path.parents):
        if folder.is_dir():
            return shutil.disk_usage(folder).free < _FULL_BELOW_BYTES
    return False


def _require_closed(path: Path) -> None:
    """Refuse a GeoPackage with a log beside it: a program has it open, and replacing would tear it."""
    if path.suffix.lower() != ".gpkg":
        return
    for ending in ("-wal", "-journal"):
        log = path.with_name(path.name + ending)
        if log.exists():
            raise OutputError(
                f"{path} is open in another program ({log.name} lies beside it); close it there first"
            )


def _state(path: Path) -> _State | None:
    try:
        status = path.stat()
    except OSError:
        return None
    return status.st_size, status.st_mtime_ns


def _load(folder: Path) -> dict[str, list[_State]]:
    """The record of a folder; an unreadable one is worth no more than none: nothing is ours then."""
    try:
        record = json.loads((folder / RECORD).read_text(encoding="utf-8"))
        return {
            name: [(int(size), int(changed)) for size, changed in states] for name, states in record.items()
        }
    except (OSError, ValueError, TypeError, AttributeError):
        return {}


def _save(folder: Path, record: dict[str, list[_State]]) -> None:
    part = folder / f"{RECORD}.part-{os.getpid()}"
    part.write_text(json.dumps(record, indent=1, sort_keys=True) + "\n", encoding="utf-8")
    part.replace(folder / RECORD)


def _remember(path: Path, part: Path) -> None:
    """Note a finished part under its final name, in folders of ours only.

    Done before the move, which keeps size and time; the file that still stands there stays noted too,
    so that being killed in between loses neither.
    """
    if not (path.parent / RECORD).exists():
        return
    with _record_lock:
        record = _load(path.parent)
        present, new = _state(path), _state(part)
        kept = [state for state in record.get(path.name, []) if state == present]
        record[path.name] = kept + [new for _ in (0,) if new is not None and new not in kept]
        _save(path.parent, record)


def _remove_stale_parts(folder: Path) -> None:
    """Remove the part folders that killed runs left in a folder of ours."""
    for part in folder.glob("*.part-*"):
        pid = part.name.rpartition("-")[2]
        state = _state(part)
        if state is None or not part.is_dir() or not pid.isdigit() or _is_running(int(pid)):
            continue
        if time.time() - state[1] / 1e9 > _STALE_SECONDS:
            shutil.rmtree(part, ignore_errors=True)


def _is_running(pid: int) -> bool:
    """Whether a process of this number lives; taken for granted where asking would signal it."""
    if os.name != "posix":
        return True
    try:
        os.kill(pid, 0)
    except ProcessLookupError:
        return False
    except OSError:
        return True
    return True
