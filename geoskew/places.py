"""Places: where something is asked for. A grid, a site list and a single point are all Places."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Any

import numpy as np
from numpy.typing import ArrayLike, NDArray


@dataclass(frozen=True)
class Places:
    """Broadcastable longitude, latitude and height, with what is known of each place.

    Attributes
    ----------
    longitude, latitude : ndarray
        Degrees, WGS 84. A geographic grid keeps longitude as (1, W) and latitude as (H, 1), a
        projected grid both as (H, W), a site list both as (N,), one point both as ().
    height : ndarray
        Metres above the ellipsoid (above mean sea level is accepted: below 0.001° in every angle);
        NaN where it is not known. Broadcastable with the other two.
    inside : ndarray of bool or None
        False where no value is wanted (outside of a region's outline); None: wanted everywhere.
    columns : mapping of str to ndarray
        What is known of each place on its own, by the reserved column names of the site list:
        keys of ``[terminal]`` and ``setting_deg``; NaN where the place has no value of its own.
    """

    longitude: NDArray[np.float64]
    latitude: NDArray[np.float64]
    height: NDArray[np.float64]
    inside: NDArray[np.bool_] | None = None
    columns: Mapping[str, NDArray[Any]] = field(default_factory=dict)

    @classmethod
    def of(cls, longitude: ArrayLike, latitude: ArrayLike, height: ArrayLike = np.nan, **more: Any) -> Places:
        """Places of plain numbers or sequences, converted to float64 arrays."""
        return cls(
            np.asarray(longitude, dtype=np.float64),
            np.asarray(latitude, dtype=np.float64),
            np.asarray(height, dtype=np.float64),
            **more,
        )

    @property
    def shape(self) -> tuple[int, ...]:
        """The common shape of all arrays."""
        return np.broadcast_shapes(self.longitude.shape, self.latitude.shape, self.height.shape)

    @property
    def geometric_height(self) -> NDArray[np.float64]:
        """Height for geometry, metres: 0 where it is not known."""
        return np.nan_to_num(self.height, nan=0.0)
