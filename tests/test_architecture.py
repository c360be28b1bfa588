"""The layer picture: who may import whom, how long a module may be, what start-up may load.

The tables below are the architecture. A change of the picture is a change here and in DEVELOPERS.md.
"""

from __future__ import annotations

import ast
import json
import re
import subprocess
import sys
from collections.abc import Iterator
from functools import cache
from pathlib import Path
from typing import NamedTuple

import pytest

ROOT = Path(__file__).resolve().parent.parent
PACKAGE = ROOT / "geoskew"

# Modules and packages of the first level, by group.
GROUPS: dict[str, set[str]] = {
    "foundation": {"__init__", "angles", "constants", "errors", "ramps", "resources", "turning", "waveform"},
    "inputs": {"places", "region", "scenario", "sites", "database"},
    "directions": {"geometry", "polarisation"},
    "power": {"coverage", "kernels", "link", "receiver", "terrain", "weather"},
    "judgement": {"decision", "policies"},
    "registry": {"layers"},
    "composition": {"catalogue", "evaluate", "situation"},
    "fieldwork": {"fieldwork"},
    "engine": {"engine"},
    "outputs": {"outputs"},
    "study": {"study"},
    "command line": {"__main__", "cli"},
}

# What a group may import besides itself. Formula groups see neither a scenario nor a path of one.
FORMULAS = {"foundation", "directions", "power"}
MAY_IMPORT: dict[str, set[str]] = {
    "foundation": set(),
    "inputs": {"foundation"},
    "directions": {"foundation"},
    "power": FORMULAS,
    "judgement": FORMULAS,
    "registry": {"foundation"},
    "composition": {*FORMULAS, "inputs", "judgement", "registry"},
    "fieldwork": {*FORMULAS, "inputs", "judgement", "registry", "composition"},
    "engine": {*FORMULAS, "inputs", "judgement", "registry", "composition", "fieldwork"},
    "outputs": {"foundation", "registry", "inputs"},
    "study": set(GROUPS) - {"command line"},
    "command line": set(GROUPS),
}
# Of the inputs, outputs may see places, regions and the way into a database alone.
OUTPUTS_MAY_SEE = {"places", "region", "database"}
# Outputs do not import each other; these serve all of them.
SHARED_BY_OUTPUTS = {"files", "geopackage", "workbooks"}
# What outputs must not reach, not even by way of others.
PHYSICS = {"directions", "power", "judgement", "composition", "fieldwork", "engine"}
# Libraries that speak to the terminal.
TERMINAL_LIBRARIES = {"click", "rich"}
# What `geoskew --help` may not load: each costs a good part of a second.
HEAVY = {"contourpy", "dask", "distributed", "folium", "fpdf", "geopandas", "icalendar", "itur", "matplotlib"}
HEAVY |= {"numba", "openpyxl", "ortools", "pandas", "pyarrow", "pyogrio", "pyproj", "rasterio", "scipy"}
HEAVY |= {"geoalchemy2", "psycopg", "shapely", "sqlalchemy"}
LONGEST_MODULE = 300


class Import(NamedTuple):
    """One import of a module of ours, or of a library by its first name."""

    target: str
    line: int


def _name(path: Path) -> str:
    parts = path.relative_to(ROOT).with_suffix("").parts
    return ".".join(parts[:-1] if parts[-1] == "__init__" else parts)


MODULES: dict[str, Path] = {_name(path): path for path in sorted(PACKAGE.rglob("*.py"))}


def _group(module: str) -> str:
    first = module.split(".")[1] if "." in module else "__init__"
    return next((group for group, members in GROUPS.items() if first in members), "")


def _ours(name: str) -> str:
    """The longest beginning of a dotted name that is a module of ours."""
    while name and name not in MODULES:
        name = name.rpartition(".")[0]
    return name


@cache
def _imports(module: str) -> tuple[Import, ...]:
    """Every import of a module, within functions and for type checking alone included."""
    found = []
    for node in ast.walk(ast.parse(MODULES[module].read_text(encoding="utf-8"))):
        if isinstance(node, ast.Import):
            found += [Import(alias.name, node.lineno) for alias in node.names]
        elif isinstance(node, ast.ImportFrom):
            assert node.level == 0, f"{module}:{node.lineno}: relative import"
            found += [Import(f"{node.module}.{alias.name}", node.lineno) for alias in node.names]
    return tuple(found)


def _our_imports(module: str) -> Iterator[Import]:
    for item in _imports(module):
        if item.target.split(".")[0] == "geoskew":
            yield Import(_ours(item.target), item.line)


def test_every_module_has_a_place_in_the_picture() -> None:
    assert [module for module in MODULES if not _group(module)] == []


def test_imports_follow_the_picture() -> None:
    wrong = []
    for module in MODULES:
        group = _group(module)
        for target, line in _our_imports(module):
            if _group(target) not in MAY_IMPORT[group] | {group} and target != "geoskew":
                wrong.append(f"{module}:{line} ({group}) imports {target} ({_group(target)})")
    assert wrong == []


def test_outputs_see_little_of_the_inputs() -> None:
    wrong = []
    for module in MODULES:
        if _group(module) != "outputs":
            continue
        for target, line in _our_imports(module):
            if _group(target) == "inputs" and target.split(".")[1] not in OUTPUTS_MAY_SEE:
                wrong.append(f"{module}:{line} imports {target}")
    assert wrong == []


def test_outputs_do_not_import_each_other() -> None:
    wrong = []
    for module in MODULES:
        parts = module.split(".")
        if _group(module) != "outputs" or len(parts) < 3:
            continue
        for target, line in _our_imports(module):
            others = target.split(".")
            if others[1:2] == ["outputs"] and others[2:3] and others[2] not in {parts[2], *SHARED_BY_OUTPUTS}:
                wrong.append(f"{module}:{line} imports {target}")
    assert wrong == []


def _reached(start: str) -> set[str]:
    """All modules of ours that a module imports, and those that these import, and so on."""
    reached: set[str] = set()
    waiting = [start]
    while waiting:
        for target, _ in _our_imports(waiting.pop()):
            if target not in reached:
                reached.add(target)
                waiting.append(target)
    return reached


def test_outputs_reach_no_physics() -> None:
    wrong = {
        module: sorted(target for target in _reached(module) if _group(target) in PHYSICS)
        for module in MODULES
        if _group(module) == "outputs"
    }
    assert {module: targets for module, targets in wrong.items() if targets} == {}


def test_only_the_command_line_speaks_to_the_terminal() -> None:
    wrong = []
    for module in MODULES:
        if _group(module) == "command line":
            continue
        names = {item.target.split(".")[0] for item in _imports(module)}
        wrong += [f"{module} imports {name}" for name in sorted(names & TERMINAL_LIBRARIES)]
    assert wrong == []


def test_no_module_is_longer_than_one_head_can_hold() -> None:
    lengths = {module: len(path.read_text(encoding="utf-8").splitlines()) for module, path in MODULES.items()}
    assert {module: length for module, length in lengths.items() if length > LONGEST_MODULE} == {}


ALONE = """
import importlib, json, sys, traceback
failed = {}
for module in json.loads(sys.argv[1]):
    for loaded in [name for name in sys.modules if name.split(".")[0] == "geoskew"]:
        del sys.modules[loaded]
    try:
        importlib.import_module(module)
    except Exception:
        failed[module] = traceback.format_exc(limit=-3)
json.dump(failed, sys.stdout)
"""


def test_each_module_can_be_imported_first() -> None:
    # Every module in turn is the first of ours that a process imports: a loop of imports shows.
    names = [module for module in MODULES if not module.endswith("__main__")]
    done = subprocess.run(
        [sys.executable, "-c", ALONE, json.dumps(names)], capture_output=True, text=True, check=False
    )
    assert done.returncode == 0, done.stderr
    assert json.loads(done.stdout) == {}


HELP = """
import sys
from geoskew.cli import main
try:
    main(["--help"])
except SystemExit as end:
    assert not end.code, end.code
sys.stderr.write("\\n" + ",".join(sorted({name.split(".")[0] for name in sys.modules})))
"""


def test_help_loads_nothing_heavy() -> None:
    if "geoskew.cli" not in MODULES:
        pytest.skip("not applicable: there is no command line yet")
    done = subprocess.run([sys.executable, "-c", HELP], capture_output=True, text=True, check=False, cwd=ROOT)
    assert done.returncode == 0, done.stderr
    assert "Usage" in done.stdout
    assert HEAVY & set(done.stderr.splitlines()[-1].split(",")) == set()


# Put together here, so that this file does not trip over itself.
FOREIGN = [
    rf"/{'wor'}k/(main|shared|blueprint)",
    rf"/{'roo'}t/",
    rf"{'pypi'}\.org",
    rf"{'python'}hosted\.org",
    rf"registry\.{'npm'}js",
    rf"deb\.{'debian'}\.org",
    rf"--{'index'}-url|--{'extra-index'}-url",
]


def _public_files() -> list[Path]:
    """Files under version control, or what a source archive has of them."""
    listed = subprocess.run(
        ["git", "-C", str(ROOT), "ls-files", "-z"], capture_output=True, text=True, check=False
    )
    if listed.returncode == 0:
        return [ROOT / name for name in listed.stdout.split("\0") if name]
    folders = ("geoskew", "tests", "data")
    return [path for folder in folders for path in (ROOT / folder).rglob("*") if path.is_file()]


def test_public_text_names_no_place_of_a_machine() -> None:
    pattern = re.compile("|".join(FOREIGN))
    found = []
    for path in _public_files():
        if not path.is_file():
            continue
        content = path.read_bytes()
        if b"\0" in content:
            continue
        for number, line in enumerate(content.decode("utf-8").splitlines(), start=1):
            if hit := pattern.search(line):
                found.append(f"{path.relative_to(ROOT)}:{number}: {hit[0]}")
    assert found == []
