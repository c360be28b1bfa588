"""What cards, map and report say of a scenario, as plain values."""

from __future__ import annotations

from typing import TYPE_CHECKING, Final

from geoskew import __version__
from geoskew.outputs.cards import CardFacts, CarrierLine

if TYPE_CHECKING:
    from geoskew.scenario import Scenario
    from geoskew.study.core import Study

CAUTIONS: Final = (
    "Work at height only with fall protection and a second person; secure ladders, "
    "keep off wet, icy or weak roofs.",
    "Stop in strong wind and at the first sign of a thunderstorm.",
    "Keep well away from overhead power lines; dish, mast and tools conduct.",
    "A dish that transmits: switch the transmitter off and secure it "
    "before anyone stands in front of the feed.",
    "Local codes and licensed practice prevail over anything said here.",
)


def card_facts(study: Study) -> CardFacts:
    """Facts that all job cards share.

    Raises
    ------
    MissingPartError
        The scenario lacks the time of the changeover.
    """
    scenario = study.scenario
    scenario.require("changeover", "sites", for_what="job cards")
    assert scenario.changeover is not None  # for the type checker: require() has seen it
    terminal = scenario.terminal
    return CardFacts(
        title=scenario.title,
        changeover=scenario.changeover,
        outgoing=scenario.outgoing.name,
        incoming=scenario.incoming.name,
        outgoing_longitude_deg=scenario.outgoing.longitude_deg,
        incoming_longitude_deg=scenario.incoming.longitude_deg,
        outgoing_latitude_deg=scenario.outgoing.latitude_deg,
        incoming_latitude_deg=scenario.incoming.latitude_deg,
        carriers_before=_carriers(scenario, "before"),
        carriers_after=_carriers(scenario, "after"),
        judged_in="rain" if scenario.judged_in == "rain" else "clear",
        reserve_db=scenario.decision.reserve_db,
        overlap_hours=scenario.overlap_hours,
        availability_percent=None if scenario.weather is None else scenario.weather.availability_percent,
        terminal={
            "dish_m": terminal.dish_m,
            "scale_step_deg": terminal.scale_step_deg,
            "ports": terminal.ports,
            "transmits": terminal.transmits,
            "mount": terminal.mount,
        },
        edition=edition(scenario),
    )


def edition(scenario: Scenario) -> str:
    """Version of the program and digest of the inputs."""
    return f"geoskew {__version__}, inputs {scenario.digest[:12]}"


def _carriers(scenario: Scenario, moment: str) -> tuple[CarrierLine, ...]:
    carriers = scenario.carriers_before if moment == "before" else scenario.carriers_after
    return tuple(
        CarrierLine(
            name=one.name,
            polarisation=one.polarisation,
            frequency_ghz=one.frequency_ghz,
            symbol_rate_mbaud=one.symbol_rate_mbaud,
            waveform=one.modcod or f"Es/N0 {one.required_es_n0_db:g} dB",
            needed_db=one.required_es_n0_db + one.implementation_loss_db,
        )
        for one in carriers
    )
