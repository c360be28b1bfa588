"""Colour ramps by name: readable in greyscale and for colour-blind readers.

Stops are (position 0..1, "#rrggbb"), interpolated linearly in sRGB. Sequential ramps rise or fall
steadily in lightness; diverging ones are blue to orange about a light centre; cyclic ones close.
The class colours differ in lightness as well as in hue, and every class also has a shape.
"""

from __future__ import annotations

from typing import Final

import numpy as np
from numpy.typing import ArrayLike, NDArray

RAMPS: Final[dict[str, tuple[tuple[float, str], ...]]] = {
    # dark (little) to light (much): levels, ranges, elevations
    "level": ((0.0, "#12233f"), (0.35, "#3b5b7a"), (0.7, "#9aa987"), (1.0, "#f5e9a9")),
    # light (no loss) to dark (much loss)
    "loss": ((0.0, "#fbf6e6"), (0.35, "#e3b97c"), (0.7, "#a85a3f"), (1.0, "#3d1425")),
    # negative blue, zero light, positive orange: margins, turns
    "signed": ((0.0, "#14375e"), (0.25, "#5f8fb4"), (0.5, "#f4f2ec"), (0.75, "#d8945a"), (1.0, "#6e2c06")),
    # bad margins dark orange, zero light, good margins blue
    "margin": ((0.0, "#6e2c06"), (0.25, "#d8945a"), (0.5, "#f4f2ec"), (0.75, "#5f8fb4"), (1.0, "#14375e")),
    # closes on itself
    "cycle": ((0.0, "#efe6d8"), (0.25, "#b9784a"), (0.5, "#2b2440"), (0.75, "#4f86a3"), (1.0, "#efe6d8")),
    # categories: colours come from CLASS_COLOURS by code
    "classes": ((0.0, "#4a7a68"), (1.0, "#20191d")),
}

# Colour and shape a code of the layer `action`; flags use codes 0 and 1 of FLAG_COLOURS.
CLASS_COLOURS: Final[dict[int, str]] = {
    0: "#a9c9b4",  # leave
    1: "#3f86b5",  # preset
    2: "#e0a02e",  # turn-at-changeover
    3: "#8a4f9e",  # re-aim
    4: "#b5402f",  # upgrade
    5: "#2c2a30",  # no-sight
}
CLASS_SHAPES: Final[dict[int, str]] = {
    0: "dot",
    1: "square",
    2: "triangle",
    3: "diamond",
    4: "cross",
    5: "bar",
}
FLAG_COLOURS: Final[dict[int, str]] = {0: "#e8e4da", 1: "#8c3b1f"}


def _rgb(colour: str) -> tuple[int, int, int]:
    return int(colour[1:3], 16), int(colour[3:5], 16), int(colour[5:7], 16)


def colours(ramp: str, position: ArrayLike) -> NDArray[np.uint8]:
    """Colours of a ramp at positions 0..1 (clipped), as uint8 with a last axis of red, green, blue."""
    stops = RAMPS[ramp]
    where = np.clip(np.asarray(position, dtype=np.float64), 0.0, 1.0)
    at = [stop for stop, _ in stops]
    channels = [np.interp(where, at, [_rgb(colour)[channel] for _, colour in stops]) for channel in range(3)]
    return np.rint(np.stack(channels, axis=-1)).astype(np.uint8)
