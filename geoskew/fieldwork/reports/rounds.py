"""From rows of the history to rounds of evidence: each site's first visit, second visit, and so on.

A visit is all rows of one site on one day; what is read later without a visit counts to the visit
before it. Rows of one day that cannot all be true are contradictory: none of them is used, all of
them are listed, and a visit on a later day settles the matter.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from datetime import date, datetime, timedelta
from itertools import combinations, groupby
from typing import Final, NamedTuple

import numpy as np
from numpy.typing import NDArray

from geoskew.angles import fold
from geoskew.fieldwork.reports.evidence import (
    INCLINOMETER_DEG,
    QUALITY_DB,
    SCALE_STEPS,
    Evidence,
    Slot,
    mean_setting,
)
from geoskew.fieldwork.reports.moments import moment_of
from geoskew.fieldwork.reports.rows import Report

# Two readings of the same thing contradict each other beyond so many standard deviations.
CONTRADICTION_SIGMAS: Final = 4.0


class Facts(NamedTuple):
    """What reading a site's reports needs: longitude, scale, and whether its visit is at the changeover.

    ``scale_zero`` is the setting at the scale's zero, NaN where it is not known; ``scale_sense`` is +1
    where the numbers grow clockwise seen from behind, else −1; degrees throughout.
    """

    longitude: float
    scale_zero: float
    scale_sense: int
    scale_step: float
    at_changeover: bool


@dataclass(frozen=True)
class Round:
    """Evidence of the sites (by their numbers) that have reports of this round."""

    sites: NDArray[np.intp]
    days: tuple[date, ...]
    visited: NDArray[np.bool_]
    after: NDArray[np.bool_]
    contradicted: NDArray[np.bool_]
    evidence: Evidence


@dataclass
class Gathered:
    """Rounds in order, rows that contradict each other with the reason, and readings that were not used."""

    rounds: list[Round] = field(default_factory=list)
    contradictory: list[tuple[Report, str]] = field(default_factory=list)
    scales_unknown: int = 0
    moments_unknown: int = 0


@dataclass
class _Visit:
    """What one visit and the readings after it say of one site."""

    day: date  # of its last row
    visited: bool
    after: bool
    contradicted: bool = False
    settings: list[tuple[float, float]] = field(default_factory=list)
    signals: dict[Slot, list[float]] = field(default_factory=dict)


class Gathering:
    """Turns reports into rounds."""

    def __init__(
        self,
        facts: Mapping[str, Facts],
        slots: Sequence[Slot],
        carriers: Sequence[str],
        changeover: datetime,
        overlap: timedelta,
    ) -> None:
        self.facts, self.slots, self.carriers = facts, tuple(slots), tuple(carriers)
        self.changeover, self.overlap = changeover, overlap
        self.found = Gathered()

    def gather(self, reports: Sequence[Report]) -> Gathered:
        """Rounds of all reports, which stand by site and date."""
        numbers = {site: number for number, site in enumerate(self.facts)}
        visits: list[list[tuple[int, _Visit]]] = []
        for site, rows in groupby(reports, key=lambda one: one.site):
            if site not in self.facts:
                self.found.contradictory += [
                    (row, f"site {site!r} is not in the site list any more") for row in rows
                ]
                continue
            for number, visit in enumerate(self._visits(list(rows), self.facts[site])):
                if number == len(visits):
                    visits.append([])
                visits[number].append((numbers[site], visit))
        self.found.rounds = [self._round(entries) for entries in visits]
        return self.found

    def _visits(self, rows: list[Report], facts: Facts) -> list[_Visit]:
        visits: list[_Visit] = []
        early: list[tuple[Report, str]] = []  # signals read before anybody came
        for day, same in groupby(rows, key=lambda one: one.day):
            group = list(same)
            moments = [self._moment(row, facts) for row in group]
            came = any(row.is_visit for row in group)
            if not visits:
                # A signal alone is a visit's before the changeover; after it, it may be a monitor's.
                came = came or any(moment != "after" for moment in moments)
            if not came:
                for row, moment in zip(group, moments, strict=True):
                    if visits:
                        visits[-1].day = day
                        self._signal(visits[-1], row, "left", moment, row.quality_after)
                    else:
                        early.append((row, moment))
                continue
            visit = _Visit(day, True, all(moment == "after" for moment in moments))
            wrong = self._contradiction(group, moments, facts)
            if wrong:
                visit.contradicted = True
                self.found.contradictory += [(row, wrong) for row in group]
            else:
                if not visits:
                    for row, moment in early:
                        self._signal(visit, row, "found", moment, row.quality_after)
                self._fill(visit, group, moments, facts)
            visits.append(visit)
        if not visits and early:
            visit = _Visit(early[-1][0].day, False, True)
            for row, moment in early:
                self._signal(visit, row, "left", moment, row.quality_after)
            visits.append(visit)
        return visits

    def _moment(self, row: Report, facts: Facts) -> str:
        return moment_of(row, facts.longitude, self.changeover, self.overlap)

    def _fill(self, visit: _Visit, group: list[Report], moments: list[str], facts: Facts) -> None:
        for row, moment in zip(group, moments, strict=True):
            visit.settings += self._settings(row, facts)
            if row.setting_scale is not None and not np.isfinite(facts.scale_zero):
                self.found.scales_unknown += 1
            # Work at the changeover ends with the new satellite; what was read first may be of either.
            left = "after" if not moment and facts.at_changeover else moment
            self._signal(visit, row, "found", moment, row.quality_before)
            self._signal(visit, row, "left", left, row.quality_after)

    @staticmethod
    def _settings(row: Report, facts: Facts) -> list[tuple[float, float]]:
        """Settings that a row gives, with their standard deviations."""
        settings = []
        if row.setting_inclinometer is not None:
            settings.append((float(fold(row.setting_inclinometer)), INCLINOMETER_DEG))
        if row.setting_scale is not None and np.isfinite(facts.scale_zero):
            setting = facts.scale_zero + facts.scale_sense * row.setting_scale
            settings.append((float(fold(setting)), max(SCALE_STEPS * facts.scale_step, INCLINOMETER_DEG)))
        return settings

    def _signal(self, visit: _Visit, row: Report, stage: str, moment: str, value: float | None) -> None:
        if value is None:
            return
        if not moment:
            self.found.moments_unknown += 1
            return
        carrier = self.carriers.index(row.carrier) if row.carrier else 0
        slot = next(
            one for one in self.slots if (one.stage, one.moment, one.carrier) == (stage, moment, carrier)
        )
        visit.signals.setdefault(slot, []).append(value)

    def _contradiction(self, group: list[Report], moments: list[str], facts: Facts) -> str:
        """What of a day's rows cannot be true together; empty where nothing is."""
        settings = [one for row in group for one in self._settings(row, facts)]
        for (one, sigma), (other, other_sigma) in combinations(settings, 2):
            gap = abs(float(fold(one - other)))
            if gap > CONTRADICTION_SIGMAS * np.hypot(sigma, other_sigma):
                told = f"settings of {one:.1f}° and {other:.1f}°"
                return f"{told} on one day contradict each other; send the right one"
        for name in ("quality_before", "quality_after"):
            read: dict[tuple[str, str], list[float]] = {}
            for row, moment in zip(group, moments, strict=True):
                if getattr(row, name) is not None:
                    read.setdefault((moment, row.carrier), []).append(getattr(row, name))
            for values in read.values():
                if max(values) - min(values) > CONTRADICTION_SIGMAS * np.sqrt(2.0) * QUALITY_DB:
                    told = f"{name} of {min(values):g} dB and {max(values):g} dB"
                    return f"{told} on one day contradict each other; send the right one"
        return ""

    def _round(self, entries: list[tuple[int, _Visit]]) -> Round:
        entries = sorted(entries, key=lambda entry: entry[0])
        visits = [visit for _, visit in entries]
        settings = np.array([mean_setting(visit.settings) for visit in visits]).reshape(-1, 2)
        shape = (len(visits), len(self.slots))
        quality, count = np.full(shape, np.nan), np.zeros(shape)
        for row, visit in enumerate(visits):
            for slot, values in visit.signals.items():
                column = self.slots.index(slot)
                quality[row, column], count[row, column] = float(np.mean(values)), len(values)
        return Round(
            sites=np.array([number for number, _ in entries], dtype=np.intp),
            days=tuple(visit.day for visit in visits),
            visited=np.array([visit.visited for visit in visits], dtype=np.bool_),
            after=np.array([visit.after for visit in visits], dtype=np.bool_),
            contradicted=np.array([visit.contradicted for visit in visits], dtype=np.bool_),
            evidence=Evidence(settings[:, 0], settings[:, 1], quality, count),
        )
