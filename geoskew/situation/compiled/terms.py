"""What the loops need to know of carriers, as plain numbers."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any, Final, NamedTuple

import numpy as np

from geoskew import receiver
from geoskew.geometry import Array
from geoskew.link import Response, carrier_to_noise, inverse, ratio
from geoskew.situation.sky import LOWEST_PATH_DEG

# An atmosphere that lets nothing through, dB.
_OPAQUE_DB: Final = 300.0


class Curves(NamedTuple):
    """Noise (carrier, H, W), leak (carrier, H, W or 1, 1) and terms (carrier, 3) of a moment's carriers."""

    noise: Array
    leak: Array
    terms: Array


def dish_of(carrier: Any, terminal: Any) -> dict[str, Any]:
    """The terminal as the receive patterns take it."""
    return {
        "diameter_m": terminal("dish_m"),
        "efficiency": terminal("efficiency"),
        "frequency_ghz": carrier.frequency_ghz,
        "mask": terminal("receive_mask"),
    }


def gas_terms(carrier: Any, terminal: Any) -> list[float]:
    """Terms of a carrier's noise in clear sky, in the order of `kernels.powers.clear_noise_row`.

    The noise temperature is own − sky·a with a what the gas lets through, so that noise over carrier is
    scale·range²·(own/a − sky)/EIRP.
    """
    dish = dish_of(carrier, terminal)
    loss = receiver.wanted_gain_loss(terminal("pointing_error_deg"), **dish)
    noise = {name: terminal(name) for name in ("noise_figure_db", "feed_loss_db", "ground_noise_k")}
    own = receiver.system_noise_temperature(_OPAQUE_DB, **noise)
    sky = own - receiver.system_noise_temperature(0.0, **noise)
    dish.pop("mask")
    merit = receiver.figure_of_merit(
        receiver.antenna_gain(dish.pop("diameter_m"), **dish),
        1.0,
        feed_loss_db=terminal("feed_loss_db"),
        radome_loss_db=terminal("radome_loss_db"),
    )
    at_one_metre = receiver.free_space_loss(1e-3, frequency_ghz=carrier.frequency_ghz) + loss
    scale = carrier_to_noise(
        0.0, losses_db=at_one_metre, figure_of_merit_db=merit, symbol_rate_mbaud=carrier.symbol_rate_mbaud
    )
    least = np.sin(np.deg2rad(LOWEST_PATH_DEG))
    adjacent = inverse(carrier.adjacent_ci_db) * ratio(loss)
    return [float(one) for one in (inverse(scale), own, sky, least, adjacent)]


def power_terms(carriers: Sequence[Any]) -> Array:
    """Uplink's noise, crossed carrier's power and required C/N of each carrier, ratios, (carrier, 3)."""
    return np.array(
        [
            [
                float(inverse(carrier.uplink_cn_db)),
                float(ratio(carrier.crossed_offset_db)) if carrier.crossed else 0.0,
                float(ratio(carrier.required_es_n0_db + carrier.implementation_loss_db)),
            ]
            for carrier in carriers
        ]
    )


def of_responses(responses: Sequence[Response], shape: tuple[int, ...]) -> Curves:
    """The same of responses of linear carriers without neighbours, whatever their weather."""
    noise = np.stack([np.broadcast_to(one.noise, shape) for one in responses])
    leaks = [np.asarray(one.leak) for one in responses]
    everywhere = (1, 1) if all(leak.size == 1 for leak in leaks) else shape
    leak = np.stack([np.broadcast_to(one, everywhere) for one in leaks])
    terms = [[float(one.uplink), float(one.crossed), float(ratio(one.required_db))] for one in responses]
    return Curves(noise, leak, np.array(terms))
