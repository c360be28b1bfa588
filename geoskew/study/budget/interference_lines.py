"""The lines of what disturbs: each as the dB that it takes off when it is added to what stands above it."""

from __future__ import annotations

from typing import Final

import numpy as np

from geoskew import link, receiver
from geoskew.situation.neighbours import each_neighbour
from geoskew.study.budget.account import Account, number
from geoskew.study.budget.bench import Bench

# The order matters for what each takes off, though not for the sum.
ORDER: Final = (
    "uplink, adjacent satellites as one ratio, each neighbour in the scenario's order, crossed carrier"
)


def add_interference(account: Account, bench: Bench, thermal: float) -> None:
    """Take off what each interferer adds to the noise, in the stated order.

    `thermal` is the thermal noise over the wanted carrier as it is received, a ratio.
    """
    carrier, response = bench.carrier, bench.response
    d, wanted, crossed = response.at(bench.setting)
    taken = _Taken(account, thermal)
    uplink = number(response.uplink)
    taken.add(
        "uplink",
        "Uplink",
        uplink,
        source=_given(bench, "uplink_cn_db"),
        ratio=("C/N of the uplink", "at any setting and aim"),
    )
    pointing = number(link.ratio(bench.terms.path.pointing))
    adjacent = number(link.inverse(carrier.adjacent_ci_db) * pointing / wanted)
    taken.add(
        "adjacent",
        "Adjacent satellites",
        adjacent,
        source=_given(bench, "adjacent_ci_db"),
        ratio=("C/I as aimed and set", "less mismatch and pointing"),
    )
    neighbours = each_neighbour(bench.situation, bench.case.stand, bench.carrier_number)
    for count, (neighbour, (even, cosine, sine)) in enumerate(neighbours, start=1):
        power = number((even + cosine * np.cos(2.0 * d) + sine * np.sin(2.0 * d)) / wanted)
        mask = bench.sources.mask(carrier.frequency_ghz)
        taken.add(
            f"neighbour_{count}",
            f"Neighbour {neighbour.name}",
            power,
            source=f"scenario: neighbour, {mask}",
            ratio=("C/I", "at this setting and aim"),
        )
    source = "other polarisation, same satellite" if carrier.crossed else "scenario: carrier.crossed = false"
    power = number(response.crossed * crossed / wanted)
    taken.add("crossed", "Crossed carrier", power, source=source, ratio=("C/I", "at this setting and aim"))
    if carrier.crossed:
        account.part(
            "crossed_offset",
            "sent, over the wanted",
            carrier.crossed_offset_db,
            unit="dB",
            source=bench.of_carrier("crossed_offset_db"),
        )
        _add_isolations(account, bench)


class _Taken:
    """Adds one power after another to the noise and books the dB that each takes off."""

    def __init__(self, account: Account, thermal: float) -> None:
        self._account, self._sum = account, thermal

    def add(self, key: str, name: str, power: float, *, source: str, ratio: tuple[str, str]) -> None:
        """Book an interferer by its power over the wanted carrier's; `ratio` names that and says of it."""
        total = self._sum + power
        with np.errstate(divide="ignore", invalid="ignore"):
            loss = 10.0 * np.log10(np.float64(total) / self._sum)
            over = -10.0 * np.log10(np.float64(power))
        self._account.loss(key, name, loss, unit="dB", source=source)
        if power > 0.0:
            self._account.part(f"{key}_ratio", ratio[0], over, unit="dB", source=ratio[1])
        self._sum = total


def _given(bench: Bench, key: str) -> str:
    if getattr(bench.carrier, key) is None:
        return f"no {key} given: none"
    return f"{bench.of_carrier(key)} = {getattr(bench.carrier, key):g}"


def _add_isolations(account: Account, bench: Bench) -> None:
    """The three isolations that remain with a perfectly set feed."""
    situation, moment = bench.situation, bench.case.moment
    view = situation.view(moment)
    pattern = number(view.isolation) < view.satellite.isolation_db
    satellite = (
        "the beam's cross-polar pattern" if pattern else bench.sources.satellite(moment, "isolation_db")
    )
    account.part("isolation_satellite", "satellite's isolation", view.isolation, unit="dB", source=satellite)
    own = bench.sources.terminal("isolation_db")
    terminal = receiver.isolation_off_axis(
        situation.off_axis(bench.case.stand),
        isolation_db=situation.terminal("isolation_db"),
        diameter_m=situation.terminal("dish_m"),
        frequency_ghz=bench.carrier.frequency_ghz,
    )
    kept = number(terminal) >= number(situation.terminal("isolation_db"))
    account.part(
        "isolation_terminal",
        "dish and feed isolation",
        terminal,
        unit="dB",
        source=own if kept else f"{own}, off its axis as ITU-R BO.1213-1",
    )
    if bench.rain:
        account.part(
            "isolation_rain",
            "isolation left by rain",
            bench.terms.sky.depolarisation,
            unit="dB",
            source="ITU-R P.618-14 §4.1",
        )
