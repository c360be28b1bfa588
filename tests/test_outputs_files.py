"""Files appear whole or not at all, and nothing of the user's is replaced."""

from __future__ import annotations

import errno
import os
import shutil
import signal
import subprocess
import sys
import time
from pathlib import Path

import pytest

from geoskew.errors import ExistingFileError, OutputError
from geoskew.outputs import files


def names(folder: Path) -> list[str]:
    return sorted(path.name for path in folder.iterdir())


def test_a_file_appears_at_the_end_only(tmp_path: Path) -> None:
    with files.writing(tmp_path / "a.txt") as part:
        part.write_text("new")
        assert not (tmp_path / "a.txt").exists()
        assert part.parent.name == f"a.txt.part-{os.getpid()}"
    assert (tmp_path / "a.txt").read_text() == "new"
    assert names(tmp_path) == ["a.txt"]


@pytest.mark.parametrize("error", [ValueError("program fault"), KeyboardInterrupt()])
def test_a_failure_leaves_the_old_file_and_nothing_else(tmp_path: Path, error: BaseException) -> None:
    (tmp_path / "a.txt").write_text("old")

    def fail() -> None:
        with files.writing(tmp_path / "a.txt") as part:
            part.write_text("half")
            raise error

    with pytest.raises(type(error)):
        fail()
    assert (tmp_path / "a.txt").read_text() == "old"
    assert names(tmp_path) == ["a.txt"]


def test_nothing_written_is_an_error(tmp_path: Path) -> None:
    with pytest.raises(OutputError, match="nothing was written"), files.writing(tmp_path / "a.txt"):
        pass


def test_missing_folder(tmp_path: Path) -> None:
    where = tmp_path / "none" / "a.txt"
    with pytest.raises(OutputError, match=r"the folder .*none does not exist"), files.writing(where):
        pass


@pytest.mark.parametrize(
    ("code", "text"),
    [
        (errno.ENOSPC, "the disk is full"),
        (errno.EACCES, "permission denied"),
        (errno.EROFS, "read-only"),
        (errno.EIO, "could not be written: .*Input/output"),
    ],
)
def test_errors_of_the_system_are_said_in_words(tmp_path: Path, code: int, text: str) -> None:
    with pytest.raises(OutputError, match=text) as caught, files.writing(tmp_path / "a.txt"):
        raise OSError(code, os.strerror(code))
    assert "\n" not in str(caught.value)
    assert caught.value.exit_status == 1
    assert names(tmp_path) == []


def test_a_folder_without_permission(tmp_path: Path) -> None:
    if os.geteuid() == 0:
        pytest.skip("the superuser may write anywhere")
    tmp_path.chmod(0o500)
    with pytest.raises(OutputError, match="permission denied"), files.writing(tmp_path / "a.txt") as part:
        part.write_text("x")


def test_a_file_in_the_way_of_a_folder(tmp_path: Path) -> None:
    (tmp_path / "out").write_text("mine")
    with pytest.raises(OutputError, match="is a file, not a folder"):
        files.make_folder(tmp_path / "out")
    with pytest.raises(OutputError, match="is not a folder"):
        files.make_folder(tmp_path / "out" / "deeper")


def test_own_results_may_be_replaced_and_nothing_else(tmp_path: Path) -> None:
    folder = files.make_folder(tmp_path / "out")
    (folder / "theirs.csv").write_text("mine")
    with files.writing(folder / "sites.csv") as part:
        part.write_text("1")
    files.require_free([folder / "sites.csv", folder / "new.csv"])
    with files.writing(folder / "sites.csv") as part:
        part.write_text("22")
    assert files.is_ours(folder / "sites.csv")
    with pytest.raises(ExistingFileError, match=r"theirs\.csv already exists .*--overwrite") as caught:
        files.require_free([folder / "sites.csv", folder / "theirs.csv"])
    assert caught.value.exit_status == 2
    files.require_free([folder / "theirs.csv"], overwrite=True)
    assert (folder / "theirs.csv").read_text() == "mine"


def test_a_result_that_was_changed_by_hand_is_not_ours_any_more(tmp_path: Path) -> None:
    folder = files.make_folder(tmp_path)
    with files.writing(folder / "sites.csv") as part:
        part.write_text("1")
    (folder / "sites.csv").write_text("corrected by hand")
    with pytest.raises(ExistingFileError, match="changed since"):
        files.require_free([folder / "sites.csv"])


def test_a_single_file_elsewhere_is_never_taken_for_ours(tmp_path: Path) -> None:
    with files.writing(tmp_path / "sites.csv") as part:
        part.write_text("1")
    assert names(tmp_path) == ["sites.csv"]
    with pytest.raises(ExistingFileError):
        files.require_free([tmp_path / "sites.csv"])


def test_a_folder_under_a_final_name(tmp_path: Path) -> None:
    with pytest.raises(ExistingFileError, match="is a folder"):
        files.require_free([tmp_path], overwrite=True)


def test_an_open_geopackage_is_left_alone(tmp_path: Path) -> None:
    (tmp_path / "sites.gpkg").write_text("x")
    (tmp_path / "sites.gpkg-wal").write_text("x")
    with pytest.raises(OutputError, match="open in another program"):
        files.require_free([tmp_path / "sites.gpkg"], overwrite=True)
    with pytest.raises(OutputError, match="open in another program"), files.writing(tmp_path / "sites.gpkg"):
        pass


def test_a_killed_process_leaves_no_file_under_the_final_name(tmp_path: Path) -> None:
    script = (
        "import sys, time, pathlib\n"
        "from geoskew.outputs import files\n"
        "with files.writing(pathlib.Path(sys.argv[1]) / 'a.txt') as part:\n"
        "    part.write_text('half'); print('ready', flush=True); time.sleep(60)\n"
    )
    folder = files.make_folder(tmp_path)
    process = subprocess.Popen([sys.executable, "-c", script, str(folder)], stdout=subprocess.PIPE)
    assert process.stdout is not None
    with process, process.stdout:
        process.stdout.readline()
        process.send_signal(signal.SIGKILL)
    left = [name for name in names(folder) if name != files.RECORD]
    assert left == [f"a.txt.part-{process.pid}"]
    files.make_folder(folder)
    assert (folder / left[0]).exists(), "a part that is not old may belong to somebody"
    long_ago = time.time() - 7200
    os.utime(folder / left[0], (long_ago, long_ago))
    files.make_folder(folder)
    assert not (folder / left[0]).exists()


def test_a_full_disk_of_its_own(tmp_path: Path) -> None:
    disk = tmp_path / "disk"
    disk.mkdir()
    mount = shutil.which("mount")
    if (
        mount is None
        or subprocess.run(
            [mount, "-t", "tmpfs", "-o", "size=64k", "tmpfs", str(disk)], capture_output=True, check=False
        ).returncode
    ):
        pytest.skip("no right to mount a small disk")
    try:
        with pytest.raises(OutputError, match="the disk is full"), files.writing(disk / "a.bin") as part:
            part.write_bytes(bytes(200_000))
        assert names(disk) == []
    finally:
        subprocess.run(["umount", str(disk)], check=True)


def test_a_librarys_own_number_of_an_error_is_not_taken_for_the_systems(tmp_path: Path) -> None:
    error = RuntimeError("the directory cannot be read")
    error.errno = 1  # type: ignore[attr-defined]  # GDAL's "application defined", the system's "not permitted"
    assert str(files.failure(tmp_path / "a.tif", error)).endswith(
        "could not be written: the directory cannot be read"
    )
