"""The registry of layers: a frozen record a layer, and one dictionary.

Adding a layer is adding one decorated function to a module of ``geoskew.catalogue``. Everything
that speaks of layers (GeoTIFF tags, table headings, legends, contours, ``geoskew layers``) reads
the record; no other list of layers exists.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Any, Final, Literal

import numpy as np
from numpy.typing import NDArray

from geoskew.ramps import RAMPS

Kind = Literal["continuous", "circular", "category", "flag"]

UNITS: Final = frozenset({"deg", "km", "dB", "dBW", "percent", "hours/year", ""})


@dataclass(frozen=True, slots=True)
class Layer:
    """What is to be known of a layer.

    ``kind``: ``continuous``; ``circular`` with its ``period`` in degrees (360 or 180), whose values
    close on themselves; ``category`` with ``classes`` (code to name); ``flag`` (0 or 1).
    ``needs``: parts of the scenario without which the layer is not offered, of ``"weather"``,
    ``"terrain"``. ``of``: the satellites (``"before"``, ``"after"``) below whose lowest usable
    elevation a place has no value. ``limits``: what the colour ramp spans; ``contour_step``: distance between
    isolines in the layer's unit, 0 for none. ``where``: ``"both"``, or ``"sites"`` for layers that
    exist for site lists only.
    """

    name: str
    unit: str
    description: str
    kind: Kind
    ramp: str
    limits: tuple[float, float]
    contour_step: float
    compute: Callable[[Any], NDArray[Any]]
    period: float = 0.0
    classes: tuple[tuple[int, str], ...] = ()
    needs: frozenset[str] = frozenset()
    of: frozenset[str] = frozenset()
    where: Literal["both", "sites"] = "both"

    @property
    def is_class(self) -> bool:
        """Whether values are codes, stored as uint8 with 255 as nodata."""
        return self.kind in ("category", "flag")

    @property
    def title(self) -> str:
        """Description with the unit, for a band's description or a heading."""
        return f"{self.description} ({self.unit})" if self.unit else self.description


REGISTRY: Final[dict[str, Layer]] = {}


def layer(
    *,
    unit: str,
    description: str,
    ramp: str,
    limits: tuple[float, float],
    contour_step: float = 0.0,
    kind: Kind = "continuous",
    period: float = 0.0,
    classes: tuple[tuple[int, str], ...] = (),
    needs: tuple[str, ...] = (),
    of: tuple[str, ...] = (),
    where: Literal["both", "sites"] = "both",
) -> Callable[[Callable[[Any], NDArray[Any]]], Callable[[Any], NDArray[Any]]]:
    """Register a function of a situation as the layer of the function's name."""

    def register(compute: Callable[[Any], NDArray[Any]]) -> Callable[[Any], NDArray[Any]]:
        name = compute.__name__
        if name in REGISTRY:
            raise RuntimeError(f"layer {name} is registered twice")
        if ramp not in RAMPS:
            raise RuntimeError(f"layer {name}: ramp {ramp!r} is not in geoskew.ramps")
        if unit not in UNITS:
            raise RuntimeError(f"layer {name}: unit {unit!r} is not one of {sorted(UNITS)}")
        if (kind == "circular") != (period > 0):
            raise RuntimeError(f"layer {name}: a circular layer, and only that, has a period")
        REGISTRY[name] = Layer(
            name=name,
            unit=unit,
            description=description,
            kind=kind,
            ramp=ramp,
            limits=limits,
            contour_step=contour_step,
            compute=compute,
            period=period,
            classes=classes,
            needs=frozenset(needs),
            of=frozenset(of),
            where=where,
        )
        return compute

    return register


def nan_like(shape: tuple[int, ...]) -> NDArray[np.float64]:
    """An array without values."""
    return np.full(shape, np.nan)
