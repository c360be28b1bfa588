"""What tests need of the machine, and what happens where it is missing.

A test that needs a browser, a database server or a tool asks for it with one of the fixtures below
and is skipped, with the reason, where it is not installed. With ``GEOSKEW_REQUIRE_ALL=1`` (set by
``.ci/run``) every such skip is a failure; only a skip whose reason begins with ``not applicable``
or `the superuser may` stays one.
"""

from __future__ import annotations

import os
import shutil
import socket
import subprocess
import tempfile
from collections.abc import Callable, Generator, Iterator
from pathlib import Path
from urllib.parse import quote

import pytest
from hypothesis import HealthCheck, settings

# No test asserts a time, not even by way of a library: a busy machine is not a wrong program.
settings.register_profile("untimed", deadline=None, suppress_health_check=[HealthCheck.too_slow])
settings.load_profile("untimed")

REQUIRE_ALL = os.environ.get("GEOSKEW_REQUIRE_ALL", "") not in ("", "0")
NOT_APPLICABLE = ("not applicable", "the superuser may")
POSTGIS_PASSWORD = "s3cret@of:the/tests"
# Names that a tool goes by, and folders beside PATH where Debian puts servers.
OTHER_NAMES = {"chromium": ("chromium", "chromium-browser")}
SERVER_FOLDERS = sorted(Path("/usr/lib/postgresql").glob("*/bin"), reverse=True)


@pytest.hookimpl(wrapper=True)
def pytest_runtest_makereport(
    item: pytest.Item, call: pytest.CallInfo[None]
) -> Generator[None, pytest.TestReport, pytest.TestReport]:
    """Turn a skip into a failure where everything must be there."""
    report = yield
    if REQUIRE_ALL and report.skipped and not hasattr(report, "wasxfail"):
        reason = str(call.excinfo.value) if call.excinfo else ""
        if not reason.startswith(NOT_APPLICABLE):
            report.outcome = "failed"
            report.longrepr = f"{item.nodeid}: skipped where nothing may be missing: {reason}"
    return report


@pytest.fixture(scope="session")
def needs_tool() -> Callable[[str], str]:
    """Give the path of a program by name, or skip: ``chromium = needs_tool("chromium")``."""

    def find(name: str) -> str:
        for candidate in OTHER_NAMES.get(name, (name,)):
            folders = os.pathsep.join([os.environ.get("PATH", ""), *map(str, SERVER_FOLDERS)])
            if found := shutil.which(candidate, path=folders):
                return found
        pytest.skip(f"the program {name} is not installed")

    return find


@pytest.fixture(scope="session")
def needs_node_package() -> Callable[[str], Path]:
    """Give the folder of an npm package, or skip: ``axe = needs_node_package("axe-core")``.

    Packages are looked for in the folder that ``GEOSKEW_NODE_MODULES`` names, else in the checkout's
    ``node_modules``.
    """

    def find(name: str) -> Path:
        default = Path(__file__).resolve().parent.parent / "node_modules"
        folder = Path(os.environ.get("GEOSKEW_NODE_MODULES") or default) / name
        if not folder.is_dir():
            pytest.skip(f"the npm package {name} is not installed in {folder.parent}")
        return folder

    return find


@pytest.fixture(scope="session")
def postgis_url(needs_tool: Callable[[str], str]) -> Iterator[str]:
    """Address of a private PostGIS database on the loopback interface, gone after the tests; or skip.

    The server asks for passwords; the one in the address has signs that are written as %40 and the like.
    """
    initdb, server = needs_tool("initdb"), needs_tool("postgres")
    control, psql = needs_tool("pg_ctl"), needs_tool("psql")
    if not any(Path("/usr/share/postgresql").glob("*/extension/postgis.control")):
        pytest.skip("PostGIS is not installed")
    # The server refuses to run as root: the account that came with it takes over.
    as_owner = ["runuser", "-u", "postgres", "--"] if os.geteuid() == 0 else []
    # Not among pytest's folders: any later session of the superuser's closes those to other accounts.
    folder = Path(tempfile.mkdtemp(prefix="geoskew-postgis-"))
    secret = folder / "password"
    secret.write_text(POSTGIS_PASSWORD + "\n")
    if as_owner:
        shutil.chown(folder, "postgres")
        shutil.chown(secret, "postgres")
    data, port = folder / "data", _free_port()
    options = f"-p {port} -k {folder} -c listen_addresses=127.0.0.1 -c fsync=off"
    environment = {**os.environ, "PGPASSWORD": POSTGIS_PASSWORD}

    def run(*command: str) -> None:
        subprocess.run([*as_owner, *command], check=True, capture_output=True, cwd=folder, env=environment)

    ways = ["--auth=scram-sha-256", f"--pwfile={secret}", "-E", "UTF8", "--locale=C"]
    run(initdb, "-D", str(data), "-U", "geoskew", *ways)
    run(control, "-D", str(data), "-o", options, "-l", str(folder / "log"), "-w", "-p", server, "start")
    try:
        at = ["-h", "127.0.0.1", "-p", str(port), "-U", "geoskew", "-d", "postgres"]
        run(psql, *at, "-c", "CREATE EXTENSION postgis")
        yield f"postgresql://geoskew:{quote(POSTGIS_PASSWORD, safe='')}@127.0.0.1:{port}/postgres"
    finally:
        run(control, "-D", str(data), "-m", "immediate", "stop")
        shutil.rmtree(folder)


def _free_port() -> int:
    with socket.socket() as probe:
        probe.bind(("127.0.0.1", 0))
        return int(probe.getsockname()[1])
