"""How a layer's values are stored: type, rounding, nodata, predictor, overviews."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any, Final, Literal

import numpy as np
from numpy.typing import NDArray

from geoskew.errors import InputError, OutputError
from geoskew.layers import Layer

Precision = Literal["standard", "full"]

CLASS_NODATA: Final = 255

# Rounding by unit. A power of two clears low bits, so that files shrink to a fraction; 2^-10 is about
# 0.001 (degrees, dB, percent). At 40 000 km float32 itself resolves 2^-8 km: 2^-6 km is 16 m.
_DEFAULT_STEP: Final = 2.0**-10
_STEPS: Final[dict[str, float]] = {"km": 2.0**-6}


_STRIP_ROWS: Final = 128


@dataclass(frozen=True, slots=True)
class Storage:
    """What a layer's file holds: ``step`` is the rounding in the layer's unit, 0 for none."""

    dtype: Literal["float32", "uint8"]
    nodata: float
    step: float
    predictor: Literal[1, 2, 3]
    overviews: Literal["average", "nearest"]


def storage_of(layer: Layer, *, precision: Precision = "standard", nodata: float | None = None) -> Storage:
    """How a layer is stored.

    Classes are uint8 with 255 as nodata whatever ``nodata`` says. Overviews are averages, but the
    nearest cell's value for classes and for angles that close on themselves (359° and 1° would average
    to 180°). Rounded values go with the horizontal predictor, unrounded ones with that for floats.

    Raises
    ------
    InputError
        ``nodata`` is infinite or no float32 number; ``precision`` is unknown.
    """
    if precision not in ("standard", "full"):
        raise InputError(f'precision {precision!r} is unknown; give "standard" or "full"')
    if layer.is_class:
        return Storage("uint8", CLASS_NODATA, 0.0, 1, "nearest")
    declared = float("nan") if nodata is None else _as_float32(nodata)
    step = 0.0 if precision == "full" else _STEPS.get(layer.unit, _DEFAULT_STEP)
    overviews: Literal["average", "nearest"] = "nearest" if layer.kind == "circular" else "average"
    return Storage("float32", declared, step, 2 if step else 3, overviews)


def _as_float32(nodata: float) -> float:
    if np.isnan(nodata):
        return float("nan")
    with np.errstate(over="ignore"):
        stored = float(np.float32(nodata))
    if not np.isfinite(stored):
        raise InputError(f"nodata {nodata} does not fit a 32-bit float; give a number such as -9999")
    return stored


def encode(values: NDArray[Any], layer: Layer, storage: Storage) -> NDArray[Any]:
    """Values as they are stored, but for nodata: NaN stays (255 for classes).

    Rounding and the conversion to float32 never take a circular layer out of its range: 359.9999°
    becomes 0°, and -89.9999° becomes 90° where it would become -90°.

    Raises
    ------
    OutputError
        A value is infinite: a layer has a number or no value.
    """
    if storage.dtype == "uint8":
        if values.dtype == np.uint8:
            return values
        return np.where(np.isnan(values), CLASS_NODATA, values).astype(np.uint8)
    values = values if np.issubdtype(values.dtype, np.floating) else values.astype(np.float64)
    if values.ndim < 2:
        return _encoded(values, layer, storage)
    # Strips stay in the processor's cache, which a block with its temporary arrays does not.
    encoded = np.empty(values.shape, dtype=np.float32)
    for start in range(0, values.shape[0], _STRIP_ROWS):
        strip = slice(start, start + _STRIP_ROWS)
        encoded[strip] = _encoded(values[strip], layer, storage)
    return encoded


def _encoded(values: NDArray[Any], layer: Layer, storage: Storage) -> NDArray[np.float32]:
    stored = values
    if storage.step:
        # scaling by a power of two is exact in either float type
        stored = np.rint(values * values.dtype.type(1.0 / storage.step)) * values.dtype.type(storage.step)
    with np.errstate(over="ignore"):
        stored = stored.astype(np.float32)
    if layer.kind == "circular":
        stored = _back_in_range(stored, values, layer.period)
    # One NaN and one zero: NaN has many bit patterns and zero two, and bytes must not depend on that.
    stored = np.where(np.isnan(stored), np.float32(np.nan), stored + np.float32(0.0))
    if np.isinf(stored).any():
        raise OutputError(f"layer {layer.name}: an infinite value; a layer has a number or no value")
    return stored


def _back_in_range(stored: NDArray[np.float32], values: NDArray[Any], period: float) -> NDArray[np.float32]:
    """Turn by one period what only rounding carried to the open end of the range.

    Azimuths live in [0, 360), angles modulo 180 in (-90, 90]; a value given at the open end stays.
    """
    if period == 360.0:
        return np.where((stored >= 360.0) & (values < 360.0), np.float32(0.0), stored)
    half = np.float32(period / 2.0)
    return np.where((stored <= -half) & (values > -half), half, stored)


def burn(encoded: NDArray[Any], storage: Storage, layer: Layer, *, checked: bool = True) -> NDArray[Any]:
    """Encoded values with the declared nodata number in place of NaN.

    Averages may meet that number by chance: for these `checked` is false.

    Raises
    ------
    InputError
        The number is one of the layer's values.
    """
    if storage.dtype == "uint8" or np.isnan(storage.nodata):
        return encoded
    if checked and (encoded == np.float32(storage.nodata)).any():
        raise InputError(
            f"nodata {storage.nodata:g} is a value of layer {layer.name}; give a number that no layer takes, "
            "such as -9999"
        )
    return np.where(np.isnan(encoded), np.float32(storage.nodata), encoded)
