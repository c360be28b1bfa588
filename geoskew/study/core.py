"""A scenario with its inputs read once: what every command works on."""

from __future__ import annotations

from functools import cached_property
from pathlib import Path
from typing import TYPE_CHECKING

from geoskew.errors import InputError, Problem
from geoskew.evaluate import available
from geoskew.region import Grid, grid_of
from geoskew.scenario import Scenario, load
from geoskew.situation import Inputs, prepare
from geoskew.sites import SiteList, read_sites

if TYPE_CHECKING:
    from geoskew.study.table import Assessed


class Study:
    """One scenario; everything else is read or computed when first asked for, and kept."""

    def __init__(self, path: Path, *, strict: bool = False, needs_sites: bool = True) -> None:
        self.scenario: Scenario = load(path, sites_may_be_missing=not needs_sites)
        self.strict = strict

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
        found = read_sites(self.scenario)
        if self.strict and found.rejected:
            assert self.scenario.sites is not None  # for the type checker: require() has seen it
            file = self.scenario.sites.file
            raise InputError(Problem(one.reason, file=file, line=one.line) for one in found.rejected)
        return found

    @cached_property
    def assessed(self) -> Assessed:
        """The assessed site list."""
        from geoskew.study.table import assess

        return assess(self.scenario, self.sites, self.inputs)

    @property
    def raster_names(self) -> tuple[str, ...]:
        """Layers that a grid can have."""
        return available(self.scenario, sites=False)

    @property
    def judged(self) -> str:
        """Which margins decide, in words."""
        if self.scenario.judged_in == "rain":
            assert self.scenario.weather is not None  # for the type checker: the scenario was validated
            return f"margins in rain at {self.scenario.weather.availability_percent:g} % availability decide"
        return "margins in clear sky decide"
