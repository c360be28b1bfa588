"""From decibels of a link to a margin as a function of the feed's setting, and back.

With d the angle between a setting and the one that suits, everything that depends on the setting is
a constant plus a multiple of cos 2(setting − suits) (and of the sine where a neighbour's carrier is
polarised otherwise). So the margin has one best setting, falls steadily away from it up to 90° off,
and the settings that keep a given margin are one arc in closed form. `Response` holds those
constants for one carrier at one moment; `policies` works on several of them.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.typing import ArrayLike, NDArray

from geoskew.angles import fold
from geoskew.constants import BOLTZMANN_DB

Array = NDArray[np.float64]

# A half-width of 90° or more: every setting is good. Below 0: none is.
WHOLE_CIRCLE: Final = 90.0
EMPTY_ARC: Final = -1.0

# Worst phasors may leave nothing of the wanted carrier; −120 dB stands for that: every margin is a number.
LEAST_WANTED: Final = 1e-12


def carrier_to_noise(
    eirp_dbw: ArrayLike, *, losses_db: ArrayLike, figure_of_merit_db: ArrayLike, symbol_rate_mbaud: ArrayLike
) -> Array:
    """C/N in the symbol-rate bandwidth, dB: EIRP − losses + G/T + 228.599 − 10·log10(symbol rate).

    Parameters
    ----------
    eirp_dbw : array_like
        dBW towards the place; NaN outside the coverage gives NaN.
    losses_db : array_like
        Free space, gas or rain, and pointing, dB.
    figure_of_merit_db : array_like
        G/T, dB/K.
    symbol_rate_mbaud : array_like
        Mbaud. The noise bandwidth is the symbol rate, so this is Es/N0 as well.
    """
    rate_db = 60.0 + 10.0 * np.log10(np.asarray(symbol_rate_mbaud, dtype=np.float64))
    eirp, losses, merit = (
        np.asarray(term, dtype=np.float64) for term in (eirp_dbw, losses_db, figure_of_merit_db)
    )
    return np.asarray(eirp - losses + merit + BOLTZMANN_DB - rate_db)


def ratio(decibels: ArrayLike) -> Array:
    """10^(dB/10)."""
    return np.asarray(10.0 ** (np.asarray(decibels, dtype=np.float64) / 10.0))


def inverse(decibels: ArrayLike | None) -> Array:
    """The reciprocal ratio of a C/I or C/N in dB; None: no such noise, so 0."""
    return np.zeros(()) if decibels is None else ratio(-np.asarray(decibels, dtype=np.float64))


@dataclass(frozen=True)
class Response:
    """How one carrier's margin depends on the setting: at one moment, dish aim and weather.

    N/C(setting) = uplink + (noise + crossed·X + Σ neighbours) / W, where W and X are the factors on
    the wanted and the crossed carrier. All ratios are relative to the wanted carrier in a perfectly
    set feed. Every array broadcasts over the places.

    Attributes
    ----------
    suits : ndarray
        The setting that suits, degrees; NaN where the satellite serves nobody.
    noise : ndarray
        Thermal noise and neighbours given as one ratio, over the wanted carrier.
    crossed : ndarray
        Crossed carrier's power over the wanted one's; 0 where it is empty.
    leak : ndarray
        x (power sum of isolations), or a (sum of amplitudes) with ``phasors``.
    uplink : ndarray
        Noise over carrier at the satellite.
    required_db : float
        Required Es/N0 and implementation loss.
    fixed : float or None
        For circular polarisation: the angle d that holds at any setting (0 for circular into
        circular, 45 for linear into circular or back). None: d follows the setting.
    neighbour_even, neighbour_cosine, neighbour_sine : ndarray
        Neighbours' power over the wanted carrier: even + cosine·cos 2d + sine·sin 2d.
    """

    suits: Array
    noise: Array
    crossed: Array
    leak: Array
    uplink: Array
    required_db: float
    phasors: bool = False
    fixed: float | None = None
    neighbour_even: Array | float = 0.0
    neighbour_cosine: Array | float = 0.0
    neighbour_sine: Array | float = 0.0

    def _phase(self) -> Array:
        """The angle that worst phasors add to |d|, radians: |cos d| − a|sin d| = √(1+a²)·cos(|d| + phase)."""
        return np.arctan(self.leak) if self.phasors else np.zeros(())

    def _factors(self) -> tuple[Array, Array]:
        """(m, k) with W = m + k·cos θ and X = m − k·cos θ, θ = 2(|d| + phase)."""
        if self.phasors:
            half = 0.5 * (1.0 + self.leak**2)
            return half, half
        return 0.5 * (1.0 + self.leak), 0.5 * (1.0 - self.leak)

    def at(self, setting: ArrayLike) -> tuple[Array, Array, Array]:
        """Angle d in radians, and the factors on the wanted and the crossed carrier; settings in degrees."""
        middle, swing = self._factors()
        if self.fixed is not None:
            d = np.full(np.shape(self.suits), np.deg2rad(self.fixed))
            d = np.where(np.isnan(self.suits), np.nan, d)
        else:
            d = np.deg2rad(np.asarray(setting, dtype=np.float64) - self.suits)
        if self.phasors:
            theta = 2.0 * (np.abs(np.deg2rad(fold(np.rad2deg(d)))) + self._phase())
            cosine = np.cos(theta)
            wanted = np.where(theta >= np.pi, 0.0, middle + swing * cosine)
        else:
            cosine = np.cos(2.0 * d)
            wanted = middle + swing * cosine
        return d, np.maximum(wanted, LEAST_WANTED), middle - swing * cosine

    def _neighbours(self, d: Array) -> Array:
        """Neighbours' power at an angle d in radians."""
        if _is_zero(self.neighbour_cosine) and _is_zero(self.neighbour_sine):
            return np.asarray(self.neighbour_even)
        turned = self.neighbour_cosine * np.cos(2.0 * d) + self.neighbour_sine * np.sin(2.0 * d)
        return np.asarray(self.neighbour_even + turned)

    def inverse_ratio(self, setting: ArrayLike) -> Array:
        """(N+I)/C at settings in degrees."""
        d, wanted, crossed = self.at(setting)
        neighbours = self._neighbours(d)
        return np.asarray(self.uplink + (self.noise + self.crossed * crossed + neighbours) / wanted)

    def margin(self, setting: ArrayLike) -> Array:
        """Margin in dB at settings in degrees; NaN where `suits` or the carrier has no value."""
        return np.asarray(-10.0 * np.log10(self.inverse_ratio(setting)) - self.required_db)

    def room_for_noise(self, level_db: ArrayLike, setting: ArrayLike) -> Array:
        """How many times noise and neighbours may grow before the margin falls to `level_db` at a setting.

        They grow as the satellite's EIRP falls; its own crossed carrier and the uplink keep their ratio. Not
        positive where these alone spoil the level. NaN where the carrier has no value.
        """
        d, wanted, crossed = self.at(setting)
        allowed = self.allowed(level_db) - self.uplink
        return np.asarray((allowed * wanted - self.crossed * crossed) / (self.noise + self._neighbours(d)))

    def best_bound(self) -> Array:
        """A margin that no setting exceeds, dB (the true best one where no neighbour is polarised)."""
        middle, swing = self._factors()
        top = np.cos(2.0 * self._phase())
        least = self.noise + self.crossed * (middle - swing * top) + self.neighbour_even
        least = least - np.hypot(self.neighbour_cosine, self.neighbour_sine)
        return np.asarray(-10.0 * np.log10(self.uplink + least / (middle + swing * top)) - self.required_db)

    def allowed(self, level_db: ArrayLike) -> Array:
        """(N+I)/C at which the margin is `level_db`."""
        return ratio(-(np.asarray(level_db, dtype=np.float64) + self.required_db))

    def arc(self, level_db: ArrayLike) -> tuple[Array, Array]:
        """Settings that keep at least a margin of `level_db`, dB, as `arc_within` gives them."""
        return self.arc_within(self.allowed(level_db))

    def arc_within(self, total: Array) -> tuple[Array, Array]:
        """Settings that keep (N+I)/C at or below `total`: middle of the arc and its half-width, degrees.

        The half-width is 90 or more where every setting is good and negative where none is; NaN
        where there is no carrier. Closed form: A + B·cos θ + C·sin θ ≤ 0.
        """
        allowed = total - self.uplink
        if self.fixed is not None:
            inverse_downlink = self.inverse_ratio(0.0) - self.uplink
            width = np.where(inverse_downlink <= allowed, WHOLE_CIRCLE, EMPTY_ARC)
            return np.zeros_like(width), np.where(np.isnan(inverse_downlink), np.nan, width)
        middle, swing = self._factors()
        constant = self.noise + self.crossed * middle + self.neighbour_even - allowed * middle
        cosine = self.neighbour_cosine - swing * (self.crossed + allowed)
        if self.phasors:
            return self.suits, _half_width(constant, -cosine, 2.0 * self._phase())
        if _is_zero(self.neighbour_sine) and _is_zero(self.neighbour_cosine):
            return self.suits, _half_width(constant, -cosine, np.zeros(())) + 0.0 * self.suits
        size = np.hypot(cosine, self.neighbour_sine)
        offset = 0.5 * np.arctan2(-np.asarray(self.neighbour_sine), -cosine)
        return self.suits + np.rad2deg(offset), _half_width(constant, size, np.zeros(())) + 0.0 * self.suits


def _is_zero(value: Array | float) -> bool:
    """Whether a term is the plain number 0."""
    return np.ndim(value) == 0 and float(value) == 0.0


def _half_width(constant: Array, size: Array, phase: Array) -> Array:
    """Half-width in degrees of {d: constant ≤ size·cos(2|d| + phase)}, NaN kept.

    Worst phasors (phase > 0) never make every setting good while there is noise: at 2|d| + phase =
    180° nothing is left of the wanted carrier.
    """
    with np.errstate(divide="ignore", invalid="ignore"):
        quotient = np.where(size <= 0.0, np.sign(constant) * np.inf, constant / size)
    half = np.rad2deg(0.5 * np.arccos(np.clip(quotient, -1.0, 1.0)))
    if not _is_zero(phase):
        half = half - np.rad2deg(0.5 * phase)
        return np.where((quotient > 1.0) | (half < 0.0), EMPTY_ARC, half)
    return np.where(quotient > 1.0, EMPTY_ARC, half)


def merged_arcs(responses: Sequence[Response], totals: Sequence[Array]) -> list[tuple[Array, Array]]:
    """Arcs of settings within totals of (N+I)/C, one a response; those about one and the same middle as one.

    Carriers of one moment mostly suit at the same setting: of arcs about one middle the narrowest is
    what they have in common.
    """
    merged: dict[int, tuple[Array, Array]] = {}
    for number, (response, total) in enumerate(zip(responses, totals, strict=True)):
        middle, half = response.arc_within(total)
        # An arc's middle is the array `suits` itself unless a neighbour moves it.
        key = id(middle) if middle is response.suits else -1 - number
        merged[key] = (middle, np.minimum(merged[key][1], half)) if key in merged else (middle, half)
    return list(merged.values())
