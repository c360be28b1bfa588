"""Faults of rows: each row keeps every reason why it cannot be used."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
from numpy.typing import NDArray


class Faults:
    """Reasons by row. Only rows that are wrong cost anything.

    Attributes
    ----------
    bad : ndarray of bool
        Rows with a reason, (N,).
    reasons : dict of int to list of str
        By the row's index.
    """

    def __init__(self, rows: int) -> None:
        self.bad = np.zeros(rows, dtype=np.bool_)
        self.reasons: dict[int, list[str]] = {}

    def add(self, mask: NDArray[np.bool_], reason: Callable[[int], str]) -> None:
        """Give every row of a mask (N,) a reason, which is asked for by the row's index."""
        self.bad |= mask
        for row in np.flatnonzero(mask).tolist():
            self.reasons.setdefault(row, []).append(reason(row))
