"""A scenario with its inputs read once: what every command works on."""

from __future__ import annotations

from collections.abc import Callable
from functools import cached_property
from pathlib import Path
from typing import TYPE_CHECKING

from geoskew.errors import InputError, Problem
from geoskew.evaluate import available
from geoskew.layers import REGISTRY
from geoskew.region import Grid, grid_of
from geoskew.scenario import Scenario, load
from geoskew.sites import SiteList, read_sites
from geoskew.situation import Inputs, prepare

if TYPE_CHECKING:
    from geoskew.study.table import Assessed


class Study:
    """One scenario; everything else is read or computed when first asked for, and kept."""

    def __init__(self, path: Path, *, strict: bool = False, needs_sites: bool = True) -> None:
        self.scenario: Scenario = load(path, sites_may_be_missing=not needs_sites)
        self.strict = strict
        self.needs_sites = needs_sites

    def read(self) -> None:
        """Read every input that the work needs.

        Raises
        ------
        InputError
            All problems of all inputs, each once.
        """
        if problems := self.problems():
            raise InputError(problems)

    def problems(self) -> list[Problem]:
        """Read every input that the work needs; what is wrong with them, each problem once."""
        readers: list[Callable[[], object]] = [lambda: self.inputs]
        if self.scenario.region is not None:
            readers.append(lambda: self.grid)
        if self.scenario.has_sites and self.needs_sites:
            readers.append(lambda: self.sites)
        found: dict[Problem, None] = {}
        for reader in readers:
            try:
                reader()
            except InputError as error:
                found |= dict.fromkeys(error.problems)
        return list(found)

    @cached_property
    def inputs(self) -> Inputs:
        """Footprints."""
        return prepare(self.scenario)

    @cached_property
    def grid(self) -> Grid:
        """The region's grid."""
        return grid_of(self.scenario)

    @cached_property
    def sites(self) -> SiteList:
        """The site list; with `strict`, a row that cannot be used is an error.

        Raises
        ------
        MissingPartError
            The scenario has no site list.
        InputError
            The list cannot be read, has no usable row, or `strict` and any row was rejected.
        """
        self.scenario.require("sites", for_what="an assessed site list")
        found = read_sites(self.scenario, compare=self._has_grid)
        if self.strict and found.rejected:
            raise InputError(Problem(one.reason, file=found.source, line=one.line) for one in found.rejected)
        return found

    @property
    def _has_grid(self) -> bool:
        """Whether the region is right; a wrong one hides no problem of the site list."""
        try:
            return self.scenario.region is not None and self.grid.cells > 0
        except InputError:
            return False

    @cached_property
    def assessed(self) -> Assessed:
        """The assessed site list."""
        from geoskew.study.table import assess

        self.read()
        return assess(self.scenario, self.sites, self.inputs)

    @property
    def raster_names(self) -> tuple[str, ...]:
        """Layers that a grid can have."""
        return available(self.scenario, sites=False)

    @property
    def judged(self) -> str:
        """Which margins decide, in words, and which part of the scenario they leave out."""
        told = "margins in clear sky decide"
        if self.scenario.judged_in == "rain":
            assert self.scenario.weather is not None  # for the type checker: the scenario was validated
            told = f"margins in rain at {self.scenario.weather.availability_percent:g} % availability decide"
        if self.scenario.terrain is not None and not any("terrain" in one.needs for one in REGISTRY.values()):
            told += "; [terrain] is not used yet: margins are judged without it"
        return told
