"""Layers of the link: EIRP, attenuation at the stated availability, C/N with a perfectly set feed."""

from __future__ import annotations

import numpy as np

from geoskew.geometry import Array
from geoskew.layers import layer
from geoskew.situation import Situation
from geoskew.situation.carriers import BEFORE, REALIGNED, Stand


def _of_weakest(situation: Situation, stand: Stand, field: str) -> Array:
    numbers = range(len(situation.carriers(stand.moment)))
    values = [
        situation.path(stand, number).eirp
        if field == "eirp"
        else situation.link(stand, number, rain=False).carrier_to_noise
        for number in numbers
    ]
    return situation.of_weakest(stand.moment, values)


def _rain(situation: Situation, stand: Stand) -> Array:
    numbers = range(len(situation.carriers(stand.moment)))
    totals = [situation.sky.path(stand.moment, number, rain=True).total for number in numbers]
    return situation.of_weakest(stand.moment, totals)


@layer(
    unit="dBW",
    description="EIRP of the old satellite towards the place",
    ramp="level",
    limits=(38.0, 56.0),
    contour_step=1.0,
    of=("before",),
)
def eirp_before(situation: Situation) -> Array:
    return np.asarray(_of_weakest(situation, BEFORE, "eirp"))


@layer(
    unit="dBW",
    description="EIRP of the new satellite towards the place",
    ramp="level",
    limits=(38.0, 56.0),
    contour_step=1.0,
    of=("after",),
)
def eirp_after(situation: Situation) -> Array:
    return np.asarray(_of_weakest(situation, REALIGNED, "eirp"))


@layer(
    unit="dB",
    description="Total attenuation towards the old satellite at the stated availability, ITU-R P.618-14",
    ramp="loss",
    limits=(0.0, 12.0),
    contour_step=0.5,
    needs=("weather",),
    of=("before",),
)
def rain_before(situation: Situation) -> Array:
    return _rain(situation, BEFORE)


@layer(
    unit="dB",
    description="Total attenuation towards the new satellite at the stated availability, ITU-R P.618-14",
    ramp="loss",
    limits=(0.0, 12.0),
    contour_step=0.5,
    needs=("weather",),
    of=("after",),
)
def rain_after(situation: Situation) -> Array:
    return _rain(situation, REALIGNED)


@layer(
    unit="dB",
    description="C/N before the changeover in clear sky with a perfectly set feed",
    ramp="level",
    limits=(0.0, 24.0),
    contour_step=1.0,
    of=("before",),
)
def cn_before(situation: Situation) -> Array:
    return _of_weakest(situation, BEFORE, "carrier_to_noise")


@layer(
    unit="dB",
    description="C/N after the changeover in clear sky with dish and feed perfectly set",
    ramp="level",
    limits=(0.0, 24.0),
    contour_step=1.0,
    of=("after",),
)
def cn_after(situation: Situation) -> Array:
    return _of_weakest(situation, REALIGNED, "carrier_to_noise")
