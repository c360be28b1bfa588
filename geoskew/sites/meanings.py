"""Columns of a site list that have a meaning, and what their cells may hold.

The keys of ``[terminal]`` are checked by the rules of the scenario itself, so that a value that is
refused there is refused here.
"""

from __future__ import annotations

from typing import Annotated, Final, Literal

import numpy as np
from numpy.typing import NDArray
from pydantic import ValidationError

from geoskew.scenario.ground import RESERVED_COLUMNS, Terminal
from geoskew.scenario.parts import Table
from geoskew.scenario.values import choice, number

REQUIRED: Final = ("id", "lat", "lon")
RESERVED: Final = RESERVED_COLUMNS


class SiteValues(Table):
    """Columns of a site list that are no keys of ``[terminal]``."""

    height_m: Annotated[float, number("metres above sea level or the ellipsoid", low=-500, high=9000)] = 0.0
    antenna_height_m: Annotated[float, number("a height above ground in metres", low=0, high=500)] = 0.0
    setting_deg: Annotated[float, number("the feed's present setting", low=-180, high=180)] = 0.0
    feed_low_deg: Annotated[float, number("the feed's stop in degrees", low=-360, high=360)] = 0.0
    feed_high_deg: Annotated[float, number("the feed's stop in degrees", low=-360, high=360)] = 0.0
    scale_zero_deg: Annotated[float, number("the setting at the scale's zero", low=-360, high=360)] = 0.0
    scale_sense: Annotated[
        Literal["clockwise", "counter-clockwise"], choice("sense", "clockwise", "counter-clockwise")
    ] = "clockwise"
    weight: Annotated[float, number("how much the site counts", low=0, high=1e9)] = 1.0


_MODELS: Final[tuple[type[Table], ...]] = (Terminal, SiteValues)
WHOLE_NUMBERS: Final = tuple(key for key, found in Terminal.model_fields.items() if found.annotation is int)
NUMBERS: Final = tuple(
    key for model in _MODELS for key, found in model.model_fields.items() if found.annotation in (float, int)
)
YES_NO: Final = (
    *(key for key, found in Terminal.model_fields.items() if found.annotation is bool),
    "feed_fixed",
)
CHOICES: Final = ("mount", "receive_mask", "scale_sense")
# What a place may have of its own, for the physics: numbers of [terminal], its height, its setting.
PLACE_COLUMNS: Final = (
    *(key for key in NUMBERS if key in Terminal.model_fields),
    "setting_deg",
    "antenna_height_m",
    "scale_zero_deg",
)


def refusal(key: str, value: float | str) -> str | None:
    """Say what is wrong with a value of a column, or None where nothing is."""
    model = Terminal if key in Terminal.model_fields else SiteValues
    try:
        model.model_validate({key: value})
    except ValidationError as error:
        return str(error.errors()[0]["msg"])
    return None


def refusals(key: str, values: NDArray[np.float64]) -> dict[float, str]:
    """Map the values of a column of numbers that are refused to what is wrong with them; NaN is skipped."""
    given = values[~np.isnan(values)]
    if given.size == 0:
        return {}
    # Rules for numbers are intervals: where both ends pass, so does all between. Whole numbers are not.
    ends = (float(given.min()), float(given.max()))
    if key not in WHOLE_NUMBERS and not any(refusal(key, end) for end in ends):
        return {}
    found = {float(value): refusal(key, float(value)) for value in np.unique(given)}
    return {value: message for value, message in found.items() if message is not None}
