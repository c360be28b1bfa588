"""Waveforms by their names in the standards: thresholds, spectral efficiency, occupied bandwidth.

A bare name such as ``8PSK 3/4`` is a mode of EN 302 307-1; ``EN 300 421 QPSK 3/4`` is one of the older
standard. This module imports nothing but the errors, so that input checks may use it.

References
----------
.. [1] ETSI EN 302 307-1 V1.4.1 (2014-11), Table 13: ideal Es/N0 for a packet error ratio of 1e-7 over the
   AWGN channel, frames of 64 800 bits, no pilots; Table 5a: BCH block lengths; Table 11: slots in a frame.
.. [2] ETSI EN 300 421 V1.1.2 (1997-08), performance in the IF loop: Eb/N0 for 2e-4 behind the Viterbi
   decoder, quasi error free behind Reed-Solomon, a modem implementation margin of 0.8 dB included.
"""

from __future__ import annotations

import difflib
import math
from fractions import Fraction
from typing import Final

from geoskew.errors import InputError

# [1] Table 13, dB.
_ES_N0_DB: Final[dict[str, dict[str, float]]] = {
    "QPSK": {
        "1/4": -2.35, "1/3": -1.24, "2/5": -0.30, "1/2": 1.00, "3/5": 2.23, "2/3": 3.10,
        "3/4": 4.03, "4/5": 4.68, "5/6": 5.18, "8/9": 6.20, "9/10": 6.42,
    },
    "8PSK": {"3/5": 5.50, "2/3": 6.62, "3/4": 7.91, "5/6": 9.35, "8/9": 10.69, "9/10": 10.98},
    "16APSK": {"2/3": 8.97, "3/4": 10.21, "4/5": 11.03, "5/6": 11.61, "8/9": 12.89, "9/10": 13.13},
    "32APSK": {"3/4": 12.73, "4/5": 13.64, "5/6": 14.28, "8/9": 15.69, "9/10": 16.05},
}  # fmt: skip

# [1] Table 5a: bits in an uncoded BCH block, by code rate.
_BCH_BITS: Final[dict[str, int]] = {
    "1/4": 16008, "1/3": 21408, "2/5": 25728, "1/2": 32208, "3/5": 38688, "2/3": 43040,
    "3/4": 48408, "4/5": 51648, "5/6": 53840, "8/9": 57472, "9/10": 58192,
}  # fmt: skip
_HEADER_BITS: Final = 80

# [1] Table 11: slots of 90 symbols in a frame, without its header, which is one slot more.
_SLOTS: Final[dict[str, int]] = {"QPSK": 360, "8PSK": 240, "16APSK": 180, "32APSK": 144}
_SLOT_SYMBOLS: Final = 90

# [2] Eb/N0 in the IF loop, dB, by the rate of the convolutional code; QPSK only.
_OLDER_PREFIX: Final = "EN 300 421 "
_EB_N0_DB: Final[dict[str, float]] = {"1/2": 4.5, "2/3": 5.0, "3/4": 5.5, "5/6": 6.0, "7/8": 6.4}
_MODEM_MARGIN_DB: Final = 0.8
_REED_SOLOMON_RATE: Final = 188 / 204


def names() -> tuple[str, ...]:
    """Return every known name, those of EN 302 307-1 first, each standard in the order of its table."""
    newer = [f"{modulation} {rate}" for modulation, rates in _ES_N0_DB.items() for rate in rates]
    return (*newer, *(f"{_OLDER_PREFIX}QPSK {rate}" for rate in _EB_N0_DB))


def nearest(name: str) -> str | None:
    """Return the known name that looks most like ``name``, or None when nothing does."""
    plain = {_plain(known): known for known in reversed(names())}
    found = difflib.get_close_matches(_plain(name), plain, n=1, cutoff=0.5)
    return plain[found[0]] if found else None


def required_es_n0(name: str) -> float:
    """Return the Es/N0 that a waveform needs, without any implementation loss.

    Parameters
    ----------
    name : str
        A name of EN 302 307-1 such as ``8PSK 3/4``, or of EN 300 421 such as ``EN 300 421 QPSK 3/4``.

    Returns
    -------
    float
        Es/N0, dB. EN 302 307-1: Table 13 as printed. EN 300 421: Eb/N0 − 0.8 + 10·log10(2·r·188/204),
        since the standard's figures hold a modem margin of 0.8 dB and count useful bits.

    Raises
    ------
    InputError
        The name is not known; the message names the nearest one.

    Examples
    --------
    >>> required_es_n0("8PSK 3/4")
    7.91
    >>> round(required_es_n0("EN 300 421 QPSK 3/4"), 3)
    6.106
    """
    standard, modulation, rate = _parts(name)
    if standard == _OLDER_PREFIX:
        bits_per_symbol = spectral_efficiency(name)
        return _EB_N0_DB[rate] - _MODEM_MARGIN_DB + 10 * math.log10(bits_per_symbol)
    return _ES_N0_DB[modulation][rate]


def spectral_efficiency(name: str) -> float:
    """Return the useful bits that a waveform carries a symbol.

    EN 302 307-1: (Kbch − 80) / (90·(S + 1)), S slots a frame, no pilots. EN 300 421: 2·r·188/204.

    Raises
    ------
    InputError
        The name is not known; the message names the nearest one.

    Examples
    --------
    >>> round(spectral_efficiency("QPSK 1/2"), 6)
    0.988858
    """
    standard, modulation, rate = _parts(name)
    if standard == _OLDER_PREFIX:
        return 2 * float(Fraction(rate)) * _REED_SOLOMON_RATE
    return (_BCH_BITS[rate] - _HEADER_BITS) / (_SLOT_SYMBOLS * (_SLOTS[modulation] + 1))


def occupied_bandwidth(symbol_rate_mbaud: float, *, roll_off: float) -> float:
    """Return the bandwidth that a carrier occupies, MHz: (1 + roll-off) · symbol rate in Mbaud.

    Examples
    --------
    >>> round(occupied_bandwidth(27.5, roll_off=0.2), 9)
    33.0
    """
    return (1.0 + roll_off) * symbol_rate_mbaud


def _parts(name: str) -> tuple[str, str, str]:
    """Split a known name into the older standard's prefix or nothing, modulation and code rate."""
    if name not in names():
        suggestion = nearest(name)
        hint = f"; did you mean {suggestion!r}?" if suggestion else ""
        raise InputError(
            f"{name!r} is not a waveform of EN 302 307-1 (such as '8PSK 3/4') "
            f"or EN 300 421 (such as 'EN 300 421 QPSK 3/4'){hint}"
        )
    standard = _OLDER_PREFIX if name.startswith(_OLDER_PREFIX) else ""
    modulation, rate = name.removeprefix(standard).split(" ")
    return standard, modulation, rate


def _plain(name: str) -> str:
    """Return letters, digits and the slash of a name, in capitals, for comparing spellings."""
    return "".join(sign for sign in name.upper() if sign.isalnum() or sign == "/")
