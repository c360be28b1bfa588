"""Small copies of the bundled scenarios, quick to run, and a plain scenario to break."""

from __future__ import annotations

import hashlib
import re
import shutil
from collections.abc import Iterable
from pathlib import Path

from geoskew.resources import data_folder

PLAIN = """title = "Plain"
changeover = 2027-05-18T03:00:00Z

[outgoing]
name = "Velarin"
longitude_deg = -66.2
tilt_deg = 21.0
eirp_dbw = 50.0

[incoming]
name = "Osmara"
longitude_deg = -66.2
eirp_dbw = 49.0

[carrier]
polarisation = "V"
frequency_ghz = 11.95
symbol_rate_mbaud = 27.5
modcod = "8PSK 3/4"

[terminal]
dish_m = 0.9

[region]
bounds_deg = [-70.0, -40.0, -60.0, -30.0]
step_deg = 2.0

[sites]
file = "sites.csv"

[decision]
reserve_db = 1.0
"""
PLAIN_SITES = "id,lat,lon,district\nA,-33,-65,North\nB,-34,-66,North\nC,-35,-67,South\n"
# The record by which a folder knows its own results holds times, and so differs from run to run.
RECORD = ".geoskew-files.json"


def plain(folder: Path, text: str = PLAIN, sites: str | bytes | None = PLAIN_SITES) -> Path:
    """Write a scenario without weather, carriers or crews to speak of; returns its path."""
    folder.mkdir(exist_ok=True)
    (folder / "plan.toml").write_text(text, encoding="utf-8")
    if sites is not None:
        (folder / "sites.csv").write_bytes(sites if isinstance(sites, bytes) else sites.encode())
    return folder / "plan.toml"


def small(name: str, folder: Path, *, rows: Iterable[int], dirty: bool = False) -> Path:
    """Copy a bundled scenario with cells of 2° and some rows of its list (0 is the first site)."""
    shutil.copytree(data_folder() / name, folder)
    path = folder / "scenario.toml"
    text = path.read_text(encoding="utf-8")
    text = re.sub(r"^step_deg = .*$", "step_deg = 2.0", text, flags=re.MULTILINE)
    path.write_text(text.replace("solver_seconds = 5\n", ""), encoding="utf-8")
    (list_name,) = re.findall(r'^file = "(.+)"', text, re.MULTILINE)
    header, *lines = (folder / list_name).read_text(encoding="utf-8").splitlines(keepends=True)
    kept = [lines[row] for row in rows]
    if dirty:
        kept += [line for line in lines if line.startswith(("AR-90", "CL-90", "UY-90"))]
    (folder / list_name).write_text(header + "".join(kept), encoding="utf-8")
    return path


def contents(folder: Path) -> dict[str, str]:
    """Every file and folder below a folder, with a checksum of each file."""
    return {
        path.relative_to(folder).as_posix(): "" if path.is_dir() else _checksum(path)
        for path in sorted(folder.rglob("*"))
        if path.name != RECORD
    }


def _checksum(path: Path) -> str:
    return hashlib.sha256(path.read_bytes()).hexdigest()
