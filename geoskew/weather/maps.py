"""The digital maps of the ITU-R P series, read once from the data that the package `itur` carries.

Only its data files are read. The package itself is never imported here: that would cost some five
seconds of processor time, and its functions are slow on arrays and do not broadcast per-place angles.
"""

from __future__ import annotations

import threading
from functools import cache
from importlib.util import find_spec
from math import log
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from geoskew.errors import GeoskewError
from geoskew.weather.lattice import Corners, Lattice, bicubic, bilinear, corners

FloatArray = NDArray[np.float64]

# Percentages of an average year that the maps of P.836 and P.840 are tabulated for.
TABULATED_PERCENTAGES = (0.1, 0.2, 0.3, 0.5, 1, 2, 3, 5, 10, 20, 30, 50, 60, 70, 80, 90, 95, 99)

# Height of the rain above the mean 0 °C isotherm, km: P.839-4, eq. (1).
RAIN_ABOVE_ISOTHERM_KM = 0.36

# Folder of a recommendation → (rows, columns, north first, south, west, nodes per degree, wrap).
_LAYOUTS: dict[str, tuple[int, int, bool, float, float, float, float]] = {
    "837/v7_r001": (1441, 2881, False, -90.0, -180.0, 8.0, -180.0),
    "839/v4_esa0height": (121, 241, True, -90.0, 0.0, 1 / 1.5, 0.0),
    "840/v7_lred": (161, 321, True, -90.0, 0.0, 1 / 1.125, 0.0),
    "453/v13_nwet_annual": (241, 481, False, -90.0, -180.0, 1 / 0.75, -180.0),
    "836/v6_v": (161, 321, True, -90.0, 0.0, 1 / 1.125, 0.0),
    "836/v6_rho": (161, 321, True, -90.0, 0.0, 1 / 1.125, 0.0),
    "836/v6_vsch": (161, 321, True, -90.0, 0.0, 1 / 1.125, 0.0),
    "836/v6_topo_0dot5": (363, 723, True, -90.5, -0.5, 2.0, 0.0),
    "1510/v1_t_annual": (241, 481, False, -90.0, -180.0, 1 / 0.75, -180.0),
    "1511/v2_topo": (2164, 4324, True, -90.125, -180.125, 12.0, -180.0),
}

_LOCK = threading.RLock()
_LOADED: dict[str, Lattice] = {}


@cache
def data_file(name: str) -> Path:
    """Path of one data file of the package `itur`, found without importing the package.

    Raises
    ------
    GeoskewError
        The package or the file is not installed.
    """
    spec = find_spec("itur")
    for folder in (spec.submodule_search_locations or []) if spec is not None else []:
        path = Path(folder) / "data" / name
        if path.is_file():
            return path
    raise GeoskewError(
        f"the weather map {name} of the ITU-R P series is not installed; "
        "install the package that carries it: pip install 'itur>=0.4,<0.5'"
    )


def lattice(name: str, percentage: float | None = None) -> Lattice:
    """One map; read at its first use, under a lock, and kept."""
    key = name if percentage is None else f"{name}_{f'{percentage:g}'.replace('.', '')}"
    found = _LOADED.get(key)
    if found is None:
        with _LOCK:
            found = _LOADED.get(key)
            if found is None:
                found = _LOADED[key] = _read(key, name)
    return found


def _read(key: str, name: str) -> Lattice:
    rows, columns, north_first, south, west, per_degree, wrap = _LAYOUTS[name]
    path = data_file(f"{key}.npz")
    with np.load(path) as archive:
        values = archive["arr_0"]
    if values.shape != (rows, columns):
        raise GeoskewError(
            f"{path}: the map has {values.shape} nodes, not {(rows, columns)}; "
            "install the edition of the package that is known to fit: pip install 'itur>=0.4,<0.5'"
        )
    # The topography is in whole metres: a quarter of the memory, and no digit lost.
    kind = np.int16 if name == "1511/v2_topo" else np.float64
    values = np.ascontiguousarray(values[::-1] if north_first else values, dtype=kind)
    return Lattice(values, south, west, per_degree, wrap)


def rain_rate(longitude: FloatArray, latitude: FloatArray) -> FloatArray:
    """Rain rate exceeded for 0.01 % of an average year, mm/h: P.837-7, bilinear on 0.125°."""
    return bilinear(lattice("837/v7_r001"), longitude, latitude)


def rain_height(longitude: FloatArray, latitude: FloatArray) -> FloatArray:
    """Mean annual rain height above mean sea level, km: P.839-4, bilinear on 1.5°."""
    return bilinear(lattice("839/v4_esa0height"), longitude, latitude) + RAIN_ABOVE_ISOTHERM_KM


def topography(longitude: FloatArray, latitude: FloatArray) -> FloatArray:
    """Height of the ground above mean sea level, km: P.1511-2, bicubic on 1/12°.

    Ground below sea level counts as 0, as where the maps of the other recommendations are made.
    """
    metres = bicubic(lattice("1511/v2_topo"), longitude, latitude)
    return np.asarray(np.maximum(metres, 0.0) / 1000.0)


def surface_temperature(longitude: FloatArray, latitude: FloatArray) -> FloatArray:
    """Annual mean temperature 2 m above the surface, K: P.1510-1, bilinear on 0.75°."""
    return bilinear(lattice("1510/v1_t_annual"), longitude, latitude)


def wet_refractivity(longitude: FloatArray, latitude: FloatArray) -> FloatArray:
    """Median wet term of the surface refractivity, N-units: P.453-13, bilinear on 0.75°."""
    return bilinear(lattice("453/v13_nwet_annual", 50), longitude, latitude)


def cloud_liquid(longitude: FloatArray, latitude: FloatArray, *, percentage: float) -> FloatArray:
    """Reduced columnar cloud liquid water exceeded for a percentage of an average year, kg/m².

    P.840-8 Annex 1 §3.1: bilinear on 1.125°, linear in the logarithm of the percentage.
    """
    total: FloatArray | float = 0.0
    for tabulated, weight in bracket(percentage):
        total = total + weight * bilinear(lattice("840/v7_lred", tabulated), longitude, latitude)
    return np.asarray(total)


def bracket(percentage: float) -> list[tuple[float, float]]:
    """Tabulated percentages around one, with weights linear in the logarithm.

    Raises
    ------
    ValueError
        The percentage is outside of the tabulated range.
    """
    table = TABULATED_PERCENTAGES
    if percentage in table:
        return [(percentage, 1.0)]
    if not table[0] < percentage < table[-1]:
        raise ValueError(f"percentage {percentage}: the maps hold {table[0]} to {table[-1]} % of a year")
    upper = next(index for index, value in enumerate(table) if value > percentage)
    below, above = table[upper - 1], table[upper]
    share = (log(percentage) - log(below)) / (log(above) - log(below))
    return [(below, 1.0 - share), (above, share)]


def water_vapour(
    longitude: FloatArray, latitude: FloatArray, height_km: FloatArray, *, percentages: tuple[float, ...]
) -> list[tuple[FloatArray, FloatArray]]:
    """Surface density and total column of water vapour at the places' own heights.

    P.836-6 Annexes 1 and 2: each of the four nodes around a place is brought to the place's height
    with the node's own scale height, then bilinear on 1.125°, linear in the logarithm of p.

    Parameters
    ----------
    longitude, latitude, height_km : ndarray
        Degrees and km above mean sea level; shapes that broadcast.
    percentages : tuple of float
        Percentages of an average year.

    Returns
    -------
    list of (density, column)
        For each percentage: g/m³ and kg/m², of the common shape.
    """
    around = corners(lattice("836/v6_v", 50), longitude, latitude)
    climbs = {
        (north, east): around.take(_node_heights(), north, east) - height_km
        for north in (0, 1)
        for east in (0, 1)
    }
    return [_vapour_at(around, climbs, percentage) for percentage in percentages]


def _vapour_at(
    around: Corners, climbs: dict[tuple[int, int], FloatArray], percentage: float
) -> tuple[FloatArray, FloatArray]:
    density: FloatArray | float = 0.0
    column: FloatArray | float = 0.0
    for tabulated, share in bracket(percentage):
        inverse_scale = _inverse_scale_height(tabulated)
        densities = lattice("836/v6_rho", tabulated).values
        columns = lattice("836/v6_v", tabulated).values
        for (north, east), climb in climbs.items():
            weight = np.exp(climb * around.take(inverse_scale, north, east))
            weight *= share * around.weight(north, east)
            density = density + weight * around.take(np.asarray(densities, float), north, east)
            column = column + weight * around.take(np.asarray(columns, float), north, east)
    return np.asarray(density), np.asarray(column)


def vapour_nodes(tabulated: float) -> tuple[FloatArray, FloatArray, FloatArray, FloatArray]:
    """Height in km, 1/(scale height), density in g/m³ and column in kg/m² of all nodes of P.836-6."""
    densities, columns = (
        np.asarray(lattice(name, tabulated).values, dtype=np.float64) for name in ("836/v6_rho", "836/v6_v")
    )
    return _node_heights(), _inverse_scale_height(tabulated), densities, columns


@cache
def _inverse_scale_height(percentage: float) -> FloatArray:
    return np.asarray(1.0 / lattice("836/v6_vsch", percentage).values)


@cache
def _node_heights() -> FloatArray:
    """Heights of the nodes of P.836-6, km, from the topography that belongs to its maps."""
    nodes = lattice("836/v6_v", 50)
    rows, columns = nodes.values.shape
    latitude = (nodes.south + np.arange(rows) / nodes.per_degree)[:, None]
    longitude = (nodes.west + np.arange(columns) / nodes.per_degree)[None, :]
    return bicubic(lattice("836/v6_topo_0dot5"), longitude, latitude)
