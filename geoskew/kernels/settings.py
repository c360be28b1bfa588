"""The setting that serves both satellites, cell by cell, for carriers of a moment that suit alike.

On the arc between the two settings that suit, what is wrong before the changeover grows and what is wrong
after it falls, so that the best setting is where they cross, or an end of the arc. Newton's method within a
bracket finds the crossing for a chunk of cells at a time; ``geoskew.policies`` is the reference.
"""

from __future__ import annotations

from typing import Final

import numpy as np
from numpy.typing import NDArray

from geoskew.kernels.compiling import compiled
from geoskew.kernels.elementary import HALF_PI, IN_DEGREES, arctan_ratio, cosine, sine
from geoskew.kernels.powers import leak_part

Array = NDArray[np.float64]
Single = NDArray[np.float32]

_CHUNK: Final = 256
# A step this small is the last but one: the next is its square. Radians; 6e-5 degrees.
_LAST_STEP: Final = 1e-6
_MOST_STEPS: Final = 60
# An excess of −2e-8 dB is a window still, as in ``geoskew.policies``.
_WITHIN: Final = 1.0 + 4.7e-9
_NONE: Final = np.float32(np.nan)


@compiled
def wrong_row(
    noise: Array, leak: Array, terms: Array, z: Array, w: Array, value: Array, slope: Array
) -> None:
    """(N+I)/C over what is required at cos 2d = z, and its slope by d; the largest so far is kept.

    `w` is sin 2d. NaN stays, since no comparison with it holds.
    """
    uplink, crossed, scale = terms[0], terms[1], terms[2]
    for j in range(value.size):
        x = leak[j]
        middle, swing = 0.5 * (1.0 + x), 0.5 * (1.0 - x)
        kept = 1.0 / (middle + swing * z[j])
        lost = (noise[j] + 2.0 * crossed * middle) * kept
        bad = scale * (uplink - crossed + lost)
        larger = not (bad <= value[j])
        value[j] = bad if larger else value[j]
        slope[j] = 2.0 * scale * swing * w[j] * lost * kept if larger else slope[j]


@compiled
def all_wrong(
    noise: Array,
    leak: Array,
    terms: Array,
    i: int,
    start: int,
    z: Array,
    w: Array,
    value: Array,
    slope: Array,
    space: Array,
) -> None:
    """`wrong_row` of all carriers of a moment for the cells of row i from `start` on."""
    value[:] = 0.0
    for k in range(noise.shape[0]):
        row = leak_part(leak, k, i, start, space)
        wrong_row(noise[k, i, start : start + value.size], row, terms[k], z, w, value, slope)


@compiled
def _held(best: Array, reserve: float, loss: float, held: Array) -> None:
    """What a moment is held to, as the ratio of a margin: the reserve, or its best less what is allowed.

    `best` is (N+I)/C over what is required in the best setting.
    """
    for j in range(held.size):
        held[j] = 1.0 / (best[j] * loss) if best[j] * reserve > 1.0 else reserve


@compiled
def _double(angle: Array, z: Array, w: Array) -> None:
    """Cosine and sine of twice the angle, which is within ±π/2."""
    for j in range(angle.size):
        s, c = sine(angle[j]), cosine(angle[j])
        z[j] = 1.0 - 2.0 * s * s
        w[j] = 2.0 * s * c


@compiled
def _begin(near: Array, far: Array, gap: Array, guess: Array, low: Array, high: Array, t: Array) -> None:
    """Bracket of the crossing, from what is wrong before over after at both ends of the arc.

    At an end already where the other moment is worse there, and where there is no value. The search begins
    at the guess where that is within the bracket.
    """
    for j in range(t.size):
        low[j] = gap[j] if (far[j] <= 1.0) & (near[j] < 1.0) else 0.0
        high[j] = gap[j] if near[j] < 1.0 else 0.0
        within = (guess[j] > low[j]) & (guess[j] < high[j])
        t[j] = guess[j] if within else 0.5 * (low[j] + high[j])


@compiled
def _step(
    t: Array, low: Array, high: Array, held: Array, first: Array, rise: Array, second: Array, fall: Array
) -> int:
    """One step towards where both moments are equally wrong; how many cells still move.

    `held` weighs the moment before against the one after; `rise` and `fall` are slopes.
    """
    moving = 0
    for j in range(t.size):
        f, g = first[j], second[j]
        a, b = held[j] * f, g
        high[j] = t[j] if a > b else high[j]
        low[j] = low[j] if a > b else t[j]
        # ln(a/b), as 2(a − b)/(a + b), over its slope f'/f + g'/g.
        new = t[j] - 2.0 * (a - b) * f * g / ((a + b) * (rise[j] * g + fall[j] * f))
        inside = (new > low[j]) & (new < high[j])
        new = new if inside else 0.5 * (low[j] + high[j])
        moving += 1 if abs(new - t[j]) > _LAST_STEP else 0
        t[j] = new
    return moving


@compiled
def _half_width(
    noise: Array, leak: Array, terms: Array, i: int, start: int, held: Array, half: Array, space: Array
) -> None:
    """Half the arc of settings that keep what a moment is held to, radians; π where every setting does."""
    half[:] = -1.0
    for k in range(noise.shape[0]):
        row = leak_part(leak, k, i, start, space)
        noises = noise[k, i, start : start + half.size]
        uplink, crossed, scale = terms[k, 0], terms[k, 1], terms[k, 2]
        for j in range(half.size):
            middle, swing = 0.5 * (1.0 + row[j]), 0.5 * (1.0 - row[j])
            allowed = 1.0 / (held[j] * scale) - uplink + crossed
            z = ((noises[j] + 2.0 * crossed * middle) / allowed - middle) / swing
            z = z if allowed > 0.0 else 1.0
            half[j] = half[j] if z <= half[j] else z
    for j in range(half.size):
        z = min(half[j], 1.0)
        whole = z <= -1.0
        angle = arctan_ratio(np.sqrt(1.0 - z), np.sqrt(1.0 + z))
        half[j] = 2.0 * HALF_PI if whole else angle


@compiled
def _window(turn: Array, delta: Array, first: Array, second: Array, low: Single, high: Single) -> None:
    """Ends of the window as turns, degrees, from the half-widths about both settings that suit."""
    for j in range(turn.size):
        offset = turn[j] - delta[j]
        down = min(max(first[j] + turn[j], 0.0), max(second[j] + offset, 0.0))
        up = min(max(first[j] - turn[j], 0.0), max(second[j] - offset, 0.0))
        whole_first, whole_second = first[j] > HALF_PI, second[j] > HALF_PI
        down = max(second[j] + offset, 0.0) if whole_first else down
        up = max(second[j] - offset, 0.0) if whole_first else up
        down = max(first[j] + turn[j], 0.0) if whole_second else down
        up = max(first[j] - turn[j], 0.0) if whole_second else up
        every = whole_first & whole_second
        low[j] = -90.0 if every else IN_DEGREES * (turn[j] - down)
        high[j] = 90.0 if every else IN_DEGREES * (turn[j] + up)


@compiled
def shared(
    delta: Array,
    noise: Array,
    leak: Array,
    terms: Array,
    noise_after: Array,
    leak_after: Array,
    terms_after: Array,
    best_after: Array,
    reserve: float,
    loss: float,
    turn: Array,
    low: Single,
    high: Single,
) -> None:
    """The turn to the shared setting and its window at every place of (H, W).

    Parameters
    ----------
    delta : ndarray
        From the setting that suits before, which is the present one, to the one that suits after in the
        untouched dish, radians in (−π/2, π/2].
    noise, leak, terms, noise_after, leak_after, terms_after : ndarray
        Before, and after in the untouched dish, as `powers.worst` takes them.
    best_after : ndarray
        (N+I)/C over what is required in a dish aimed and set for the new satellite.
    reserve, loss : float
        Ratios of the reserve and of the loss allowed where the reserve is missed.
    turn : ndarray
        Radians, clockwise; NaN where any carrier has no value. Ties go clockwise.
    low, high : ndarray of float32
        Degrees, NaN where no setting serves both; (0, 0) is not wanted.
    """
    width = delta.shape[1]
    space = np.empty((15, min(_CHUNK, width)))
    # The row above is the best guess.
    last = np.full(width, -1.0)
    for i in range(delta.shape[0]):
        for start in range(0, width, _CHUNK):
            stop = min(start + _CHUNK, width)
            n = stop - start
            gap, t, bottom, top = space[0, :n], space[1, :n], space[2, :n], space[3, :n]
            held, held_after, weight = space[4, :n], space[5, :n], space[6, :n]
            z, w, v = space[7, :n], space[8, :n], space[9, :n]
            first, rise, second, fall = space[10, :n], space[11, :n], space[12, :n], space[13, :n]
            row = space[14, :n]
            for j in range(n):
                gap[j] = abs(delta[i, start + j])
            z[:], w[:] = 1.0, 0.0
            all_wrong(noise, leak, terms, i, start, z, w, first, rise, row)
            _held(first, reserve, loss, held)
            _held(best_after[i, start:stop], reserve, loss, held_after)
            all_wrong(noise_after, leak_after, terms_after, i, start, z, w, second, fall, row)
            _double(gap, z, w)
            all_wrong(noise, leak, terms, i, start, z, w, t, rise, row)
            all_wrong(noise_after, leak_after, terms_after, i, start, z, w, v, rise, row)
            for j in range(n):
                weight[j] = held[j] / held_after[j]
                first[j] = weight[j] * first[j] / v[j]
                second[j] = weight[j] * t[j] / second[j]
            _begin(first, second, gap, last[start:stop], bottom, top, t)
            for _ in range(_MOST_STEPS):
                _double(t, z, w)
                all_wrong(noise, leak, terms, i, start, z, w, first, rise, row)
                for j in range(n):
                    v[j] = gap[j] - t[j]
                _double(v, z, w)
                all_wrong(noise_after, leak_after, terms_after, i, start, z, w, second, fall, row)
                if _step(t, bottom, top, weight, first, rise, second, fall) == 0:
                    break
            last[start:stop] = t
            for j in range(n):
                signed = -t[j] if delta[i, start + j] < 0.0 else t[j]
                # Both are within a step of 6e-5 degrees; NaN stays NaN.
                bad = max(held[j] * first[j], held_after[j] * second[j])
                first[j] = bad
                turn[i, start + j] = signed + (bad - bad) + (second[j] - second[j])
            if low.size:
                _half_width(noise, leak, terms, i, start, held, rise, row)
                _half_width(noise_after, leak_after, terms_after, i, start, held_after, fall, row)
                lows, highs = low[i, start:stop], high[i, start:stop]
                _window(turn[i, start:stop], delta[i, start:stop], rise, fall, lows, highs)
                for j in range(n):
                    missed = not (first[j] <= _WITHIN)
                    lows[j] = _NONE if missed else lows[j]
                    highs[j] = _NONE if missed else highs[j]
