"""Noise of carriers and what it makes of a margin at a setting, cell by cell.

The formulas are those of ``geoskew.link``, ``geoskew.receiver`` and ``geoskew.polarisation`` for linear
carriers whose leaks add as powers, without neighbours. With z = cos 2d, d the angle between a setting and
the one that suits, a carrier has (N+I)/C = uplink − c + (n + 2·c·m)/(m + k·z), where n is its noise and c
the crossed carrier's power, both over the wanted one, m = (1 + x)/2, k = (1 − x)/2 and x the leak.

Arrays of several carriers are (carrier, row, column); a leak that is alike at all places is (carrier, 1, 1).
"""

from __future__ import annotations

from typing import Final

import numpy as np
from numpy.typing import NDArray

from geoskew.kernels.compiling import compiled
from geoskew.kernels.elementary import (
    BITS_PER_DECIBEL,
    IN_DEGREES,
    cosine,
    decibels,
    power_of_two,
    ratio,
    sine,
)

Array = NDArray[np.float64]
Single = NDArray[np.float32]

# As in ``geoskew.polarisation``: the mismatch loss is capped at 40 dB, the discrimination at −40 dB.
_FLOOR: Final = 1e-4
_QUARTER: Final = np.float32(90.0)


@compiled
def power_row(decibel: Array, power: Array) -> None:
    """10^(dB/10)."""
    for j in range(power.size):
        power[j] = ratio(decibel[j])


@compiled
def clear_noise_row(
    distance: Array, sine_row: Array, eirp: Array, zenith: Array, terms: Array, noise: Array
) -> None:
    """Thermal noise and adjacent satellites over the wanted carrier, in a perfectly aimed dish in clear sky.

    `eirp` W; `zenith` gas towards the zenith, dB; `terms` (5,): (4π/λ)² with rate, gain and losses, W/m²;
    the noise temperature without the sky's share and that share, K; least sine of the elevation; adjacent.
    """
    scale, own, sky, least, adjacent = terms[0], terms[1], terms[2], terms[3], terms[4]
    for j in range(noise.size):
        path = BITS_PER_DECIBEL * zenith[j] / max(sine_row[j], least)
        temperature = own * power_of_two(path) - sky
        noise[j] = scale * distance[j] * distance[j] * temperature / eirp[j] + adjacent


@compiled
def clear_noise(
    distance: Array,
    sine_of: Array,
    eirp_dbw: Array,
    zenith: Array,
    gas: NDArray[np.int64],
    terms: Array,
    noise: Array,
) -> None:
    """The noise of all carriers of one satellite at every place, into (carrier, H, W).

    Parameters
    ----------
    distance, sine_of : ndarray
        (H, W): metres, and sine of the elevation.
    eirp_dbw : ndarray
        (H, W), or (1, 1) where it is alike everywhere; NaN outside of the coverage.
    zenith, gas : ndarray
        (frequency, H, W): gas towards the zenith, dB; and which of these each carrier has, (carrier,).
    terms : ndarray
        (carrier, 5), as `clear_noise_row` takes them.
    """
    power = np.empty(distance.shape[1])
    for i in range(distance.shape[0]):
        if eirp_dbw.size == 1:
            power[:] = ratio(eirp_dbw[0, 0])
        else:
            power_row(eirp_dbw[i], power)
        for k in range(terms.shape[0]):
            clear_noise_row(distance[i], sine_of[i], power, zenith[gas[k], i], terms[k], noise[k, i])


@compiled
def leak_part(leak: Array, k: int, i: int, start: int, space: Array) -> Array:
    """Leak of carrier k for cells of row i from `start` on; `space` is filled where it is alike."""
    if leak.shape[2] > 1:
        own: Array = leak[k, i, start : start + space.size]
        return own
    space[:] = leak[k, 0, 0]
    return space


@compiled
def excess_row(
    noise: Array, leak: Array, z: Array, uplink: float, crossed: float, scale: float, out: Array
) -> None:
    """(N+I)/C over what is required; the larger of this and what `out` holds already."""
    for j in range(out.size):
        x = leak[j]
        middle, swing = 0.5 * (1.0 + x), 0.5 * (1.0 - x)
        bad = uplink - crossed + (noise[j] + 2.0 * crossed * middle) / (middle + swing * z[j])
        bad = scale * bad
        # A carrier without a value leaves the moment without one.
        out[j] = out[j] if bad <= out[j] else bad


@compiled
def worst(noise: Array, leak: Array, terms: Array, z: Array, out: Array) -> None:
    """(N+I)/C over what is required, of the weakest carrier at every place: 1 where the margin is 0 dB.

    Parameters
    ----------
    noise, leak : ndarray
        (carrier, H, W); leak or (carrier, 1, 1).
    terms : ndarray
        (carrier, 3): uplink's noise over the carrier, crossed carrier's power, required C/N; ratios.
    z : ndarray
        cos 2d, (H, W), or (1, 1).
    out : ndarray
        (H, W); NaN where any carrier has no value.
    """
    width = noise.shape[2]
    space, angles = np.empty(width), np.empty(width)
    angles[:] = z[0, 0]
    for i in range(noise.shape[1]):
        at = z[i] if z.shape[1] == width else angles
        out[i, :] = 0.0
        for k in range(noise.shape[0]):
            row = leak_part(leak, k, i, 0, space)
            excess_row(noise[k, i], row, at, terms[k, 0], terms[k, 1], terms[k, 2], out[i])


@compiled
def margin(ratios: Array, out: Single) -> None:
    """Margin in dB of ratios of (N+I)/C over what is required, flat arrays."""
    for j in range(out.size):
        out[j] = -decibels(ratios[j])


@compiled
def cosines(turn: Array, delta: Array, before: Array, after: Array, reversed_after: Array) -> None:
    """Cosine of 2d of a turn before and after the changeover, and of that turn made the wrong way.

    `turn` is from the setting that suits before, `delta` from there to the one that suits after, radians.
    """
    for j in range(turn.size):
        s, c = sine(turn[j]), cosine(turn[j])
        u, v = sine(delta[j]), cosine(delta[j])
        z, w = 1.0 - 2.0 * s * s, 2.0 * s * c
        p, q = 1.0 - 2.0 * u * u, 2.0 * u * v
        before[j] = z
        after[j] = z * p + w * q
        reversed_after[j] = z * p - w * q


@compiled
def double_cosine(angle: Array, out: Array) -> None:
    """Cosine of 2d of angles in radians within ±π/2, flat arrays."""
    for j in range(out.size):
        s = sine(angle[j])
        out[j] = 1.0 - 2.0 * s * s


@compiled
def mismatch(z: Array, out: Single) -> None:
    """Loss of the wanted carrier, dB, −10·log10(cos² d), at most 40; flat arrays."""
    for j in range(out.size):
        kept = 0.5 * (1.0 + z[j])
        loss = -decibels(_FLOOR if kept < _FLOOR else kept)
        out[j] = 0.0 if loss < 0.0 else loss


@compiled
def discrimination(z: Array, leak: float, out: Single) -> None:
    """Wanted over crossed polarisation for equal powers sent, dB, at least −40; flat arrays."""
    for j in range(out.size):
        s = 0.5 * (1.0 - z[j])
        wanted = 1.0 - s * (1.0 - leak)
        crossed = leak + s * (1.0 - leak)
        quotient = wanted / crossed
        out[j] = decibels(_FLOOR if quotient < _FLOOR else quotient)


@compiled
def weakest_noise(
    noise: Array, leak: Array, terms: Array, of_carrier: Array, without: Array, out: Single
) -> None:
    """C/N in dB of the carrier that is weakest in a perfectly set feed, at every place of (H, W).

    `noise`, `leak`, `terms` as in `worst` say which; its C/N is of `of_carrier` (carrier, H, W) less
    `without` (carrier,), the part that is not thermal.
    """
    width = out.shape[1]
    bad, chosen, space = np.empty(width), np.empty(width), np.empty(width)
    for i in range(out.shape[0]):
        bad[:] = -1.0
        for k in range(noise.shape[0]):
            row = leak_part(leak, k, i, 0, space)
            uplink, crossed, scale = terms[k, 0], terms[k, 1], terms[k, 2]
            here, value = noise[k, i], of_carrier[k, i]
            for j in range(width):
                wrong = scale * (uplink + here[j] + crossed * row[j])
                chosen[j] = chosen[j] if wrong <= bad[j] else value[j] - without[k]
                bad[j] = bad[j] if wrong <= bad[j] else wrong
        for j in range(width):
            out[i, j] = -decibels(chosen[j])


@compiled
def folded(first: Array, second: Array, sign: float, offset: float, out: Single) -> None:
    """First + sign·second in degrees, plus an offset in degrees, within (−90, 90]; flat, radians in."""
    for j in range(out.size):
        angle = IN_DEGREES * (first[j] + sign * second[j]) + offset
        angle = angle - 180.0 * np.ceil((angle - 90.0) / 180.0)
        single = np.float32(angle)
        out[j] = _QUARTER if single <= -_QUARTER else single


@compiled
def looked_up(values: Array, start: float, per_step: float, table: Array, out: Array) -> None:
    """Linear interpolation in an even table, flat arrays; beyond its ends the end's value."""
    last = table.size - 2
    for j in range(out.size):
        place = (values[j] - start) * per_step
        k = min(max(int(place), 0), last)
        share = min(max(place - k, 0.0), 1.0)
        out[j] = table[k] + share * (table[k + 1] - table[k])
