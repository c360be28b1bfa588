"""What is to be done at each place."""

from __future__ import annotations

from typing import Final

import numpy as np
from numpy.typing import ArrayLike, NDArray

# Codes and names of the layer `action`.
ACTIONS: Final[tuple[tuple[int, str], ...]] = (
    (0, "leave"),
    (1, "preset"),
    (2, "turn-at-changeover"),
    (3, "re-aim"),
    (4, "upgrade"),
    (5, "no-sight"),
)
LEAVE, PRESET, TURN_AT_CHANGEOVER, RE_AIM, UPGRADE, NO_SIGHT = range(6)


def action(
    *,
    new_satellite_usable: ArrayLike,
    margin_untouched: ArrayLike,
    margin_realigned: ArrayLike,
    best_without_aiming: ArrayLike,
    window_exists: ArrayLike,
    reserve_db: float,
    slots_differ: bool,
    turning_helps: bool = True,
) -> NDArray[np.uint8]:
    """The first action that applies, by code.

    Parameters
    ----------
    new_satellite_usable : array_like of bool
        False: below the lowest usable elevation, or blocked.
    margin_untouched, margin_realigned, best_without_aiming : array_like
        Deciding margins after the changeover, dB: nothing done; dish and feed set for the new
        satellite; feed alone set for it while the dish keeps the old aim. NaN (no coverage, or the
        old satellite never seen) keeps no reserve.
    window_exists : array_like of bool
        Whether one setting keeps what both moments are held to.
    turning_helps : bool
        False for circular polarisation, where no turn changes anything.

    Returns
    -------
    ndarray of uint8
        Broadcast shape; `no-sight` where the new satellite serves nobody.
    """
    conditions = np.broadcast_arrays(
        ~np.asarray(new_satellite_usable, dtype=bool),
        ~(np.asarray(margin_realigned) >= reserve_db),
        np.asarray(margin_untouched) >= reserve_db,
        np.asarray(window_exists, dtype=bool) & turning_helps,
        slots_differ & ~(np.asarray(best_without_aiming) >= reserve_db),
    )
    codes = [NO_SIGHT, UPGRADE, LEAVE, PRESET, RE_AIM]
    return np.select(list(conditions), codes, default=TURN_AT_CHANGEOVER).astype(np.uint8)
