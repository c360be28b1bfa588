"""The scenario: everything that a changeover study is told, validated as a whole."""

from __future__ import annotations

from datetime import datetime
from functools import cached_property
from pathlib import Path
from typing import Annotated, Final, Literal

from pydantic import BeforeValidator, Field

from geoskew.errors import MissingPartError, Problem
from geoskew.scenario import checksums
from geoskew.scenario.carrier import Carrier
from geoskew.scenario.fieldwork import Crew, Database, Visits
from geoskew.scenario.ground import Decision, Region, SitesTable, Terminal, Terrain, Weather
from geoskew.scenario.parts import Table
from geoskew.scenario.satellites import Neighbour, Satellite
from geoskew.scenario.values import moment, number, text

# How a part is asked for when a command needs it, by attribute.
PARTS: Final[dict[str, str]] = {
    "changeover": "changeover = 2027-05-18T03:00:00Z (the moment, with Z or an offset)",
    "region": "[region] with bounds_deg or outline and its step",
    "sites": '[sites] with file = "sites.csv", or [database] with url_env and query',
    "weather": "[weather] with availability_percent",
    "terrain": '[terrain] with dem = "dem.tif"',
    "neighbours": "[[neighbour]] with longitude_deg, polarisation and eirp_dbw",
    "crews": "[[crew]] with name, base, visits_per_day and km_per_day",
    "visits": "[visits] with first_day",
    "database": "[database] with url_env",
}

# Longitudes and latitudes of the two slots that differ by less are the same slot.
_SAME_SLOT_DEG: Final = 1e-9


_CARRIER: Final = "polarisation, frequency_ghz, symbol_rate_mbaud and modcod or required_es_n0_db"


class Scenario(Table):
    """A validated scenario: nothing in it needs another check. Small, frozen and picklable.

    Attributes are the keys of the scenario file, but for ``carriers_before`` and ``carriers_after``
    (in one order, paired by name, overrides applied), ``neighbours``, ``crews``, and
    ``lowest_elevation_deg``, which is there without a region too. Moments are in UTC, paths absolute.
    """

    path: Path
    title: Annotated[str, text("a title")]
    changeover: Annotated[datetime, BeforeValidator(moment)] | None = None
    overlap_hours: Annotated[float, number("hours", low=0, high=87_660)] = 0.0
    outgoing: Satellite = Field(description="the satellite in service, with longitude_deg and an EIRP")
    incoming: Satellite = Field(description="the satellite that takes over, with longitude_deg and an EIRP")
    carriers_before: tuple[Carrier, ...] = Field(description=_CARRIER)
    carriers_after: tuple[Carrier, ...] = Field(description=_CARRIER)
    terminal: Terminal = Terminal()
    region: Region | None = None
    lowest_elevation_deg: Annotated[float, number("an elevation in degrees", low=0, high=89)] = 5.0
    sites: SitesTable | None = None
    weather: Weather | None = None
    terrain: Terrain | None = None
    decision: Decision = Decision()
    neighbours: tuple[Neighbour, ...] = ()
    crews: tuple[Crew, ...] = ()
    visits: Visits | None = None
    database: Database | None = None

    @property
    def judged_in(self) -> Literal["clear", "rain"]:
        """Which margins decide: ``decision.judged_in``, else those in rain where there is weather."""
        return self.decision.judged_in or ("rain" if self.weather else "clear")

    @property
    def slots_differ(self) -> bool:
        """Whether the two satellites stand at different places on the orbit (more than 1e-9°)."""
        along = (self.incoming.longitude_deg - self.outgoing.longitude_deg + 180.0) % 360.0 - 180.0
        across = self.incoming.latitude_deg - self.outgoing.latitude_deg
        return max(abs(along), abs(across)) > _SAME_SLOT_DEG

    @property
    def has_sites(self) -> bool:
        """Whether there is a site list: of a file, or of a database's query."""
        return self.sites is not None or (self.database is not None and self.database.query is not None)

    def _has(self, part: str) -> bool:
        return self.has_sites if part == "sites" else bool(getattr(self, part))

    @cached_property
    def input_files(self) -> dict[str, str]:
        """SHA-256 of every input file, by its path relative to the scenario file; read when first asked for.

        A folder counts with every file in it; a site list that is not there is left out.

        Raises
        ------
        InputError
            A file can no longer be read.
        """
        may_be_missing = () if self.sites is None else (self.sites.file,)
        return checksums.of_files(self, self.path.parent, may_be_missing=may_be_missing)

    @cached_property
    def digest(self) -> str:
        """SHA-256 of the scenario's content and of every input file; comments and place do not count."""
        return checksums.of_scenario(self, self.input_files, self.path.parent)

    def require_any(self, *parts: str, for_what: str) -> None:
        """Refuse a job that needs one of several parts when all of them are missing.

        Raises
        ------
        MissingPartError
            Names the parts and how to give them.
        """
        if not any(self._has(part) for part in parts):
            ways = ", or ".join(PARTS[part] for part in parts)
            raise MissingPartError(
                Problem(f"one of {', '.join(parts)} is needed for {for_what}: add {ways}", file=self.path)
            )

    def require(self, *parts: str, for_what: str) -> None:
        """Refuse a job whose parts are missing.

        Parameters
        ----------
        *parts : str
            Names of attributes, such as ``changeover`` or ``sites``.
        for_what : str
            The job in words, such as "a plan of visits".

        Raises
        ------
        MissingPartError
            Names every part that is missing and how to give it.
        """
        missing = [part for part in parts if not self._has(part)]
        if missing:
            raise MissingPartError(
                Problem(f"is missing, but needed for {for_what}: add {PARTS[part]}", file=self.path, key=part)
                for part in missing
            )
