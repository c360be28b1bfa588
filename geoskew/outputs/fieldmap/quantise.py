"""Numbers as steps: how finely a column or a grid is kept on the page."""

from __future__ import annotations

from typing import Any, Final

import numpy as np
from numpy.typing import ArrayLike, NDArray

# What a reader of the map can use; finer values stand in the tables and rasters.
STEPS: Final[dict[str, float]] = {
    "deg": 0.01,
    "dB": 0.01,
    "dBW": 0.01,
    "km": 0.1,
    "percent": 0.1,
    "hours/year": 0.1,
}
MOST_CODE: Final = 65_535


def step_of(unit: str) -> float:
    """Distance between two neighbouring values kept for a unit; 0.001 for units without an entry."""
    return STEPS.get(unit, 0.001)


def quantise(values: ArrayLike, step: float) -> tuple[NDArray[Any], float, float]:
    """Codes of values: 0 for no value, else 1 + (value − offset)/step, rounded.

    Parameters
    ----------
    values : array_like
        Any shape; NaN and infinities have no value.
    step : float
        Wanted distance between neighbouring codes. Doubled until 16 bits are enough for the range.

    Returns
    -------
    codes : ndarray
        uint16, the shape of `values`.
    offset, step : float
        value = offset + (code − 1)·step.

    Examples
    --------
    >>> codes, offset, step = quantise([1.0, float("nan"), 1.5], 0.25)
    >>> codes.tolist(), offset, step
    ([1, 0, 3], 1.0, 0.25)
    """
    given = np.asarray(values, dtype=np.float64)
    good = np.isfinite(given)
    if not good.any():
        return np.zeros(given.shape, dtype=np.uint16), 0.0, step
    low, high = float(given[good].min()), float(given[good].max())
    while np.floor(high / step) - np.floor(low / step) > MOST_CODE - 2:
        step *= 2.0
    first = np.floor(low / step)
    codes = np.zeros(given.shape, dtype=np.uint16)
    codes[good] = (np.rint(given[good] / step) - first + 1).astype(np.uint16)
    return codes, float(first * step), step


def degrees_as_integers(degrees: ArrayLike, *, decimals: int) -> NDArray[np.uint32]:
    """Longitudes or latitudes as unsigned integers: (degree + 720)·10^decimals, rounded."""
    shifted = (np.asarray(degrees, dtype=np.float64) + 720.0) * 10.0**decimals
    return np.rint(shifted).astype(np.uint32)
