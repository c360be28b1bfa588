"""Hours of an average year in which a policy's margin is below zero."""

from __future__ import annotations

from typing import Final

import numpy as np

from geoskew import weather
from geoskew.geometry import Array
from geoskew.situation.carriers import Stand
from geoskew.situation.core import Situation

# The ladder reaches from 0.001 to 5 % of a year; the ends stand for anything below and above.
LEAST_HOURS: Final = weather.HOURS_PER_YEAR * weather.PERCENTAGES[0] / 100.0
MOST_HOURS: Final = weather.HOURS_PER_YEAR * weather.PERCENTAGES[-1] / 100.0


def outage_hours(situation: Situation, stand: Stand, setting: Array) -> Array:
    """Hours a year with a margin below zero at a setting, from the availability curve turned round.

    Returns
    -------
    ndarray
        `LEAST_HOURS` stands for "less than that", `MOST_HOURS` for "more than that", 8 766 for a
        margin that is negative in clear sky. NaN where there is no margin.
    """
    clear = situation.margin(stand, setting, rain=False)
    count = len(situation.carriers(stand.moment))
    least: list[Array] | None = None
    for number in range(count):
        skies = situation.sky.ladder(stand.moment, number, weather.PERCENTAGES)
        margins = [
            situation.response(stand, number, situation.link_under(stand, number, sky)).margin(setting)
            for sky in skies
        ]
        least = margins if least is None else [np.minimum(a, b) for a, b in zip(least, margins, strict=True)]
    ladder = np.stack(np.broadcast_arrays(*(least or [clear])))
    crossing = weather.percentage_where(ladder)
    hours = weather.hours(crossing.percentage)
    hours = np.where(crossing.below, LEAST_HOURS, np.where(crossing.above, MOST_HOURS, hours))
    return np.where(np.isnan(clear), np.nan, np.where(clear < 0.0, weather.HOURS_PER_YEAR, hours))
