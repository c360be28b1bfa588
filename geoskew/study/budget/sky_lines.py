"""The lines of the atmosphere: gas in clear sky, or the total attenuation with its contributions."""

from __future__ import annotations

from geoskew.situation.ports import is_linear
from geoskew.study.budget.account import Account
from geoskew.study.budget.bench import Bench


def add_attenuation(account: Account, bench: Bench) -> None:
    """Clear sky: gas alone. Rain: the total of P.618 §2.5, which replaces it."""
    sky, total = bench.situation.sky, bench.terms.sky.total
    if not bench.rain:
        source = "ITU-R P.676-12 Annex 2, median water vapour of P.836-6"
        account.loss("gas", "Gaseous attenuation", total, unit="dB", source=source)
        return
    share = f"{sky.percentage:g} % of an average year"
    account.loss("attenuation", "Total attenuation", total, unit="dB", source=f"ITU-R P.618-14 §2.5, {share}")
    moment, which = bench.case.moment, bench.carrier_number
    parts = sky.contributions(moment, which, [sky.percentage])[0]
    climate = sky.climate(moment, which)
    held = f"{climate.held_percentage:g} % value"
    account.part("rain", "rain", parts.rain, unit="dB", source="ITU-R P.618-14 §2.2.1.1, P.838-3")
    account.part(
        "rain_rate", "rain rate at 0.01 %", climate.rain_rate, unit="mm/h", source="map of ITU-R P.837-7"
    )
    account.part("rain_height", "rain height", climate.rain_height, unit="km", source="map of ITU-R P.839-4")
    account.part(
        "place_height", "height of the place", climate.height, unit="km", source=bench.sources.height()
    )
    linear = is_linear(bench.carrier)
    tilt = ("90° − skew" if bench.carrier.polarisation == "V" else "−skew") if linear else "circular"
    account.part(
        "tilt",
        "tilt τ of the E-vector",
        sky.tilt(moment, which) % 180.0,
        unit="deg",
        source=f"{tilt}, from the horizontal",
    )
    account.part("gas", "gas", parts.gas, unit="dB", source=f"ITU-R P.676-12 Annex 2, {held}")
    account.part("cloud", "cloud", parts.cloud, unit="dB", source=f"ITU-R P.840-8, {held}")
    account.part(
        "scintillation",
        "scintillation",
        parts.scintillation,
        unit="dB",
        source="ITU-R P.618-14 §2.4.1, map of P.453-13",
    )
