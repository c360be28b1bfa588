"""What the lines of one carrier's budget are read from."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

from geoskew.link import Response
from geoskew.situation import Situation
from geoskew.situation.carriers import Link
from geoskew.study.budget.account import number
from geoskew.study.budget.cases import Case
from geoskew.study.budget.sources import Sources


@dataclass(frozen=True)
class Bench:
    """One carrier of one case under one sky."""

    situation: Situation
    sources: Sources
    case: Case
    carrier_number: int
    rain: bool

    @property
    def carrier(self) -> Any:
        """The carrier at that moment."""
        return self.situation.carriers(self.case.moment)[self.carrier_number]

    @property
    def terms(self) -> Link:
        """The link with a perfectly set feed."""
        return self.situation.link(self.case.stand, self.carrier_number, rain=self.rain)

    @property
    def response(self) -> Response:
        """How its margin depends on the setting."""
        return self.situation.responses(self.case.stand, rain=self.rain)[self.carrier_number]

    @property
    def setting(self) -> float:
        """The case's setting, degrees."""
        return number(self.case.setting(self.situation))

    def of_carrier(self, key: str) -> str:
        """Source of a key of the carrier."""
        return self.sources.carrier(self.case.moment, self.carrier_number, key)
