"""Gas towards the zenith in clear air over a geographic grid, row by row.

The formulas are those of ``geoskew.weather.maps.water_vapour`` and ``geoskew.weather.zenith``: vapour of
the four nodes around a place brought to its height, then polynomials in height, temperature and vapour.
"""

from __future__ import annotations

from typing import Final

import numpy as np
from numpy.typing import NDArray

from geoskew.kernels.compiling import compiled
from geoskew.kernels.elementary import LN_TWO, logarithm, power_of_two

Array = NDArray[np.float64]
Index = NDArray[np.int64]

_BITS_PER_NEPER: Final = 1.0 / LN_TWO
# Columns below this, kg/m², count as this where a logarithm is taken, as in ``geoskew.weather.zenith``.
_LEAST_COLUMN: Final = 1e-6


@compiled
def _node(
    height: Array, right: Array, values: Array, share: float, east: int, density: Array, column: Array
) -> None:
    """Add one node's vapour, brought to the places' heights; `values` are its height, 1/scale, ρ and V."""
    node, steep, rho, whole = values[0], _BITS_PER_NEPER * values[1], values[2], values[3]
    for j in range(height.size):
        weight = (
            share * (right[j] if east == 1 else 1.0 - right[j]) * power_of_two((node - height[j]) * steep)
        )
        density[j] += weight * rho
        column[j] += weight * whole


@compiled
def _within(values: Array, low: float, high: float, out: Array) -> None:
    """Values brought from [low, high] into [−1, 1]; beyond it the end."""
    scale, shift = 2.0 / (high - low), (low + high) / (high - low)
    for j in range(out.size):
        x = values[j] * scale - shift
        x = -1.0 if x < -1.0 else x
        out[j] = 1.0 if x > 1.0 else x


@compiled
def _log(values: Array, out: Array) -> None:
    for j in range(out.size):
        value = values[j]
        out[j] = logarithm(_LEAST_COLUMN if value < _LEAST_COLUMN else value)


@compiled
def _surface(table: Array, height: Array, temperature: Array, out: Array) -> None:
    """Polynomial in height and temperature; table (powers of height, 5 powers of temperature)."""
    out[:] = 0.0
    for k in range(table.shape[0] - 1, -1, -1):
        a, b, c, d, e = table[k, 0], table[k, 1], table[k, 2], table[k, 3], table[k, 4]
        for j in range(out.size):
            t = temperature[j]
            out[j] = out[j] * height[j] + (a + t * (b + t * (c + t * (d + t * e))))


@compiled
def _series(coefficients: Array, x: Array, out: Array) -> None:
    out[:] = coefficients[-1]
    for k in range(coefficients.size - 2, -1, -1):
        c = coefficients[k]
        for j in range(out.size):
            out[j] = out[j] * x[j] + c


@compiled
def clear_zenith(
    rows: Index,
    up: Array,
    columns: Index,
    right: Array,
    nodes: Array,
    height: Array,
    temperature: Array,
    ends: Array,
    dry: Array,
    moist: Array,
    ratio: Array,
    out: Array,
) -> None:
    """Oxygen and water vapour together, dB, into (frequency, H, W).

    Parameters
    ----------
    rows, up, columns, right : ndarray
        The node below and west of each row (H,) and column (W,), and the fractions of a step beyond it.
    nodes : ndarray
        (lattice rows, lattice columns, 4): height in km, reciprocal of the scale height, density g/m³ and
        column kg/m² of each node.
    height, temperature : ndarray
        (H, W), km and K.
    ends : ndarray
        (4, 2): ranges of height, temperature, density and logarithm of the column.
    dry, moist, ratio : ndarray
        (frequency, ...): coefficients of ``weather.zenith.ZenithGas``.
    """
    width = columns.size
    space = np.empty((8, width))
    density, column, h, t, logs = space[0], space[1], space[2], space[3], space[4]
    first, second, third = space[5], space[6], space[7]
    for i in range(rows.size):
        density[:], column[:] = 0.0, 0.0
        start = 0
        while start < width:
            c, stop = columns[start], start + 1
            while stop < width and columns[stop] == c:
                stop += 1
            for corner in range(4):
                north, east = corner // 2, corner % 2
                share = up[i] if north == 1 else 1.0 - up[i]
                _node(
                    height[i, start:stop],
                    right[start:stop],
                    nodes[rows[i] + north, c + east],
                    share,
                    east,
                    density[start:stop],
                    column[start:stop],
                )
            start = stop
        _within(height[i], ends[0, 0], ends[0, 1], h)
        _within(temperature[i], ends[1, 0], ends[1, 1], t)
        _log(column, third)
        _within(third, ends[3, 0], ends[3, 1], logs)
        for k in range(out.shape[0]):
            _surface(dry[k], h, t, first)
            _surface(moist[k], h, t, second)
            _series(ratio[k], logs, third)
            for j in range(width):
                air = first[j] + second[j] * min(density[j], ends[2, 1])
                out[k, i, j] = air + column[j] * third[j]
