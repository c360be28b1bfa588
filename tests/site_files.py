"""Scenarios around a site list, for the tests of its reading."""

from __future__ import annotations

from pathlib import Path
from typing import Any

from geoskew.scenario import Scenario, from_dict
from geoskew.sites import SiteList, read_sites

ROWS = "A,-33.5,-70.25\nB,-34.0,-71\n"


def scenario(file: Path, *, region: dict[str, object] | None = None, **settings: object) -> Scenario:
    """A scenario whose site list is this file."""
    satellite = {"longitude_deg": -66.2, "eirp_dbw": 50.0}
    document: dict[str, Any] = {
        "outgoing": satellite,
        "incoming": satellite,
        "carrier": {
            "polarisation": "V",
            "frequency_ghz": 11.95,
            "symbol_rate_mbaud": 27.5,
            "required_es_n0_db": 7.9,
        },
        "sites": {"file": file.name, **settings},
    }
    if region is not None:
        document["region"] = region
    return from_dict(document, path=file.parent / "scenario.toml")


def read(file: Path, **settings: Any) -> SiteList:
    """Read this file as a site list."""
    return read_sites(scenario(file, **settings))


def read_text(folder: Path, text: str | bytes, *, name: str = "sites.csv", **settings: Any) -> SiteList:
    """Write this text to a file and read it as a site list."""
    file = folder / name
    file.write_bytes(text if isinstance(text, bytes) else text.encode())
    return read(file, **settings)


def reasons(sites: SiteList) -> dict[int, str]:
    """Reasons of rejected rows by line."""
    return {row.line: row.reason for row in sites.rejected}
