"""The carriers of a scenario, before and after the changeover."""

from __future__ import annotations

from typing import Annotated

from pydantic import BeforeValidator, Field

from geoskew import waveform
from geoskew.scenario.parts import Loss, Offset, Ratio, Table
from geoskew.scenario.satellites import Polarisation
from geoskew.scenario.values import number, refuse, shown, text, yes_no

HIGHEST_GHZ = 100.0
HIGHEST_MBAUD = 500.0
THRESHOLD_KINDS = ("modcod", "required_es_n0_db")


def _guess_frequency(value: float) -> str | None:
    """Explain a frequency that was given in MHz or Hz."""
    for factor, unit in ((1e3, "MHz"), (1e6, "kHz"), (1e9, "Hz")):
        if 1 <= value / factor <= HIGHEST_GHZ:
            return f"if that is in {unit}, write {value / factor:.9g}"
    return None


def _guess_rate(value: float) -> str | None:
    """Explain a symbol rate that was given in kBd or Bd."""
    for factor, unit in ((1e3, "kBd"), (1e6, "Bd")):
        if 0.001 <= value / factor <= HIGHEST_MBAUD and value > HIGHEST_MBAUD:
            return f"if that is in {unit}, write {value / factor:.9g}"
    return None


def _guess_percent(value: float) -> str | None:
    """Explain a share that was given in percent."""
    return f"if that is in percent, write {value / 100:g}" if 1 < value <= 100 else None


def _known_waveform(value: object) -> str:
    """Accept a name of EN 302 307-1 or EN 300 421."""
    if isinstance(value, str) and value in waveform.names():
        return value
    near = waveform.nearest(value) if isinstance(value, str) else None
    raise refuse(
        f"{shown(value)} is not a waveform of EN 302 307-1 or EN 300 421: give a name such as "
        f'"8PSK 3/4" or "EN 300 421 QPSK 3/4", or required_es_n0_db'
        + (f'; did you mean "{near}"?' if near else "")
    )


class Carrier(Table):
    """One carrier at one moment, overrides applied; ``required_es_n0_db`` follows a given ``modcod``."""

    name: Annotated[str, text("the carrier's name", without=",;|")]
    polarisation: Polarisation = Field(description='"V", "H", "L" or "R"')
    frequency_ghz: Annotated[
        float, number("a frequency in GHz", low=1, high=HIGHEST_GHZ, guess=_guess_frequency)
    ] = Field(description="the downlink frequency in GHz, such as 11.95")
    symbol_rate_mbaud: Annotated[
        float, number("a symbol rate in Mbaud", low=0.001, high=HIGHEST_MBAUD, guess=_guess_rate)
    ] = Field(description="the symbol rate in Mbaud, such as 27.5")
    roll_off: Annotated[float, number("a roll-off", low=0, high=1, guess=_guess_percent)] = 0.2
    modcod: Annotated[str, BeforeValidator(_known_waveform)] | None = None
    required_es_n0_db: Annotated[float, number("an Es/N0 in dB", low=-20, high=50)] = Field(
        description='the threshold, or modcod with a name such as "8PSK 3/4"'
    )
    implementation_loss_db: Loss = 0.0
    crossed: Annotated[bool, yes_no("the crossed polarisation is in use")] = True
    crossed_offset_db: Offset = 0.0
    uplink_cn_db: Ratio | None = None
    adjacent_ci_db: Ratio | None = None
