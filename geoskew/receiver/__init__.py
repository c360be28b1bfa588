"""The receiving terminal: dish gain and width, reference patterns, noise and figure of merit.

Arrays and floats in, arrays out; everything broadcasts, and NaN in gives NaN out. The module knows
nothing of scenarios: per-site dishes are simply arrays of `diameter_m` and `efficiency`.
"""

from __future__ import annotations

from geoskew.receiver.antenna import (
    antenna_gain,
    free_space_loss,
    half_power_beamwidth,
    pointing_loss,
    wavelength,
)
from geoskew.receiver.dish import (
    interference_gain,
    interference_gain_cross,
    isolation_off_axis,
    wanted_gain_loss,
)
from geoskew.receiver.masks import (
    MASKS,
    bo1213_co,
    bo1213_cross,
    bo1213_discrimination,
    mask_name,
    s465,
    s580,
)
from geoskew.receiver.noise import (
    figure_of_merit,
    medium_temperature,
    noise_figure_temperature,
    sky_noise,
    system_noise_temperature,
)

__all__ = [
    "MASKS",
    "antenna_gain",
    "bo1213_co",
    "bo1213_cross",
    "bo1213_discrimination",
    "figure_of_merit",
    "free_space_loss",
    "half_power_beamwidth",
    "interference_gain",
    "interference_gain_cross",
    "isolation_off_axis",
    "mask_name",
    "medium_temperature",
    "noise_figure_temperature",
    "pointing_loss",
    "s465",
    "s580",
    "sky_noise",
    "system_noise_temperature",
    "wanted_gain_loss",
    "wavelength",
]
