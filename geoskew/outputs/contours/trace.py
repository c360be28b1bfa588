"""Tracing isolines through a field of cell centres, across gaps and across the wrap of an angle."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any, Final

import numpy as np
from numpy.typing import NDArray

# Each branch traces the levels of an eighth of the period: more would be slower, fewer would lose
# lines further away from a point about which the angle turns.
_BRANCHES: Final = 8


@dataclass(frozen=True, slots=True)
class Isoline:
    """All parts of one level: each an (N, 2) array of x and y, N at least 2, with a length above 0."""

    level: float
    parts: tuple[NDArray[np.float64], ...]


def isolines(
    values: NDArray[Any],
    x: NDArray[np.float64],
    y: NDArray[np.float64],
    levels: Sequence[float],
    kind: str = "continuous",
    period: float = 0.0,
) -> list[Isoline]:
    """Lines of equal value, larger values on their left, by level.

    An angle that closes on itself is traced in branches: its difference from the branch's middle, folded
    to half a period either way and kept to a quarter. Between two neighbours that close, the short way
    round is the way that the angle goes, and the fold at half a period is never taken for a line.
    Lines end where an angle turns by a fifth of its period from one cell to the next, as beside the
    sub-satellite point.

    Parameters
    ----------
    values : ndarray, shape (H, W)
        NaN = no value.
    x, y : ndarray, shapes (W,) and (H,)
        Cell centres, each ascending or descending.
    levels : sequence of float
    kind : str
        "circular" for an angle with a period, else plain numbers.
    period : float
        360 or 180 degrees.

    Returns
    -------
    list of Isoline
        By level, ascending for angles; levels without any line are left out.
    """
    if min(values.shape) < 2:
        return []
    values, x, y = _ascending(np.asarray(values, dtype=np.float64), x, y)
    if kind == "circular":
        traced = _trace_angle(values, x, y, levels, period)
    else:
        generator = _generator(values, x, y)
        traced = [(level, generator.lines(level)) for level in levels]
    tolerance = 1e-9 * min(abs(x[1] - x[0]), abs(y[1] - y[0]))
    found = [(level, _with_length(lines, tolerance)) for level, lines in traced]
    return [Isoline(float(level), parts) for level, parts in found if parts]


def _ascending(
    values: NDArray[np.float64], x: NDArray[np.float64], y: NDArray[np.float64]
) -> tuple[NDArray[np.float64], NDArray[np.float64], NDArray[np.float64]]:
    """The same field with both axes ascending: which side of a line is left depends on it."""
    if x[0] > x[-1]:
        values, x = values[:, ::-1], x[::-1]
    if y[0] > y[-1]:
        values, y = values[::-1, :], y[::-1]
    return values, x, y


def _generator(values: NDArray[np.float64], x: NDArray[np.float64], y: NDArray[np.float64]) -> Any:
    import contourpy

    masked = np.ma.masked_invalid(values)
    return contourpy.contour_generator(x, y, masked, line_type=contourpy.LineType.Separate, corner_mask=True)


def _trace_angle(
    values: NDArray[np.float64],
    x: NDArray[np.float64],
    y: NDArray[np.float64],
    levels: Sequence[float],
    period: float,
) -> list[tuple[float, list[NDArray[np.float64]]]]:
    """Where an angle equals each of the levels, taken together in branches of the angle."""
    width = period / _BRANCHES
    branches: dict[int, list[float]] = {}
    for level in levels:
        branches.setdefault(round(level / width), []).append(level)
    traced = []
    for branch, near in branches.items():
        beyond = np.mod(values - branch * width + period / 2.0, period) - period / 2.0
        beyond[~(np.abs(beyond) < period / 4.0)] = np.nan
        rows = np.flatnonzero(~np.isnan(beyond).all(axis=1))
        columns = np.flatnonzero(~np.isnan(beyond).all(axis=0))
        if rows.size == 0 or rows[0] == rows[-1] or columns[0] == columns[-1]:
            continue
        part = slice(rows[0], rows[-1] + 1), slice(columns[0], columns[-1] + 1)
        generator = _generator(beyond[part], x[part[1]], y[part[0]])
        traced += [(level, generator.lines(level - branch * width)) for level in near]
    return sorted(traced, key=lambda pair: pair[0])


def _with_length(lines: Sequence[NDArray[np.float64]], tolerance: float) -> tuple[NDArray[np.float64], ...]:
    """Lines without repeated points; what has no length goes.

    Where a value equals the level exactly, several crossings fall on one cell centre.
    """
    kept = []
    for line in lines:
        moved = np.abs(np.diff(line, axis=0)).max(axis=1) > tolerance
        line = line[np.concatenate(([True], moved))]
        if len(line) > 1:
            kept.append(line)
    return tuple(kept)
