"""Elementary functions as polynomials, so that loops over them run in vector registers.

Without a vector library the compiler calls the scalar functions of the C library, cell by cell. The
coefficients come from interpolation at Chebyshev nodes when the module is loaded; the errors that are
stated were measured against numpy and are held by tests.
"""

from __future__ import annotations

from collections.abc import Callable
from math import log, pi
from typing import Final

import numpy as np
from numpy.polynomial import chebyshev

from geoskew.kernels.compiling import bits_of, compiled, float_of

HALF_PI: Final = 0.5 * pi
DEGREE: Final = pi / 180.0
IN_DEGREES: Final = 180.0 / pi
LN_TWO: Final = log(2.0)
BITS_PER_DECIBEL: Final = log(10.0) / (10.0 * log(2.0))
DECIBELS_PER_NEPER: Final = 10.0 / log(10.0)


def _fitted(function: Callable[[np.ndarray], np.ndarray], top: float, count: int) -> tuple[float, ...]:
    """Coefficients by powers of s of a function on [0, top]."""
    nodes = 0.5 * top * (1.0 + chebyshev.chebpts1(count))
    series = chebyshev.Chebyshev.fit(nodes, function(nodes), count - 1, domain=[0.0, top])
    return tuple(float(c) for c in series.convert(kind=np.polynomial.Polynomial, domain=[-1, 1]).coef)


# arctan(t)/t in t², sin(x)/x and cos(x) in x², 2^f in f + ½, artanh(z)/z in z².
_A = _fitted(lambda s: np.arctan(np.sqrt(s)) / np.sqrt(s), 1.0, 12)
_S = _fitted(lambda s: np.sin(np.sqrt(s)) / np.sqrt(s), HALF_PI**2, 8)
_C = _fitted(lambda s: np.cos(np.sqrt(s)), HALF_PI**2, 8)
_E = _fitted(lambda s: np.exp2(s - 0.5), 1.0, 9)
_L = _fitted(lambda s: np.arctanh(np.sqrt(s)) / np.sqrt(s), (3.0 - 2.0 * 2.0**0.5) ** 2, 5)

# In single precision eight terms are enough.
_B = tuple(np.float32(c) for c in _fitted(lambda s: np.arctan(np.sqrt(s)) / np.sqrt(s), 1.0, 8))
_NONE_SINGLE: Final = np.float32(0.0)
_ONE_SINGLE: Final = np.float32(1.0)
_HALF_PI_SINGLE: Final = np.float32(HALF_PI)
_PI_SINGLE: Final = np.float32(pi)

# Adding it leaves the nearest whole number in a float's low bits.
_ROUNDER: Final = 1.5 * 2.0**52
# The float 2^52, whose low bits hold a whole number as it is.
_WHOLE: Final = 0x4330000000000000
_MANTISSA: Final = 0x000FFFFFFFFFFFFF
_ONE: Final = 0x3FF0000000000000


@compiled
def arctan_unit(t: float) -> float:
    """Arc tangent of 0 to 1, radians; within 1e-10."""
    s = t * t
    high = _A[6] + s * (_A[7] + s * (_A[8] + s * (_A[9] + s * (_A[10] + s * _A[11]))))
    low = _A[0] + s * (_A[1] + s * (_A[2] + s * (_A[3] + s * (_A[4] + s * _A[5]))))
    cube = s * s * s
    return t * (low + cube * cube * high)


@compiled
def arctan_ratio(y: float, x: float) -> float:
    """Angle of the line through (x, y) from the x axis, radians in (−π/2, π/2]; 0 for (0, 0)."""
    size_y, size_x = abs(y), abs(x)
    large = max(size_x, size_y)
    angle = arctan_unit(min(size_x, size_y) / (large if large > 0.0 else 1.0))
    angle = HALF_PI - angle if size_y > size_x else angle
    return -angle if y * x < 0.0 else angle


@compiled
def arctan_full(y: float, x: float) -> float:
    """Angle of the vector (x, y) from the x axis, radians in [−π, π]; 0 for (0, 0)."""
    size_y, size_x = abs(y), abs(x)
    large = max(size_x, size_y)
    angle = arctan_unit(min(size_x, size_y) / (large if large > 0.0 else 1.0))
    angle = HALF_PI - angle if size_y > size_x else angle
    angle = pi - angle if x < 0.0 else angle
    return -angle if y < 0.0 else angle


@compiled
def arctan_ratio_single(y: np.float32, x: np.float32) -> np.float32:
    """The same as `arctan_ratio` in single precision: within 3e-7."""
    size_y, size_x = abs(y), abs(x)
    large = max(size_x, size_y)
    t = min(size_x, size_y) / (large if large > _NONE_SINGLE else _ONE_SINGLE)
    s = t * t
    angle = t * (
        _B[0] + s * (_B[1] + s * (_B[2] + s * (_B[3] + s * (_B[4] + s * (_B[5] + s * (_B[6] + s * _B[7]))))))
    )
    angle = _HALF_PI_SINGLE - angle if size_y > size_x else angle
    return -angle if y * x < _NONE_SINGLE else angle


@compiled
def sine(x: float) -> float:
    """Sine of −π/2 to π/2; within 1e-12."""
    s = x * x
    return x * (
        _S[0] + s * (_S[1] + s * (_S[2] + s * (_S[3] + s * (_S[4] + s * (_S[5] + s * (_S[6] + s * _S[7]))))))
    )


@compiled
def cosine(x: float) -> float:
    """Cosine of −π/2 to π/2; within 1e-11."""
    s = x * x
    return _C[0] + s * (
        _C[1] + s * (_C[2] + s * (_C[3] + s * (_C[4] + s * (_C[5] + s * (_C[6] + s * _C[7])))))
    )


@compiled
def power_of_two(y: float) -> float:
    """2^y for |y| below 1000, relative 1e-10; NaN stays NaN."""
    shifted = y + _ROUNDER
    f = y - (shifted - _ROUNDER) + 0.5
    p = _E[0] + f * (
        _E[1] + f * (_E[2] + f * (_E[3] + f * (_E[4] + f * (_E[5] + f * (_E[6] + f * (_E[7] + f * _E[8]))))))
    )
    value: float = float_of(bits_of(p) + (bits_of(shifted) << 52))
    return value + (y - y)


@compiled
def logarithm(x: float) -> float:
    """Natural logarithm of a positive number, absolute 1e-11; NaN stays NaN, 0 gives a large negative one."""
    bits = bits_of(x)
    exponent: float = float_of((bits >> 52) | _WHOLE) - (2.0**52 + 1023.0)
    m: float = float_of((bits & _MANTISSA) | _ONE)
    large = m > 1.4142135623730951
    m = 0.5 * m if large else m
    exponent = exponent + 1.0 if large else exponent
    z = (m - 1.0) / (m + 1.0)
    s = z * z
    series = _L[0] + s * (_L[1] + s * (_L[2] + s * (_L[3] + s * _L[4])))
    return 2.0 * z * series + exponent * LN_TWO + (x - x)


@compiled
def decibels(x: float) -> float:
    """10·log10 of a positive number."""
    return DECIBELS_PER_NEPER * logarithm(x)


@compiled
def ratio(decibel: float) -> float:
    """10^(dB/10)."""
    return power_of_two(BITS_PER_DECIBEL * decibel)
