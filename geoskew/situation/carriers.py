"""The link of one carrier at one moment, dish aim and weather: from decibels to a `Response`."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any, Final, Literal, NamedTuple

import numpy as np

from geoskew import receiver
from geoskew.geometry import Array
from geoskew.link import Response, carrier_to_noise, inverse, ratio
from geoskew.polarisation import amplitude_sum, power_sum

Moment = Literal["before", "after"]

# Linear into circular or back: 3.01 dB and no discrimination at any setting, as 45° off would give.
MIXED_DEG: Final = 45.0


@dataclass(frozen=True)
class Stand:
    """A moment and where the dish looks.

    ``moment``: whose carriers; ``stays``: after the changeover, but the dish still on the old slot.
    """

    moment: Moment
    stays: bool = False


BEFORE: Final = Stand("before")
UNTOUCHED: Final = Stand("after", stays=True)
REALIGNED: Final = Stand("after")


class Sky(NamedTuple):
    """Attenuation on a path, dB: what the carrier loses, what radiates noise, and the rain alone."""

    total: Array
    radiating: Array
    rain: Array
    depolarisation: Array  # isolation that rain leaves, dB; inf in clear sky


class Neighbours(NamedTuple):
    """Neighbours' power over the wanted carrier as even + cosine·cos 2d + sine·sin 2d."""

    even: Array
    cosine: Array
    sine: Array


class Path(NamedTuple):
    """What of a carrier's link does not depend on the weather, dB."""

    eirp: Array
    free_space: Array
    pointing: Array
    gain: Array


class Link(NamedTuple):
    """Every term of one carrier's link with a perfectly set feed."""

    path: Path
    sky: Sky
    system_noise: Array
    figure_of_merit: Array
    carrier_to_noise: Array


def path(carrier: Any, *, eirp: Array, range_km: Array, off_axis: Array, dish: Any) -> Path:
    """The terms of a carrier's link without weather. `dish(name)` gives a terminal's value at each place."""
    frequency = carrier.frequency_ghz
    aperture = {"diameter_m": dish("dish_m"), "efficiency": dish("efficiency"), "frequency_ghz": frequency}
    return Path(
        eirp=eirp,
        free_space=receiver.free_space_loss(range_km, frequency_ghz=frequency),
        pointing=receiver.wanted_gain_loss(off_axis, **aperture, mask=dish("receive_mask")),
        gain=receiver.antenna_gain(dish("dish_m"), efficiency=dish("efficiency"), frequency_ghz=frequency),
    )


def link(carrier: Any, path: Path, sky: Sky, *, dish: Any) -> Link:
    """The link of a carrier with a perfectly set feed under a sky."""
    noise = receiver.system_noise_temperature(
        sky.radiating,
        noise_figure_db=dish("noise_figure_db"),
        feed_loss_db=dish("feed_loss_db"),
        ground_noise_k=dish("ground_noise_k"),
    )
    merit = receiver.figure_of_merit(
        path.gain, noise, feed_loss_db=dish("feed_loss_db"), radome_loss_db=dish("radome_loss_db")
    )
    c_n = carrier_to_noise(
        path.eirp,
        losses_db=path.free_space + sky.total + path.pointing,
        figure_of_merit_db=merit,
        symbol_rate_mbaud=carrier.symbol_rate_mbaud,
    )
    return Link(path, sky, noise, merit, c_n)


def antenna_leak(carrier: Any, *, satellite_db: Array, dish: Any, off_axis: Array, phasors: bool) -> Array:
    """What the antennas leak at a perfect setting: satellite, and dish and feed off the axis."""
    terminal = receiver.isolation_off_axis(
        off_axis,
        isolation_db=dish("isolation_db"),
        diameter_m=dish("dish_m"),
        frequency_ghz=carrier.frequency_ghz,
    )
    return (amplitude_sum if phasors else power_sum)(satellite_db, terminal)


def with_rain(leak: Array, rain_db: Array, *, phasors: bool) -> Array:
    """The leak of antennas and rain together; at most 1, where both polarisations arrive alike."""
    return np.minimum(leak + (amplitude_sum if phasors else power_sum)(rain_db), 1.0)


def response(
    carrier: Any,
    terms: Link,
    *,
    suits: Array,
    leak: Array,
    phasors: bool,
    fixed: float | None,
    neighbours: Neighbours,
) -> Response:
    """The margin of a carrier as a function of the setting.

    ``adjacent_ci_db`` holds for a perfectly aimed dish, so pointing loss weighs it up; mismatch does
    through the response itself. Rain takes the wanted carrier and its neighbours alike.
    """
    noise = inverse(terms.carrier_to_noise)
    if carrier.adjacent_ci_db is not None:
        noise = noise + inverse(carrier.adjacent_ci_db) * ratio(terms.path.pointing)
    crossed = ratio(carrier.crossed_offset_db) if carrier.crossed else np.zeros(())
    even, cosine, sine = neighbours
    return Response(
        suits=suits,
        noise=noise,
        crossed=crossed,
        leak=leak,
        uplink=inverse(carrier.uplink_cn_db),
        required_db=carrier.required_es_n0_db + carrier.implementation_loss_db,
        phasors=phasors and fixed is None,
        fixed=fixed,
        neighbour_even=even,
        neighbour_cosine=cosine,
        neighbour_sine=sine,
    )
