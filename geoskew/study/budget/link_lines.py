"""The lines of one carrier's budget: from the satellite's power to the C/N, and on to the margin."""

from __future__ import annotations

import numpy as np

from geoskew import receiver
from geoskew.constants import BOLTZMANN_DB, MEDIUM_TEMPERATURE_K, REFERENCE_TEMPERATURE_K
from geoskew.link import inverse
from geoskew.study.budget.account import Account, Line, number
from geoskew.study.budget.bench import Bench
from geoskew.study.budget.interference_lines import add_interference
from geoskew.study.budget.sky_lines import add_attenuation
from geoskew.study.budget.sources import DEFAULT


def lines_of(bench: Bench) -> list[Line]:
    """All lines of one carrier, in the order of reading. Their signed terms sum to its margin."""
    account = Account()
    _add_path(account, bench)
    _add_polarisation(account, bench)
    _add_receiver(account, bench)
    _, wanted, _ = bench.response.at(bench.setting)
    thermal = number(inverse(bench.terms.carrier_to_noise) / wanted)
    add_interference(account, bench, thermal)
    account.sum("c_ni", "C/(N+I)", unit="dB", source="all of the above")
    carrier = bench.carrier
    required = bench.sources.required(bench.case.moment, bench.carrier_number)
    account.loss("required", "Required Es/N0", carrier.required_es_n0_db, unit="dB", source=required)
    account.loss(
        "implementation",
        "Implementation loss",
        carrier.implementation_loss_db,
        unit="dB",
        source=bench.of_carrier("implementation_loss_db"),
    )
    account.sum("margin", "Margin", unit="dB", source="all of the above")
    decision = bench.situation.scenario.decision
    given = "reserve_db" in decision.model_fields_set
    reserve = "scenario: decision.reserve_db" if given else DEFAULT
    account.part("reserve", "reserve to keep", decision.reserve_db, unit="dB", source=reserve)
    account.sum(
        "above_reserve",
        "Margin above the reserve",
        account.total - decision.reserve_db,
        unit="dB",
        source="margin less reserve",
    )
    return account.lines


def _add_path(account: Account, bench: Bench) -> None:
    """Power, free space, attenuation and pointing."""
    situation, sources, moment = bench.situation, bench.sources, bench.case.moment
    view, path = situation.view(moment), bench.terms.path
    offset = view.satellite.eirp_offset_db
    level = sources.eirp(moment)
    account.gain(
        "eirp", "EIRP", path.eirp, unit="dBW", source=level if offset == 0.0 else "level and operating point"
    )
    if offset != 0.0:
        account.part("eirp_level", "level", number(path.eirp) - offset, unit="dBW", source=level)
        account.part(
            "eirp_offset",
            "operating point",
            offset,
            unit="dB",
            source=sources.satellite(moment, "eirp_offset_db"),
        )
    account.loss("free_space", "Free-space loss", path.free_space, unit="dB", source="ITU-R P.525, (4πd/λ)²")
    account.part("range", "range", view.sight.range_m / 1000.0, unit="km", source="geometry, WGS 84")
    account.part(
        "frequency",
        "frequency",
        bench.carrier.frequency_ghz,
        unit="GHz",
        source=bench.of_carrier("frequency_ghz"),
    )
    add_attenuation(account, bench)
    _add_pointing(account, bench)


def _add_pointing(account: Account, bench: Bench) -> None:
    situation, sources, stays = bench.situation, bench.sources, bench.case.stand.stays
    off_axis = situation.off_axis(bench.case.stand)
    dish = {"diameter_m": situation.terminal("dish_m"), "frequency_ghz": bench.carrier.frequency_ghz}
    lobe = number(receiver.pointing_loss(off_axis, **dish))
    loss = number(bench.terms.path.pointing)
    mask = sources.mask(bench.carrier.frequency_ghz)
    by = f"12·(θ/θ₃)², main lobe of {mask}" if loss >= lobe - 1e-9 else f"{mask}, beyond the main lobe"
    account.loss("pointing", "Pointing loss", loss, unit="dB", source=by)
    account.part(
        "pointing_error",
        "pointing error",
        situation.terminal("pointing_error_deg"),
        unit="deg",
        source=sources.terminal("pointing_error_deg"),
    )
    account.part(
        "separation",
        "satellite off the aim",
        situation.separation if stays else 0.0,
        unit="deg",
        source="dish left as it is" if stays else "dish aimed at it",
    )
    width = receiver.half_power_beamwidth(**dish)
    account.part("beamwidth", "half-power width θ₃", width, unit="deg", source="70·λ/D")


def _add_polarisation(account: Account, bench: Bench) -> None:
    """Polarisation loss of the wanted carrier: cos²d + x·sin²d, or the worst phasors'."""
    response = bench.response
    d, wanted, _ = response.at(bench.setting)
    phasors = response.phasors
    formula = "(|cos d| − a·|sin d|)², worst phasors" if phasors else "cos²d + x·sin²d"
    with np.errstate(divide="ignore"):
        loss = -10.0 * np.log10(wanted)
        isolation = -(20.0 if phasors else 10.0) * np.log10(response.leak)
    account.loss("polarisation", "Polarisation loss", loss, unit="dB", source=formula)
    if response.fixed is None:
        account.part("setting", "feed setting", bench.setting, unit="deg", source=_setting_source(bench))
        account.part("suits", "setting that suits", response.suits, unit="deg", source=_suits_source(bench))
        angle = "their difference, folded"
    else:
        angle = (
            "circular at any setting"
            if response.fixed == 0.0
            else "linear into circular or back, at any setting"
        )
    account.part("angle", "angle d", np.rad2deg(d), unit="deg", source=angle)
    sums = "a: amplitude sum" if phasors else "x: power sum"
    account.part(
        "isolation", "isolation, perfectly set", isolation, unit="dB", source=f"{sums} of those below"
    )


def _setting_source(bench: Bench) -> str:
    policy, sources = bench.case.policy, bench.sources
    present = "site list: setting_deg" if sources.own("setting_deg") else "aligned to the old satellite"
    texts = {
        "untouched": present,
        "shared": "shared setting",
        "reversed": "present − turn to the shared one",
        "realigned": "realigned setting",
    }
    return texts[policy]


def _suits_source(bench: Bench) -> str:
    if bench.case.moment == "before":
        return "skew_before"
    turned = number(bench.situation.port_offset[bench.carrier_number]) != 0.0
    name = "seen_after" if bench.case.stand.stays else "skew_after"
    return f"{name} + 90°, the old port" if turned else name


def _add_receiver(account: Account, bench: Bench) -> None:
    """Dish, losses, noise, G/T, Boltzmann's constant and the noise bandwidth, down to the C/N."""
    situation, sources, terms = bench.situation, bench.sources, bench.terms
    account.gain("dish_gain", "Dish gain", terms.path.gain, unit="dBi", source="η·(π·D/λ)²")
    for key, name, unit in (("dish_m", "diameter", "m"), ("efficiency", "efficiency", "")):
        account.part(key, name, situation.terminal(key), unit=unit, source=sources.terminal(key))
    for key, name in (("feed_loss_db", "Feed loss"), ("radome_loss_db", "Radome loss")):
        account.loss(
            key.removesuffix("_db"), name, situation.terminal(key), unit="dB", source=sources.terminal(key)
        )
    account.loss(
        "noise",
        "System noise",
        10.0 * np.log10(terms.system_noise),
        unit="dBK",
        source="10·log10 T at the LNB input",
    )
    _add_noise_parts(account, bench)
    account.sum(
        "figure_of_merit", "G/T", terms.figure_of_merit, unit="dB/K", source="gain less losses less noise"
    )
    account.gain("boltzmann", "Boltzmann, −10·log10 k", BOLTZMANN_DB, unit="dB", source="constant, SI")
    rate = bench.carrier.symbol_rate_mbaud
    account.loss(
        "bandwidth",
        "Noise bandwidth",
        60.0 + 10.0 * np.log10(rate),
        unit="dBHz",
        source="10·log10(rate in Bd)",
    )
    account.part(
        "symbol_rate", "symbol rate", rate, unit="Mbaud", source=bench.of_carrier("symbol_rate_mbaud")
    )
    account.sum("c_n", "C/N = Es/N0, thermal", unit="dB", source="all of the above")


def _add_noise_parts(account: Account, bench: Bench) -> None:
    """Every part as it counts at the LNB input: they sum to the system noise temperature."""
    situation, sources = bench.situation, bench.sources
    passed = 10.0 ** (-number(situation.terminal("feed_loss_db")) / 10.0)
    sky = number(receiver.sky_noise(bench.terms.sky.radiating))
    account.part(
        "noise_sky",
        "sky",
        sky * passed,
        unit="K",
        source=f"ITU-R P.618-14 §3, medium {MEDIUM_TEMPERATURE_K:g} K",
    )
    ground = number(situation.terminal("ground_noise_k"))
    account.part(
        "noise_ground", "ground", ground * passed, unit="K", source=sources.terminal("ground_noise_k")
    )
    account.part(
        "noise_feed", "feed loss", REFERENCE_TEMPERATURE_K * (1.0 - passed), unit="K", source="290·(1 − 1/L)"
    )
    figure = number(situation.terminal("noise_figure_db"))
    account.part(
        "noise_lnb",
        "LNB",
        receiver.noise_figure_temperature(figure),
        unit="K",
        source=f"noise figure {figure:g} dB, {sources.terminal('noise_figure_db')}",
    )
    account.part("noise_temperature", "in all", bench.terms.system_noise, unit="K", source="sum of the four")
