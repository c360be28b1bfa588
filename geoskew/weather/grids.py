"""Clear-air gas over blocks of a large geographic grid, by compiled loops."""

from __future__ import annotations

from collections.abc import Sequence
from functools import lru_cache
from typing import Final

import numpy as np
from numpy.typing import NDArray

from geoskew.weather import maps
from geoskew.weather.climate import CLEAR_PERCENTAGE, clear_zenith
from geoskew.weather.lattice import is_separable
from geoskew.weather.zenith import RANGES, ZenithGas

FloatArray = NDArray[np.float64]

# From here on the height of the place weighs on the water vapour, which the loops leave out.
_HEIGHT_MATTERS_GHZ: Final = 20.0


def clear_zenith_over(
    longitude: FloatArray, latitude: FloatArray, height_m: FloatArray, *, frequencies_ghz: Sequence[float]
) -> FloatArray:
    """Gas towards the zenith in clear air, dB, (frequency, H, W); see `climate.clear_zenith`.

    By compiled loops where the places are rows and columns without known heights and the frequencies are
    below 20 GHz, else by the plain formulas.
    """
    plain = not is_separable(longitude, latitude) or not np.isnan(height_m).all()
    if plain or max(frequencies_ghz) >= _HEIGHT_MATTERS_GHZ:
        return np.stack(clear_zenith(longitude, latitude, height_m, frequencies_ghz=frequencies_ghz))
    from geoskew.kernels import gas

    lattice = maps.lattice("836/v6_v", CLEAR_PERCENTAGE)
    rows, up = lattice.rows(latitude)
    columns, right = lattice.columns(longitude)
    gases = [ZenithGas.at(float(frequency)) for frequency in frequencies_ghz]
    dry, moist, ratio = (np.stack([one.tables[part] for one in gases]) for part in range(3))
    out = np.empty((len(gases), latitude.shape[0], longitude.shape[1]))
    gas.clear_zenith(
        rows[:, 0].astype(np.int64),
        np.ascontiguousarray(up[:, 0]),
        columns[0].astype(np.int64),
        np.ascontiguousarray(right[0]),
        _nodes(),
        maps.topography(longitude, latitude),
        maps.surface_temperature(longitude, latitude),
        np.array(RANGES),
        dry,
        moist,
        ratio,
        out,
    )
    return out


@lru_cache(maxsize=1)
def _nodes() -> FloatArray:
    return np.ascontiguousarray(np.stack(maps.vapour_nodes(CLEAR_PERCENTAGE), axis=-1))
