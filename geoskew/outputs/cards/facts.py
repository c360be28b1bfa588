"""What the cards need to know of the whole network, as plain values."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from datetime import datetime
from typing import Literal


@dataclass(frozen=True, slots=True)
class CarrierLine:
    """One carrier as a crew's receiver names it.

    ``frequency_ghz`` GHz, ``symbol_rate_mbaud`` Mbaud, ``needed_db``: the least Es/N0 that the
    receiver needs in practice, dB, that is the waveform's threshold plus the implementation loss.
    """

    name: str
    polarisation: Literal["V", "H", "L", "R"]
    frequency_ghz: float
    symbol_rate_mbaud: float
    waveform: str
    needed_db: float


@dataclass(frozen=True, slots=True)
class CardFacts:
    """Facts that all cards share; the rest comes from the assessed table.

    Attributes
    ----------
    title : str
        The scenario's title.
    changeover : datetime
        Aware; printed in UTC.
    outgoing, incoming : str
        Names of the two satellites.
    outgoing_longitude_deg, incoming_longitude_deg : float
        Their slots, degrees east.
    outgoing_latitude_deg, incoming_latitude_deg : float
        Their sub-satellite latitudes, degrees north.
    carriers_before, carriers_after : tuple of CarrierLine
        Paired by position.
    judged_in : {"clear", "rain"}
        Which margins decided.
    reserve_db : float
        The margin kept for what the budget does not model, dB.
    overlap_hours : float
        How long both satellites carry the traffic.
    availability_percent : float, optional
        Of the margins in rain.
    terminal : mapping
        Defaults of the terminal (``dish_m``, ``scale_step_deg``, ``ports``, ``transmits``, ``mount``);
        a column of the table goes before.
    edition : str
        Version of the program and digest of the inputs, for the foot of a page.
    """

    title: str
    changeover: datetime
    outgoing: str
    incoming: str
    outgoing_longitude_deg: float
    incoming_longitude_deg: float
    carriers_before: tuple[CarrierLine, ...]
    carriers_after: tuple[CarrierLine, ...]
    judged_in: Literal["clear", "rain"] = "clear"
    reserve_db: float = 1.0
    overlap_hours: float = 0.0
    availability_percent: float | None = None
    terminal: Mapping[str, float | int | bool | str | None] = field(default_factory=dict)
    edition: str = ""
    outgoing_latitude_deg: float = 0.0
    incoming_latitude_deg: float = 0.0

    @property
    def same_slot(self) -> bool:
        """Whether the dish need not be moved: both satellites stand at one place on the orbit."""
        along = (self.incoming_longitude_deg - self.outgoing_longitude_deg + 180.0) % 360.0 - 180.0
        across = self.incoming_latitude_deg - self.outgoing_latitude_deg
        return max(abs(along), abs(across)) < 1e-6

    @property
    def judged(self) -> str:
        """Which margins decided, in words that follow "judged"."""
        if self.judged_in == "rain" and self.availability_percent is not None:
            return f"in rain at {self.availability_percent:g} % availability"
        return "in rain" if self.judged_in == "rain" else "in clear sky"
