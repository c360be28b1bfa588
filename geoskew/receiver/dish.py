"""A dish off its axis: what is left of the wanted carrier, what comes in from a neighbour, and how clean.

Wanted and unwanted carriers are judged apart. A mask is an envelope that side lobes keep below, so it is
the prudent figure for interference and the generous one for a wanted carrier; conventions therefore
take for the wanted one the larger of the main lobe's parabola and the mask, with the parabola's loss
held at 40 dB.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

from geoskew.receiver.antenna import antenna_gain, pointing_loss, wavelength
from geoskew.receiver.masks import (
    MASKS,
    bo1213_co,
    bo1213_cross,
    bo1213_discrimination,
    mask_name,
    s465,
    s580,
    smallest_angle,
)


def _mask_gain(
    off_axis: ArrayLike,
    *,
    diameter_m: ArrayLike,
    frequency_ghz: float,
    peak: NDArray[np.float64],
    mask: str | None,
) -> NDArray[np.float64]:
    """Gain by the mask, dBi; S.465 and S.580 keep their value at φmin inside of it.

    That shelf is the plateau which BO.1213 spells out between its main lobe and its first side lobe;
    it joins the parabola to the envelope without a step.
    """
    name = mask_name(frequency_ghz) if mask is None else mask
    if name == "BO.1213":
        return bo1213_co(off_axis, diameter_m=diameter_m, frequency_ghz=frequency_ghz, peak_dbi=peak)
    if name not in MASKS:
        raise ValueError(f"no receive pattern {name!r}; known are {', '.join(MASKS)}")
    inner = smallest_angle(diameter_m, frequency_ghz=frequency_ghz)
    angle = np.maximum(np.abs(np.asarray(off_axis, dtype=np.float64)), inner)
    pattern = s465 if name == "S.465" else s580
    return np.minimum(pattern(angle, diameter_m=diameter_m, frequency_ghz=frequency_ghz), peak)


def wanted_gain_loss(
    off_axis: ArrayLike,
    *,
    diameter_m: ArrayLike,
    efficiency: ArrayLike,
    frequency_ghz: float,
    mask: str | None = None,
) -> NDArray[np.float64]:
    """How far the gain for the wanted carrier lies below the gain on the axis.

    Parameters
    ----------
    off_axis : array_like
        Angle between the dish axis and the wanted satellite, degrees.
    diameter_m, efficiency : array_like
        Diameter, metres, and aperture efficiency.
    frequency_ghz : float
        Frequency, GHz.
    mask : str, optional
        "BO.1213", "S.465" or "S.580"; by `mask_name` when not given.

    Returns
    -------
    ndarray
        dB, never negative, the broadcast shape; NaN where the angle is NaN. The parabola of
        `pointing_loss` in the main lobe, beyond it the larger gain of that parabola (loss at most
        40 dB) and the mask. Continuous up to 48° at least; the steps that the published masks have
        further out stay.

    Raises
    ------
    ValueError
        For a mask that is not one of `MASKS`.

    Examples
    --------
    >>> loss = wanted_gain_loss([0.3, 5.0], diameter_m=1.2, efficiency=0.65, frequency_ghz=12.0)
    >>> loss.round(3).tolist()
    [0.509, 30.177]
    """
    peak = antenna_gain(diameter_m, efficiency=efficiency, frequency_ghz=frequency_ghz)
    parabola = pointing_loss(off_axis, diameter_m=diameter_m, frequency_ghz=frequency_ghz)
    gain = _mask_gain(off_axis, diameter_m=diameter_m, frequency_ghz=frequency_ghz, peak=peak, mask=mask)
    # BO.1213's own main lobe is narrower than the parabola by 1 %, so the larger gain is the parabola
    # there; and the shelf is met where the parabola has come down to it.
    return np.clip(peak - gain, 0.0, parabola)


def interference_gain(
    off_axis: ArrayLike,
    *,
    diameter_m: ArrayLike,
    efficiency: ArrayLike,
    frequency_ghz: float,
    mask: str | None = None,
) -> NDArray[np.float64]:
    """Co-polar gain towards an unwanted satellite, dBi, by the mask.

    Arguments and shapes as `wanted_gain_loss`. Inside the φmin of S.465 and S.580 the main lobe's
    parabola, held at the mask's value at φmin so that the gain has no step there.

    Examples
    --------
    >>> float(interference_gain(5.0, diameter_m=1.2, efficiency=0.65, frequency_ghz=12.0).round(3))
    11.526
    """
    peak = antenna_gain(diameter_m, efficiency=efficiency, frequency_ghz=frequency_ghz)
    gain = _mask_gain(off_axis, diameter_m=diameter_m, frequency_ghz=frequency_ghz, peak=peak, mask=mask)
    name = mask_name(frequency_ghz) if mask is None else mask
    if name == "BO.1213":
        return gain
    inner = smallest_angle(diameter_m, frequency_ghz=frequency_ghz)
    parabola = peak - pointing_loss(off_axis, diameter_m=diameter_m, frequency_ghz=frequency_ghz)
    inside = np.abs(np.asarray(off_axis, dtype=np.float64)) < inner
    return np.where(inside, np.maximum(parabola, gain), gain)


def interference_gain_cross(
    off_axis: ArrayLike,
    *,
    diameter_m: ArrayLike,
    efficiency: ArrayLike,
    frequency_ghz: float,
    mask: str | None = None,
) -> NDArray[np.float64]:
    """Cross-polar gain towards an unwanted satellite, dBi, the cross-polar twin of `interference_gain`.

    BO.1213 has a cross-polar pattern. S.465 and S.580 have none: there the co-polar gain is lessened by
    the discrimination that BO.1213 shows at the same angle for a dish of the same D/λ.

    Examples
    --------
    >>> float(interference_gain_cross(5.0, diameter_m=1.2, efficiency=0.65, frequency_ghz=12.0).round(3))
    3.526
    """
    name = mask_name(frequency_ghz) if mask is None else mask
    if name == "BO.1213":
        peak = antenna_gain(diameter_m, efficiency=efficiency, frequency_ghz=frequency_ghz)
        return bo1213_cross(off_axis, diameter_m=diameter_m, frequency_ghz=frequency_ghz, peak_dbi=peak)
    co = interference_gain(
        off_axis, diameter_m=diameter_m, efficiency=efficiency, frequency_ghz=frequency_ghz, mask=name
    )
    return co - bo1213_discrimination(
        off_axis, diameter_m=diameter_m, frequency_ghz=frequency_ghz, efficiency=efficiency
    )


def isolation_off_axis(
    off_axis: ArrayLike, *, isolation_db: ArrayLike, diameter_m: ArrayLike, frequency_ghz: ArrayLike
) -> NDArray[np.float64]:
    """Cross-polar isolation of the terminal towards a carrier off the dish axis.

    Parameters
    ----------
    off_axis : array_like
        Angle from the dish axis, degrees.
    isolation_db : array_like
        The terminal's stated isolation on the axis, dB.
    diameter_m, frequency_ghz : array_like
        Diameter, metres, and frequency, GHz.

    Returns
    -------
    ndarray
        dB, never below 0 nor above `isolation_db`, the broadcast shape; NaN where the angle is NaN.

    Notes
    -----
    No standard states how an isolation better or worse than BO.1213's 25 dB falls off the axis. The
    choice here: it falls by as many dB as the discrimination of BO.1213-1 does. Within a quarter of the
    half-power width φ0 the recommendation holds its cross-polar pattern level and the stated figure
    is kept; the fall is counted from the value at that angle, so that there is no step.

    Examples
    --------
    >>> float(isolation_off_axis(0.3, isolation_db=30.0, diameter_m=1.2, frequency_ghz=12.0))
    30.0
    """
    diameter = np.asarray(diameter_m, dtype=np.float64)
    level_to = 0.5 * np.sqrt(3.0 / 0.0025) * wavelength(frequency_ghz) / diameter
    angle = np.maximum(np.abs(np.asarray(off_axis, dtype=np.float64)), level_to)
    reference = bo1213_discrimination(level_to, diameter_m=diameter_m, frequency_ghz=frequency_ghz)
    here = bo1213_discrimination(angle, diameter_m=diameter_m, frequency_ghz=frequency_ghz)
    return np.maximum(np.asarray(isolation_db, dtype=np.float64) - (reference - here), 0.0)
