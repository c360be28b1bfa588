"""Kilometres on the road between bases and sites: great circles with a detour factor, or a file."""

from __future__ import annotations

import csv
from collections.abc import Mapping
from dataclasses import dataclass, field
from pathlib import Path
from typing import Final

import numpy as np
from numpy.typing import ArrayLike, NDArray

from geoskew.errors import InputError, Problem

# Mean radius R1 of WGS 84, km (NGA.STND.0036): a sphere is good to 0.6 %, well inside the detour factor.
_EARTH_RADIUS_KM: Final = 6371.0088


@dataclass(frozen=True)
class Distances:
    """Distances between numbered places (bases first, then sites), km.

    ``known`` holds roads out of a file as (from, to) → km, each way; a pair that it lacks takes the
    great circle times ``detour``.
    """

    longitude: NDArray[np.float64]
    latitude: NDArray[np.float64]
    detour: float = 1.3
    known: Mapping[tuple[int, int], float] = field(default_factory=dict)

    def km(self, origin: ArrayLike, target: ArrayLike) -> NDArray[np.float64]:
        """Kilometres between places given by their numbers; arrays broadcast.

        The haversine formula; NaN where a coordinate is NaN.
        """
        i, j = np.broadcast_arrays(np.asarray(origin, dtype=np.intp), np.asarray(target, dtype=np.intp))
        lat_i, lat_j = np.radians(self.latitude[i]), np.radians(self.latitude[j])
        half_lat = (lat_j - lat_i) / 2.0
        half_lon = np.radians(self.longitude[j] - self.longitude[i]) / 2.0
        a = np.sin(half_lat) ** 2 + np.cos(lat_i) * np.cos(lat_j) * np.sin(half_lon) ** 2
        km: NDArray[np.float64] = (
            2.0 * _EARTH_RADIUS_KM * np.arcsin(np.sqrt(np.clip(a, 0.0, 1.0))) * self.detour
        )
        if self.known:
            km = np.array(km)
            for place in np.ndindex(km.shape):
                given = self.known.get((int(i[place]), int(j[place])))
                if given is not None:
                    km[place] = given
        return km

    def between(self, origin: int, target: int, share: float) -> tuple[float, float]:
        """Longitude and latitude of the point of the great circle at a share of the way, degrees."""
        ends = np.radians([[self.longitude[k], self.latitude[k]] for k in (origin, target)])
        vectors = np.column_stack(
            (
                np.cos(ends[:, 1]) * np.cos(ends[:, 0]),
                np.cos(ends[:, 1]) * np.sin(ends[:, 0]),
                np.sin(ends[:, 1]),
            )
        )
        angle = float(np.arctan2(np.linalg.norm(np.cross(*vectors)), vectors[0] @ vectors[1]))
        if angle < 1e-12:
            return float(self.longitude[target]), float(self.latitude[target])
        x, y, z = np.sin((1.0 - share) * angle) * vectors[0] + np.sin(share * angle) * vectors[1]
        return float(np.degrees(np.arctan2(y, x))), float(np.degrees(np.arctan2(z, np.hypot(x, y))))

    def matrix(self, places: ArrayLike) -> NDArray[np.float64]:
        """The square matrix between some places, km; 0 on the diagonal."""
        number = np.asarray(places, dtype=np.intp)
        km = self.km(number[:, None], number[None, :])
        np.fill_diagonal(km, 0.0)
        return km


def read_distances(path: Path, names: Mapping[str, int]) -> dict[tuple[int, int], float]:
    """Read roads out of a CSV file with the columns ``from``, ``to``, ``km``.

    Parameters
    ----------
    path : Path
        UTF-8, comma; ``from`` and ``to`` are site ids, or ``base:NAME`` for a crew's base. A pair that
        is given one way only counts both ways, of two that differ the longer counts; pairs of unknown
        names are passed over.
    names : mapping
        Number of each place by its name.

    Returns
    -------
    dict
        (from, to) → km.

    Raises
    ------
    InputError
        The file cannot be read, a column is missing, or a distance is not a number of km from 0 up; all
        such lines are listed.
    """
    try:
        with path.open(encoding="utf-8-sig", newline="") as stream:
            rows = csv.DictReader(stream)
            missing = {"from", "to", "km"} - set(rows.fieldnames or ())
            if missing:
                lacks = ", ".join(sorted(missing))
                raise InputError(
                    Problem(f"the column {lacks} is missing; give from,to,km", file=path, line=1)
                )
            return _roads(path, [(rows.line_num, row) for row in rows], names)
    except UnicodeDecodeError as error:
        raise InputError(
            Problem(f"byte {error.start} is not UTF-8; save the file as UTF-8", file=path)
        ) from error
    except (OSError, csv.Error) as error:
        reason = getattr(error, "strerror", None) or str(error)
        raise InputError(Problem(f"the file of distances cannot be read: {reason}", file=path)) from error


def _roads(
    path: Path, rows: list[tuple[int, dict[str, str]]], names: Mapping[str, int]
) -> dict[tuple[int, int], float]:
    one_way: dict[tuple[int, int], float] = {}
    problems: list[Problem] = []
    for line, row in rows:
        try:
            km = float(row["km"])
        except (TypeError, ValueError):
            km = np.nan
        if not (np.isfinite(km) and km >= 0.0):
            problems.append(Problem(f"{row['km']!r} is not a distance in km from 0 up", file=path, line=line))
            continue
        origin, target = names.get(row["from"]), names.get(row["to"])
        if origin is not None and target is not None:
            one_way[origin, target] = km
    if problems:
        raise InputError(problems)
    # Tours may be driven either way round: of two directions that differ the longer one counts.
    return {
        pair: max(km, one_way.get((pair[1], pair[0]), 0.0))
        for (i, j), km in one_way.items()
        for pair in ((i, j), (j, i))
    }
