"""Thresholds, efficiencies and bandwidths against the tables of the standards."""

from __future__ import annotations

import csv
from pathlib import Path

import pytest

from geoskew import waveform
from geoskew.errors import InputError

REFERENCE = Path(__file__).parent / "reference" / "waveform.csv"
# EN 300 421: the modem margin that its figures include and ours do not.
MODEM_MARGIN_DB = 0.8


def rows(quantity: str) -> list[tuple[str, float, float]]:
    """Return name, expected value and half of the last printed digit."""
    with REFERENCE.open(encoding="utf-8") as stream:
        table = csv.DictReader(line for line in stream if not line.startswith("#"))
        return [
            (row["name"], float(row["expected"]), 0.5 * 10.0 ** -int(row["digits"]))
            for row in table
            if row["quantity"] == quantity
        ]


@pytest.mark.parametrize(("name", "expected", "tolerance"), rows("es-n0"))
def test_thresholds_are_those_of_table_13(name: str, expected: float, tolerance: float) -> None:
    assert waveform.required_es_n0(name) == pytest.approx(expected, abs=tolerance)


@pytest.mark.parametrize(("name", "expected", "tolerance"), rows("es-n0-with-modem-margin"))
def test_older_thresholds_are_the_standard_s_less_its_modem_margin(
    name: str, expected: float, tolerance: float
) -> None:
    assert waveform.required_es_n0(name) + MODEM_MARGIN_DB == pytest.approx(expected, abs=tolerance + 1e-12)


@pytest.mark.parametrize(("name", "expected", "tolerance"), rows("eb-n0-with-modem-margin"))
def test_older_thresholds_per_useful_bit(name: str, expected: float, tolerance: float) -> None:
    numerator, denominator = name.split(" ")[-1].split("/")
    useful_bits = 2 * int(numerator) / int(denominator) * 188 / 204
    linear = 10 ** (waveform.required_es_n0(name) / 10) / useful_bits
    assert linear == pytest.approx(10 ** ((expected - MODEM_MARGIN_DB) / 10), rel=1e-9)


@pytest.mark.parametrize(("name", "expected", "tolerance"), rows("efficiency"))
def test_efficiency_is_that_of_the_standard(name: str, expected: float, tolerance: float) -> None:
    assert waveform.spectral_efficiency(name) == pytest.approx(expected, abs=tolerance)


@pytest.mark.parametrize(("name", "expected", "tolerance"), rows("occupied-bandwidth"))
def test_occupied_bandwidth(name: str, expected: float, tolerance: float) -> None:
    rate, _, _, roll_off = name.split(" ")
    assert waveform.occupied_bandwidth(float(rate), roll_off=float(roll_off)) == pytest.approx(
        expected, abs=tolerance
    )


def test_names_are_exactly_those_of_both_tables() -> None:
    printed = [name for quantity in ("es-n0", "es-n0-with-modem-margin") for name, _, _ in rows(quantity)]
    assert sorted(waveform.names()) == sorted(printed)
    assert len(set(waveform.names())) == 28 + 5


def test_a_faster_mode_of_the_same_modulation_needs_more() -> None:
    for prefix in ("QPSK", "8PSK", "16APSK", "32APSK", "EN 300 421 QPSK"):
        known = [name for name in waveform.names() if name.rpartition(" ")[0] == prefix]
        by_rate = sorted(known, key=waveform.spectral_efficiency)
        thresholds = [waveform.required_es_n0(name) for name in by_rate]
        assert thresholds == sorted(thresholds)
        assert len(set(thresholds)) == len(known)


def test_no_threshold_is_beyond_the_channel_s_capacity() -> None:
    """Shannon: Es/N0 >= 2^efficiency - 1."""
    for name in waveform.names():
        least = 2 ** waveform.spectral_efficiency(name) - 1
        assert 10 ** (waveform.required_es_n0(name) / 10) > least, name


@pytest.mark.parametrize(
    ("wrong", "meant"),
    [
        ("8psk 3/4", "8PSK 3/4"),
        ("8PSK-3/4", "8PSK 3/4"),
        ("QPSK3/4", "QPSK 3/4"),
        ("EN300421 QPSK 7/8", "EN 300 421 QPSK 7/8"),
        ("QPSK 7/9", "QPSK"),
    ],
)
def test_an_unknown_name_is_refused_with_the_nearest(wrong: str, meant: str) -> None:
    with pytest.raises(InputError, match="did you mean") as caught:
        waveform.required_es_n0(wrong)
    assert repr(wrong) in str(caught.value)
    assert meant in str(caught.value)


def test_a_name_like_nothing_is_refused_without_a_guess() -> None:
    with pytest.raises(InputError, match="is not a waveform of EN 302 307-1") as caught:
        waveform.spectral_efficiency("?")
    assert "did you mean" not in str(caught.value)
