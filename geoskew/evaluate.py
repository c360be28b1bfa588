"""Layers of a scenario at places: the same function for a point, a site list and a block of a grid."""

from __future__ import annotations

from collections.abc import Callable, Iterable
from typing import Any

import numpy as np
from numpy.typing import NDArray

import geoskew.catalogue  # noqa: F401  (fills the registry)
from geoskew.errors import InputError
from geoskew.layers import REGISTRY, Layer
from geoskew.places import Places
from geoskew.scenario import Scenario
from geoskew.situation import Inputs, Situation

NO_CLASS = 255


def available(scenario: Scenario, *, sites: bool = True) -> tuple[str, ...]:
    """Names of the layers that a scenario can give, in order; with `sites` those of lists too."""
    has = {part for part in ("weather", "terrain") if getattr(scenario, part) is not None}
    return tuple(
        name for name, record in REGISTRY.items() if record.needs <= has and (sites or record.where == "both")
    )


def chosen(scenario: Scenario, names: Iterable[str] | None, *, sites: bool = True) -> tuple[str, ...]:
    """Layers asked for by name, or all that the scenario can give.

    Raises
    ------
    InputError
        A name that no layer has, or a layer for which the scenario lacks a part.
    """
    can = available(scenario, sites=sites)
    if names is None:
        return can
    asked = tuple(dict.fromkeys(names))
    for name in asked:
        if name not in REGISTRY:
            raise InputError(_unknown(name))
        if name not in can:
            needs = sorted(REGISTRY[name].needs)
            why = f"needs [{']['.join(needs)}] in the scenario" if needs else "exists for site lists only"
            raise InputError(f"layer {name} {why}; add that part or leave the layer out")
    return asked


def _unknown(name: str) -> str:
    from difflib import get_close_matches

    close = get_close_matches(name, REGISTRY, n=1)
    hint = f"did you mean {close[0]}? " if close else ""
    return f"no layer is named {name!r}; {hint}'geoskew layers' lists them all"


def evaluate(
    scenario: Scenario,
    places: Places,
    names: Iterable[str] | None = None,
    *,
    inputs: Inputs | None = None,
    compiled: bool = False,
) -> dict[str, NDArray[Any]]:
    """Values of layers at places.

    Parameters
    ----------
    scenario : Scenario
    places : Places
        Any shape.
    names : iterable of str, optional
        Layers; all that the scenario can give when left out.
    inputs : Inputs, optional
        From `situation.prepare`, to read the scenario's files only once for many blocks.

    compiled : bool
        Take compiled loops for the layers that they cover, within 1e-4 degrees and dB: for blocks of a
        grid that is large enough to pay for the compiler. Needs numba; ask `kernels.ready` before.

    Returns
    -------
    dict of str to ndarray
        float64, or uint8 for classes and flags, in the places' shape. No value: NaN, or 255. Out of
        compiled loops float32, and two layers that are alike may share one array.

    Raises
    ------
    InputError
        A layer that does not exist or that the scenario cannot give.
    """
    wanted = chosen(scenario, names)
    with np.errstate(invalid="ignore"):
        if compiled:
            return _compiled(scenario, places, wanted, inputs)
        situation = Situation(scenario, places, inputs)
        return {name: _values(REGISTRY[name], situation) for name in wanted}


def _compiled(
    scenario: Scenario, places: Places, wanted: tuple[str, ...], inputs: Inputs | None
) -> dict[str, NDArray[Any]]:
    from geoskew.situation import compiled

    if not compiled.suits(places):
        situation = Situation(scenario, places, inputs)
        return {name: _values(REGISTRY[name], situation) for name in wanted}
    fast = compiled.CompiledSituation(scenario, places, inputs, wanted)
    return {name: _values(REGISTRY[name], fast, fast.maker(name)) for name in wanted}


def _values(
    record: Layer, situation: Situation, make: Callable[[], NDArray[Any]] | None = None
) -> NDArray[Any]:
    wanted = np.ones((), dtype=bool)
    if "before" in record.of:
        wanted = wanted & situation.usable_before
    if "after" in record.of:
        wanted = wanted & situation.usable_after
    if situation.places.inside is not None:
        wanted = wanted & situation.places.inside
    values = np.asarray(record.compute(situation) if make is None else make())
    none = NO_CLASS if record.is_class else np.nan
    kind = np.uint8 if record.is_class else np.float64 if make is None else np.float32
    shape = situation.places.shape
    if wanted.all():
        if make is not None and values.shape == shape and values.dtype == kind:
            return values
        return np.array(np.broadcast_to(values, shape), dtype=kind)
    return np.array(np.broadcast_to(np.where(wanted, values, none), shape), dtype=kind)
