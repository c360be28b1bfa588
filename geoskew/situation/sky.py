"""Attenuation on each path, in clear sky and for a percentage of an average year."""

from __future__ import annotations

from collections.abc import Sequence
from functools import cached_property
from typing import TYPE_CHECKING, Final

import numpy as np

from geoskew import weather
from geoskew.geometry import Array
from geoskew.situation.carriers import Moment, Sky

if TYPE_CHECKING:
    from geoskew.situation.links import Links

# Below this the recommendations' slant paths do not hold; a lower satellite is taken to stand there.
LOWEST_PATH_DEG: Final = 5.0
# P.618-14 §4.1 predicts depolarisation from here on; below, rain leaves the polarisations apart.
LOWEST_DEPOLARISATION_GHZ: Final = 4.0
# Tilt of the E-vector from the horizontal that circular polarisation counts as (P.838, P.618).
CIRCULAR_TILT_DEG: Final = 45.0


class SkyModel:
    """The weather over a situation's places; maps are looked up once, each path is computed once.

    Clear sky is gas alone, with or without ``[weather]``. Heights that are not known fall back to the
    topography of P.1511 here, and only here.
    """

    def __init__(self, situation: Links) -> None:
        self._situation = situation
        self._paths: dict[tuple[Moment, int, bool], Sky] = {}

    @cached_property
    def _climates(self) -> dict[float, weather.Climate]:
        situation = self._situation
        both = (*situation.scenario.carriers_before, *situation.scenario.carriers_after)
        frequencies = sorted({carrier.frequency_ghz for carrier in both})
        places = situation.places
        found = weather.climates(
            places.longitude,
            places.latitude,
            places.height,
            frequencies_ghz=frequencies,
            percentage=self.percentage,
        )
        return dict(zip(frequencies, found, strict=True))

    @property
    def percentage(self) -> float:
        """Percentage of an average year in which the stated availability is not kept."""
        stated = self._situation.scenario.weather
        # Rounded so that 100 − 99.99 is 0.01, not a hair above a range's end.
        return weather.HELD_PERCENTAGE if stated is None else round(100.0 - stated.availability_percent, 9)

    def path(self, moment: Moment, number: int, *, rain: bool) -> Sky:
        """Attenuation of one carrier's path: in clear sky, or as the availability states."""
        key = (moment, number, rain)
        if key not in self._paths:
            self._paths[key] = (
                self.ladder(moment, number, [self.percentage])[0] if rain else self._clear(moment, number)
            )
        return self._paths[key]

    def _elevation(self, moment: Moment) -> Array:
        return np.maximum(self._situation.view(moment).elevation, LOWEST_PATH_DEG)

    def _clear(self, moment: Moment, number: int) -> Sky:
        gas = weather.clear_sky_gas(self.climate(moment, number), self._elevation(moment))
        return Sky(total=gas, radiating=gas, rain=np.zeros(()), depolarisation=np.asarray(np.inf))

    def tilt(self, moment: Moment, number: int) -> Array:
        """Tilt τ of the E-vector from the local horizontal, degrees: 90 − skew for V, −skew for H."""
        polarisation = self._situation.carriers(moment)[number].polarisation
        if polarisation not in ("V", "H"):
            return np.asarray(CIRCULAR_TILT_DEG)
        skew = self._situation.view(moment).skew
        return 90.0 - skew if polarisation == "V" else -skew

    def climate(self, moment: Moment, number: int) -> weather.Climate:
        """What the maps say of the places, for one carrier's frequency."""
        return self._climates[self._situation.carriers(moment)[number].frequency_ghz]

    def contributions(
        self, moment: Moment, number: int, percentages: Sequence[float]
    ) -> tuple[weather.Attenuation, ...]:
        """Rain, gas, cloud and scintillation apart, for each of several percentages of an average year."""
        return weather.ladder(
            self.climate(moment, number),
            self._elevation(moment),
            self.tilt(moment, number),
            percentages=percentages,
            diameter_m=self._situation.terminal("dish_m"),
            efficiency=self._situation.terminal("efficiency"),
        )

    def ladder(self, moment: Moment, number: int, percentages: Sequence[float]) -> list[Sky]:
        """Attenuation exceeded for each of several percentages of an average year."""
        carrier = self._situation.carriers(moment)[number]
        elevation, tilt = self._elevation(moment), self.tilt(moment, number)
        return [
            Sky(
                total=one.total,
                radiating=one.total_without_scintillation,
                rain=one.rain,
                depolarisation=self._depolarisation(one, elevation, tilt, carrier.frequency_ghz),
            )
            for one in self.contributions(moment, number, percentages)
        ]

    @staticmethod
    def _depolarisation(
        one: weather.Attenuation, elevation: Array, tilt: Array, frequency_ghz: float
    ) -> Array:
        if frequency_ghz < LOWEST_DEPOLARISATION_GHZ:
            return np.asarray(np.inf)
        return weather.discrimination(
            one.depolarising_rain, elevation, tilt, frequency_ghz=frequency_ghz, percentage=one.percentage
        )
