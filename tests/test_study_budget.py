"""The link budget line by line: a published budget, the layers, and what each line says."""

from __future__ import annotations

import json
from collections.abc import Callable
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from geoskew import geometry, resources
from geoskew.evaluate import evaluate
from geoskew.places import Places
from geoskew.scenario import load
from geoskew.study.budget import budget, budget_as_text, words
from geoskew.study.spot import values_as_text
from geoskew.weather import Attenuation

C = 299_792_458.0
NEIGHBOURS = """
[[neighbour]]
name = "East"
longitude_deg = 12.5
polarisation = "H"
eirp_dbw = 49.0
tilt_deg = 4.0
[[neighbour]]
name = "West"
longitude_deg = 8.0
polarisation = "V"
eirp_dbw = 51.0
when = "after"
[[neighbour]]
name = "Same slot"
longitude_deg = 10.0
polarisation = "R"
eirp_dbw = 40.0
when = "after"
"""


def scenario(
    folder: Path,
    *,
    eirp: float = 50.0,
    outgoing: str = "tilt_deg = 7.0",
    incoming: str = "",
    polarisation: str = "V",
    frequency: float = 12.0,
    rate: float = 27.5,
    carrier: str = "",
    terminal: str = "",
    lowest: float = 5.0,
    rest: str = "",
) -> Any:
    path = folder / "plan.toml"
    path.write_text(
        f"""
title = "Test"
[outgoing]
name = "Old"
longitude_deg = 10.0
eirp_dbw = {eirp}
{outgoing}
[incoming]
name = "New"
longitude_deg = 10.0
eirp_dbw = {eirp}
{incoming}
[[carrier]]
name = "main"
polarisation = "{polarisation}"
frequency_ghz = {frequency}
symbol_rate_mbaud = {rate}
modcod = "8PSK 3/4"
{carrier}
[terminal]
{terminal}
[region]
bounds_deg = [0.0, 30.0, 20.0, 60.0]
step_deg = 1.0
lowest_elevation_deg = {lowest}
{rest}
""",
        encoding="utf-8",
    )
    return load(path)


def entry(data: dict[str, Any], moment: str, policy: str, sky: str = "clear") -> dict[str, Any]:
    found = [
        one for one in data["budgets"] if (one["moment"], one["policy"], one["sky"]) == (moment, policy, sky)
    ]
    assert len(found) == 1
    return found[0]


def lines(
    data: dict[str, Any], moment: str, policy: str, sky: str = "clear", which: int = 0
) -> dict[str, Any]:
    return {line["key"]: line for line in entry(data, moment, policy, sky)["carriers"][which]["lines"]}


def latitude_at_range(range_km: float) -> float:
    """Latitude on the satellite's meridian from which it is so far away, by bisection."""
    satellite = geometry.satellite_position(10.0)
    low, high = 0.0, 81.0
    for _ in range(80):
        middle = 0.5 * (low + high)
        away = float(geometry.line_of_sight(10.0, middle, 0.0, satellite).range_m) / 1000.0
        low, high = (middle, high) if away < range_km else (low, middle)
    return low


def still_air(monkeypatch: pytest.MonkeyPatch, gas_db: float, rain_db: float = 0.0) -> None:
    """Attenuations as a published budget states them, in place of those of the maps."""

    def ladder(*_: Any, percentages: tuple[float, ...], **__: Any) -> tuple[Attenuation, ...]:
        zero, total = np.zeros(()), np.asarray(gas_db + rain_db)
        parts = (np.asarray(rain_db), np.asarray(gas_db), zero, zero, total, total, np.asarray(rain_db))
        return tuple(Attenuation(one, *parts) for one in percentages)

    monkeypatch.setattr("geoskew.weather.clear_sky_gas", lambda *_: np.asarray(gas_db))
    monkeypatch.setattr("geoskew.weather.ladder", ladder)


# A published budget ---------------------------------------------------------------------------------


def test_downlink_of_a_textbook_line_by_line(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """D. Roddy, Satellite Communications, chapter 12, the tabulated 12 GHz downlink.

    EIRP 48 dBW, free-space loss 206 dB, atmospheric absorption 2 dB, antenna pointing loss 1 dB, receiver
    feeder loss 1 dB, no mismatch of polarisation, G/T 19.5 dB/K without the feeder, −[k] 228.6: C/N0 is
    86.1 dBHz. From memory of the book; the table's own sum closes. The place, the dish and its pointing
    error are chosen by hand formulas so that the inputs are those; every line and the sum come from us.
    Printed to 0.1 dB.
    """
    wavelength, feeder = C / 12e9, 10**0.1
    sky = 275.0 * (1 - 10**-0.2) + 2.7 * 10**-0.2
    noise = (sky + 10.0) / feeder + 290.0 * (1 - 1 / feeder) + 290.0 * (10**0.08 - 1)
    dish = wavelength / np.pi * np.sqrt(10 ** ((19.5 + 10 * np.log10(noise)) / 10) / 0.65)
    still_air(monkeypatch, 2.0)
    range_km = 10 ** ((206.0 - 20 * np.log10(4 * np.pi / wavelength)) / 20) / 1000.0
    terminal = (
        f"dish_m = {dish}\nfeed_loss_db = 1.0\npointing_error_deg = {70 * wavelength / dish / np.sqrt(12)}"
    )
    plan = scenario(tmp_path, eirp=48.0, terminal=terminal, rate=1.0)
    found = lines(budget(plan, Places.of(10.0, latitude_at_range(range_km))), "before", "untouched")
    printed = {
        "eirp": 48.0,
        "free_space": -206.0,
        "gas": -2.0,
        "pointing": -1.0,
        "feed_loss": -1.0,
        "polarisation": 0.0,
        "boltzmann": 228.6,
    }
    for key, value in printed.items():
        assert found[key]["signed_db"] == pytest.approx(value, abs=0.05), key
    assert found["dish_gain"]["signed_db"] + found["noise"]["signed_db"] == pytest.approx(19.5, abs=0.05)
    # Ours is at the LNB input, the book's before the feeder.
    assert found["figure_of_merit"]["value"] == pytest.approx(19.5 - 1.0, abs=0.05)
    assert found["c_n"]["value"] + 60.0 == pytest.approx(86.1, abs=0.05)


def test_uplink_and_intermodulation_of_a_textbook_add_up(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """D. Roddy, Satellite Communications, chapter 12: the three ratios of a whole link.

    C/N 23 dB up, 20 dB down and 24 dB for intermodulation give 17.2 dB together. From memory of the book;
    the sum of powers closes to the 0.1 dB printed. The third ratio stands here as that of adjacent satellites.
    """
    still_air(monkeypatch, 0.1)
    carrier = "crossed = false\nuplink_cn_db = 23.0\nadjacent_ci_db = 24.0"
    place = Places.of(10.0, 40.0)
    first = lines(budget(scenario(tmp_path, carrier=carrier), place), "before", "untouched")
    eirp = 50.0 + 20.0 - first["c_n"]["value"]
    found = lines(budget(scenario(tmp_path, eirp=eirp, carrier=carrier), place), "before", "untouched")
    assert found["c_n"]["value"] == pytest.approx(20.0, abs=1e-6)
    assert found["c_ni"]["value"] == pytest.approx(17.2, abs=0.05)
    # By hand: 10·log10(1 + 10^(2 − 2.3)), then what 24 dB adds to both.
    assert found["uplink"]["value"] == pytest.approx(1.7643, abs=5e-5)
    assert found["adjacent"]["value"] == pytest.approx(
        10 * np.log10(1 + 10**-2.4 / (10**-2.0 + 10**-2.3)), abs=1e-6
    )


def test_clear_and_rainy_downlink_computed_by_hand(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """A 1.2 m dish at 12 GHz and 38 000 km, computed by hand to the digits given.

    From ITU-R P.525, P.618-14 eq. (69) with a medium of 275 K, and textbook formulas. 50 dBW, noise figure
    0.7 dB, feed loss 0.1 dB, ground 10 K, 0.12 dB of gas, 5 dB of rain.
    """
    still_air(monkeypatch, 0.12, 5.0)
    terminal = "dish_m = 1.2\nnoise_figure_db = 0.7\nfeed_loss_db = 0.1"
    plan = scenario(tmp_path, terminal=terminal, rest="[weather]\navailability_percent = 99.9")
    data = budget(plan, Places.of(10.0, latitude_at_range(38_000.0)))
    clear, rain = (lines(data, "before", "untouched", sky) for sky in ("clear", "rain"))
    assert clear["free_space"]["signed_db"] == pytest.approx(-205.6271, abs=5e-5)
    assert clear["dish_gain"]["value"] == pytest.approx(41.703, abs=5e-4)
    assert clear["noise_temperature"]["value"] == pytest.approx(76.984, abs=5e-4)
    assert clear["figure_of_merit"]["value"] == pytest.approx(22.739, abs=1e-3)
    assert clear["c_n"]["value"] == pytest.approx(21.198, abs=1e-3)
    assert rain["noise_temperature"]["value"] == pytest.approx(253.979, abs=5e-4)
    assert clear["c_n"]["value"] - rain["c_n"]["value"] == pytest.approx(10.184, abs=1e-3)


# The layers -----------------------------------------------------------------------------------------


def demo(name: str) -> Callable[[Path], Any]:
    return lambda _: load(resources.demo_scenario(name))


def made(**parts: Any) -> Callable[[Path], Any]:
    return lambda folder: scenario(folder, **parts)


PLANS: dict[str, tuple[Callable[[Path], Any], Places]] = {
    "demo": (demo("southern-cone"), Places.of(-60.6, -33.9)),
    "demo, far south": (demo("southern-cone"), Places.of(-68.3, -54.8, 30.0)),
    "slot change": (demo("slot-change"), Places.of(178.0, -17.0)),
    "neighbours": (
        made(incoming="tilt_deg = -9.0", rest=NEIGHBOURS),
        Places.of(4.0, 47.0),
    ),
    "neighbours, worst phasors": (
        made(rest=NEIGHBOURS + '[decision]\naddition = "phasor"\n[weather]\navailability_percent = 99.9'),
        Places.of(4.0, 47.0),
    ),
    "circular": (made(polarisation="R", rest=NEIGHBOURS), Places.of(4.0, 47.0)),
    "linear into circular": (
        made(incoming='[[incoming.carrier]]\nname = "main"\npolarisation = "L"', rest=NEIGHBOURS),
        Places.of(4.0, 47.0),
    ),
    "other port": (
        made(
            incoming='[[incoming.carrier]]\nname = "main"\npolarisation = "H"', carrier="uplink_cn_db = 22.0"
        ),
        Places.of(np.array([4.0]), np.array([47.0])),
    ),
    "site of a list": (
        made(terminal="radome_loss_db = 0.3", rest="[weather]\navailability_percent = 99.7"),
        Places.of(4.0, 47.0, columns={"dish_m": np.asarray(1.8), "setting_deg": np.asarray(3.0)}),
    ),
}


@pytest.mark.parametrize("name", PLANS)
def test_signed_lines_sum_to_the_margin_and_the_least_is_the_layer(name: str, tmp_path: Path) -> None:
    make, place = PLANS[name]
    plan = make(tmp_path)
    data = budget(plan, place)
    layers = evaluate(plan, place, [one["layer"] for one in data["budgets"]])
    assert len(data["budgets"]) == (12 if plan.weather else 6)
    tables = len(data["budgets"][0]["carriers"]) * (4 if plan.weather else 2)
    assert budget_as_text(data).count("\n= Margin  ") == tables
    for one in data["budgets"]:
        assert one["no_numbers"] is None
        assert one["margin_db"] == pytest.approx(float(layers[one["layer"]].reshape(-1)[0]), abs=1e-9)
        for carrier in one["carriers"]:
            signed = [line["signed_db"] for line in carrier["lines"] if line["role"] == "term"]
            assert sum(signed) == pytest.approx(carrier["margin_db"], abs=1e-9)
            assert carrier["margin_db"] >= one["margin_db"]
        least = next(c for c in one["carriers"] if c["name"] == one["weakest_carrier"])
        assert least["margin_db"] == one["margin_db"]


def test_parts_give_the_term_above_them(tmp_path: Path) -> None:
    data = budget(*(part(tmp_path) if callable(part) else part for part in PLANS["demo"]))
    for one in data["budgets"]:
        for carrier in one["carriers"]:
            of = {line["key"]: line["value"] for line in carrier["lines"]}
            noise = sum(of[f"noise_{part}"] for part in ("sky", "ground", "feed", "lnb"))
            assert noise == pytest.approx(of["noise_temperature"], abs=1e-9)
            assert of["noise"] == pytest.approx(10 * np.log10(noise), abs=1e-9)
            assert of["eirp_level"] + of["eirp_offset"] == pytest.approx(of["eirp"], abs=1e-9)
            merit = of["dish_gain"] - of["feed_loss"] - of["radome_loss"] - of["noise"]
            assert merit == pytest.approx(of["figure_of_merit"], abs=1e-9)
            if one["sky"] == "rain":  # ITU-R P.618-14 §2.5: gas + √((rain + cloud)² + scintillation²)
                total = of["gas"] + np.hypot(of["rain"] + of["cloud"], of["scintillation"])
                assert of["attenuation"] == pytest.approx(total, abs=1e-9)
            # The ratios of the interferers and the thermal C/N add up to C/(N+I) as powers.
            ratios = [of["c_n"], of["uplink_ratio"], of["adjacent_ratio"], of["crossed_ratio"]]
            assert of["c_ni"] == pytest.approx(-10 * np.log10(sum(10 ** (-x / 10) for x in ratios)), abs=1e-9)
            d, x = np.deg2rad(of["angle"]), 10 ** (-of["isolation"] / 10)
            wanted = np.cos(d) ** 2 + x * np.sin(d) ** 2
            assert of["polarisation"] == pytest.approx(-10 * np.log10(wanted), abs=1e-9)
            parts = [of["isolation_satellite"], of["isolation_terminal"]]
            parts += [of["isolation_rain"]] if one["sky"] == "rain" else []
            assert x == pytest.approx(sum(10 ** (-part / 10) for part in parts), rel=1e-9)


def test_lines_stand_in_the_order_of_reading(tmp_path: Path) -> None:
    plan = scenario(tmp_path, carrier="uplink_cn_db = 24.0\nadjacent_ci_db = 20.0", rest=NEIGHBOURS)
    data = budget(plan, Places.of(4.0, 47.0))
    terms = [key for key, line in lines(data, "after", "untouched").items() if line["role"] != "part"]
    assert terms == [
        *("eirp", "free_space", "gas", "pointing", "polarisation", "dish_gain", "feed_loss", "radome_loss"),
        *("noise", "figure_of_merit", "boltzmann", "bandwidth", "c_n", "uplink", "adjacent"),
        *("neighbour_1", "neighbour_2", "neighbour_3", "crossed", "c_ni", "required", "implementation"),
        *("margin", "above_reserve"),
    ]
    before = lines(data, "before", "untouched")
    assert before["neighbour_1"]["name"] == "Neighbour East"
    assert "neighbour_2" not in before, "two neighbours are there only after the changeover"


def test_neighbours_of_unknown_phase_count_in_full_each(tmp_path: Path) -> None:
    """Worst case of several: each at its own worst setting, so that no two cancel."""
    rest = NEIGHBOURS + '[decision]\naddition = "phasor"'
    data = budget(scenario(tmp_path, rest=rest), Places.of(4.0, 47.0))
    power = budget(scenario(tmp_path, rest=NEIGHBOURS), Places.of(4.0, 47.0))
    for key in ("neighbour_1", "neighbour_2", "neighbour_3"):
        for policy in ("untouched", "realigned"):
            worst, plain = (lines(one, "after", policy)[f"{key}_ratio"]["value"] for one in (data, power))
            loss = [lines(one, "after", policy)["polarisation"]["value"] for one in (data, power)]
            assert worst + loss[0] <= plain + loss[1] + 1e-9


# Sources --------------------------------------------------------------------------------------------


def test_sources_tell_scenario_default_list_map_and_standard(tmp_path: Path) -> None:
    plan = scenario(
        tmp_path,
        incoming="[[incoming.carrier]]\nname = 'main'\nsymbol_rate_mbaud = 20.0",
        terminal="feed_loss_db = 0.2",
        rest="[weather]\navailability_percent = 99.9",
    )
    own = {"dish_m": np.asarray(1.2), "efficiency": np.asarray(np.nan)}
    found = lines(budget(plan, Places.of(4.0, 47.0, columns=own)), "after", "untouched", "rain")
    sources = {key: line["source"] for key, line in found.items()}
    assert sources["eirp"] == "scenario: incoming.eirp_dbw"
    assert sources["dish_m"] == "site list: dish_m"
    assert sources["efficiency"] == "default"
    assert sources["feed_loss"] == "scenario: terminal.feed_loss_db"
    assert sources["symbol_rate"] == "scenario: carrier.symbol_rate_mbaud after the changeover"
    assert sources["frequency"] == "scenario: carrier.frequency_ghz"
    assert sources["required"] == "EN 302 307-1 Table 13, 8PSK 3/4"
    assert sources["rain_rate"] == "map of ITU-R P.837-7"
    assert sources["attenuation"] == "ITU-R P.618-14 §2.5, 0.1 % of an average year"
    assert sources["isolation_satellite"] == "default"
    assert "BO.1213-1" in sources["pointing"]
    assert "none" in sources["uplink"]
    assert found["uplink"]["value"] == 0.0


@pytest.mark.parametrize(
    ("name", "moment", "source"),
    [
        ("southern-cone", "before", "contours: eirp-velarin.geojson, field dbw"),
        ("slot-change", "after", "scenario: incoming.beam, gaussian pattern, peak 50.5 dBW"),
    ],
)
def test_source_of_the_power_is_the_footprint(name: str, moment: str, source: str) -> None:
    place = Places.of(-60.6, -33.9) if name == "southern-cone" else Places.of(178.0, -17.0)
    found = lines(budget(load(resources.demo_scenario(name)), place), moment, "shared")
    assert source in (found["eirp"]["source"], found.get("eirp_level", found["eirp"])["source"])


# Places without numbers -----------------------------------------------------------------------------


def test_a_satellite_below_the_lowest_elevation_has_words_instead_of_numbers(tmp_path: Path) -> None:
    plan = scenario(tmp_path, lowest=40.0)
    data = budget(plan, Places.of(4.0, 47.0))
    assert [one["margin_db"] for one in data["budgets"]] == [None] * 6
    assert all("below the lowest usable 40°" in one["no_numbers"] for one in data["budgets"])
    assert data["satellites"]["before"]["elevation_deg"] == pytest.approx(35.6, abs=0.5)
    assert data["satellites"]["before"]["skew_deg"] is None
    text = budget_as_text(json.loads(json.dumps(data, allow_nan=False)))
    assert "below the lowest usable 40°" in text
    assert "EIRP" not in text


def test_behind_the_horizon_is_said() -> None:
    data = budget(load(resources.demo_scenario("slot-change")), Places.of(-60.0, 10.0))
    assert "below the horizon" in budget_as_text(data)
    assert data["decision"]["action"] == "no-sight"


def test_outside_of_the_coverage_is_said() -> None:
    plan = load(resources.demo_scenario("southern-cone"))
    place = Places.of(-66.0, 35.0)
    assert np.isnan(evaluate(plan, place, ["eirp_after"])["eirp_after"])
    data = budget(plan, place)
    realigned = entry(data, "after", "realigned", "rain")
    assert realigned["margin_db"] is None
    assert realigned["carriers"] == []
    assert "outside of the coverage of Osmara" in realigned["no_numbers"]
    assert data["satellites"]["after"]["azimuth_deg"] is not None, "directions hold outside of the coverage"
    json.dumps(data, allow_nan=False)


def test_more_places_than_one_are_refused(tmp_path: Path) -> None:
    with pytest.raises(ValueError, match="one place, not for 2"):
        budget(scenario(tmp_path), Places.of([4.0, 5.0], [47.0, 47.0]))


# Text -----------------------------------------------------------------------------------------------


def test_text_holds_every_line_within_its_width() -> None:
    data = budget(load(resources.demo_scenario("southern-cone")), Places.of(-60.6, -33.9))
    text = budget_as_text(data)
    # A long key of the scenario is not broken; it may stand out by a few characters.
    assert max(map(len, text.splitlines())) <= 105
    for one in data["budgets"]:
        for carrier in one["carriers"]:
            for line in carrier["lines"]:
                assert line["name"] in text
        assert f"{one['margin_db']:.2f}" in text
    assert text.count("= Margin above the reserve") == 8, "two moments, two skies, two carriers"


def test_turns_name_both_standing_places() -> None:
    data = budget(load(resources.demo_scenario("southern-cone")), Places.of(-60.6, -33.9))
    turn = data["feed"]["turn_shared"]
    assert turn < 0.0
    text = budget_as_text(data)
    assert f"behind the dish looking towards the satellite: {-turn:.2f}° counter-clockwise" in text
    assert f"in front of the dish looking into it: {-turn:.2f}° clockwise" in text


def test_words_of_a_window_name_both_standing_places() -> None:
    behind, front = words.window(-3.0, 4.0).split("; ")
    assert behind.endswith("3.00° counter-clockwise to 4.00° clockwise")
    assert front.endswith("3.00° clockwise to 4.00° counter-clockwise")
    assert words.window(-90.0, 90.0) == "every setting is good"
    assert words.window(None, None).startswith("none")


@pytest.mark.parametrize(
    ("hours", "shown"), [(0.08766, "< 0.09"), (438.3, "> 438"), (8766.0, "8766"), (4.8, "4.80")]
)
def test_outage_beyond_the_range_is_a_side_not_a_number(hours: float, shown: str) -> None:
    assert words.outage(hours) == shown
    assert values_as_text({"outage_before": hours}).split() == ["outage_before", *shown.split(), "hours/year"]


def test_outage_stands_where_a_layer_has_it() -> None:
    plan, place = load(resources.demo_scenario("southern-cone")), Places.of(-60.6, -33.9)
    data = budget(plan, place)
    shared = entry(data, "after", "shared", "rain")
    assert shared["outage_hours"] == float(
        evaluate(plan, place, ["outage_shared_after"])["outage_shared_after"]
    )
    assert "outage_hours" not in entry(data, "after", "reversed", "rain")
