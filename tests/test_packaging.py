"""The wheel: what it carries, and that an installation of it works far from the checkout."""

from __future__ import annotations

import os
import subprocess
import sys
import sysconfig
import tomllib
import venv
import zipfile
from collections.abc import Callable
from pathlib import Path

import pytest

import geoskew

ROOT = Path(__file__).resolve().parent.parent


def _run(*command: str | Path, folder: Path, **more: str) -> subprocess.CompletedProcess[str]:
    """Run a program without the checkout in reach and with nowhere to send a request to."""
    environment = {key: value for key, value in os.environ.items() if not key.startswith("PYTHON")}
    nowhere = "http://127.0.0.1:9"
    environment |= {
        "HTTP_PROXY": nowhere,
        "HTTPS_PROXY": nowhere,
        "http_proxy": nowhere,
        "https_proxy": nowhere,
    }
    return subprocess.run(
        [str(part) for part in command],
        cwd=folder,
        env=environment | more,
        capture_output=True,
        text=True,
        check=False,
        stdin=subprocess.DEVNULL,
    )


@pytest.fixture(scope="module")
def wheel(tmp_path_factory: pytest.TempPathFactory) -> Path:
    folder = tmp_path_factory.mktemp("wheel")
    command = [sys.executable, "-m", "build", "--wheel", "--no-isolation", "--outdir", str(folder), str(ROOT)]
    done = subprocess.run(command, capture_output=True, text=True, check=False)
    assert done.returncode == 0, done.stdout + done.stderr
    (built,) = folder.glob("*.whl")
    return built


@pytest.fixture(scope="module")
def installed(
    wheel: Path, needs_tool: Callable[[str], str], tmp_path_factory: pytest.TempPathFactory
) -> Path:
    """Bin folder of an environment of its own that holds the wheel and borrows the dependencies."""
    folder = tmp_path_factory.mktemp("elsewhere") / "environment"
    venv.create(folder, with_pip=False)
    python = folder / "bin" / "python"
    scheme = {"base": str(folder), "platbase": str(folder)}
    site = Path(sysconfig.get_path("purelib", "posix_prefix", scheme))
    # A .pth file adds the folder but follows none of the .pth files in it: not the editable install's.
    (site / "dependencies.pth").write_text(sysconfig.get_path("purelib") + "\n", encoding="utf-8")
    pip = needs_tool("pip")
    done = _run(pip, "--python", python, "install", "--no-deps", "--no-index", "-q", wheel, folder=folder)
    assert done.returncode == 0, done.stderr
    return python.parent


def test_the_wheel_carries_code_types_and_data(wheel: Path) -> None:
    with zipfile.ZipFile(wheel) as archive:
        names = set(archive.namelist())
    code = {path.relative_to(ROOT).as_posix() for path in (ROOT / "geoskew").rglob("*.py")}
    assert code <= names
    assert "geoskew/py.typed" in names
    listed = subprocess.run(
        ["git", "-C", str(ROOT), "ls-files", "data"], capture_output=True, text=True, check=False
    )
    if listed.returncode == 0:
        assert {f"geoskew/data_files/{name.removeprefix('data/')}" for name in listed.stdout.split()} <= names
    assert any(name.endswith("licenses/LICENSE") for name in names)
    assert {name.split("/")[0].split("-")[0] for name in names} == {"geoskew"}


def test_the_wheel_has_the_version_of_the_package(wheel: Path) -> None:
    assert wheel.name.split("-")[1] == geoskew.__version__


def test_the_installed_package_is_the_one_in_use(installed: Path, tmp_path: Path) -> None:
    code = "import geoskew, geoskew.resources as r; print(geoskew.__file__); print(r.demo_scenario())"
    done = _run(installed / "python", "-c", code, folder=tmp_path)
    assert done.returncode == 0, done.stderr
    package, scenario = map(Path, done.stdout.split())
    assert package.is_relative_to(installed.parent)
    assert scenario.is_relative_to(package.parent / "data_files")
    assert scenario.is_file()


@pytest.mark.slow
def test_the_demonstration_runs_from_the_wheel_without_network(installed: Path, tmp_path: Path) -> None:
    done = _run(installed / "geoskew", "demo", "--out", tmp_path / "result", folder=tmp_path)
    assert done.returncode == 0, done.stderr
    assert (tmp_path / "result" / "fieldmap.html").stat().st_size > 0
    assert (tmp_path / "result" / "summary.json").stat().st_size > 0


@pytest.mark.slow
def test_a_type_checker_sees_our_types(installed: Path, tmp_path: Path) -> None:
    (tmp_path / "user.py").write_text(
        "from geoskew.errors import Problem\n\nx: int = Problem('a').file\n", "utf-8"
    )
    checker = [
        sys.executable,
        "-m",
        "mypy",
        "--strict",
        "--python-executable",
        str(installed / "python"),
        "user.py",
    ]
    done = _run(*checker, folder=tmp_path)
    assert 'expression has type "Path | None", variable has type "int"' in done.stdout


def test_constraints_cover_what_the_project_asks_for() -> None:
    lines = (ROOT / "constraints.txt").read_text(encoding="utf-8").splitlines()
    pinned = {line.split("==")[0].lower() for line in lines if line and not line.startswith("#")}
    project = tomllib.loads((ROOT / "pyproject.toml").read_text(encoding="utf-8"))["project"]
    asked = [
        *project["dependencies"],
        *(item for extra in project["optional-dependencies"].values() for item in extra),
    ]
    names = {item.split(">")[0].split("[")[0].strip().lower() for item in asked} - {"geoskew"}
    assert names <= pinned
    assert all(">=" in item for item in asked if not item.startswith("geoskew"))
    assert not any("://" in line or " @ " in line for line in lines)


def test_the_readme_commands_set_up_alike() -> None:
    blocks = (ROOT / "README.md").read_text(encoding="utf-8").split("```sh\n")[1:3]
    demonstration, tests = (block.split("```")[0].strip() for block in blocks)
    assert demonstration.rpartition(" && ")[0] == tests.rpartition(" && ")[0]
    assert demonstration.endswith(".venv/bin/geoskew demo")
    assert tests.endswith(".venv/bin/python -m pytest -q")
    assert "\n" not in demonstration + tests
