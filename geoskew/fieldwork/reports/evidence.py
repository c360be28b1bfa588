"""What reports say of the feeds, as arrays: settings that were read and signals that were read."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final, Literal, NamedTuple, Protocol

import numpy as np
from numpy.typing import NDArray

from geoskew.angles import fold
from geoskew.fieldwork.reports.rows import Moment

Array = NDArray[np.float64]

# Standard deviations of readings: common practice, no source.
INCLINOMETER_DEG: Final = 0.5
SCALE_STEPS: Final = 1.0 / 3.0
QUALITY_DB: Final = 0.3
# What a site's meter, dish and link differ by from the budget, the same in all readings of the site.
SITE_BIAS_DB: Final = 1.0


class Slot(NamedTuple):
    """A kind of signal reading: as the crew found the feed or left it, whose satellite, which carrier."""

    stage: Literal["found", "left"]
    moment: Moment
    carrier: int


def slots_of(carriers: int) -> tuple[Slot, ...]:
    """Every kind of reading there can be with so many carriers."""
    stages: tuple[Literal["found", "left"], ...] = ("found", "left")
    moments: tuple[Moment, ...] = ("before", "after")
    return tuple(
        Slot(stage, moment, carrier) for carrier in range(carriers) for stage in stages for moment in moments
    )


@dataclass(frozen=True)
class Evidence:
    """Readings of N sites.

    Attributes
    ----------
    setting : ndarray
        (N,) mean of the settings read, degrees; NaN: none.
    setting_sigma : ndarray
        (N,) its standard deviation, degrees; NaN: none.
    quality : ndarray
        (N, K) mean Es/N0 a slot, dB; NaN: none.
    count : ndarray
        (N, K) readings that went into it.
    """

    setting: Array
    setting_sigma: Array
    quality: Array
    count: Array

    @property
    def measured(self) -> NDArray[np.bool_]:
        """(N,) where a setting was read."""
        return np.isfinite(self.setting)

    @property
    def any(self) -> NDArray[np.bool_]:
        """(N,) where there is a reading at all."""
        return np.asarray(self.measured | (self.count > 0).any(axis=1))

    def part(self, rows: slice) -> Evidence:
        """Some of the sites."""
        return Evidence(self.setting[rows], self.setting_sigma[rows], self.quality[rows], self.count[rows])


@dataclass(frozen=True)
class Accuracy:
    """Standard deviations of signal readings, dB.

    ``spread_before`` and ``spread_after`` are what a satellite's EIRP differs by from the footprint, the
    same in all readings of a site that are of this satellite.
    """

    quality: float = QUALITY_DB
    site_bias: float = SITE_BIAS_DB
    spread_before: float = 0.0
    spread_after: float = 0.0


class Meter(Protocol):
    """Foretells a reading: Es/N0 in dB at settings in degrees, (..., N) for N sites.

    ``aim`` numbers the dish's pointing errors, 0 being the stated one; ``stays``: the dish was not moved
    although the card asked for it. NaN where the satellite serves nobody.
    """

    def __call__(self, slot: Slot, setting: Array, *, aim: int, stays: bool) -> Array:
        """Es/N0, dB."""
        ...


def mean_setting(readings: list[tuple[float, float]]) -> tuple[float, float]:
    """Mean of settings (degrees, standard deviation) weighted by accuracy, on the half circle."""
    if not readings:
        return float("nan"), float("nan")
    first = readings[0][0]
    weights = np.array([sigma**-2 for _, sigma in readings])
    offsets = fold(np.array([value for value, _ in readings]) - first)
    mean = float(fold(first + float(np.sum(weights * offsets) / np.sum(weights))))
    return mean, float(np.sum(weights) ** -0.5)


def weights_of(
    evidence: Evidence, accuracy: Accuracy, slots: tuple[Slot, ...], more_variance: Array
) -> Array:
    """Inverse covariance of the signal readings, (N, K, K), zero for slots without a reading.

    Independent noise; over it a bias common to all readings of the site and one common to those of
    each satellite, integrated out (Woodbury identity). `more_variance` (N, K), dB², adds to the noise.
    """
    noise = accuracy.quality**2 / np.maximum(evidence.count, 1.0) + more_variance
    inverse = np.where(evidence.count > 0, 1.0 / noise, 0.0)
    of_before = np.array([slot.moment == "before" for slot in slots], dtype=np.float64)
    loads = np.stack(
        [
            np.full(len(slots), accuracy.site_bias),
            accuracy.spread_before * of_before,
            accuracy.spread_after * (1.0 - of_before),
        ],
        axis=1,
    )
    weighted = inverse[:, :, None] * loads  # (N, K, 3)
    inner = np.eye(3) + np.einsum("kb,nkc->nbc", loads, weighted)
    correction = weighted @ np.linalg.solve(inner, np.swapaxes(weighted, 1, 2))
    return np.asarray(np.eye(len(slots)) * inverse[:, None, :] - correction)
