"""Interference from neighbouring satellites, in a dish that may look at the old slot or the new one."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

import numpy as np

from geoskew import geometry, receiver
from geoskew.geometry import Array
from geoskew.link import ratio
from geoskew.situation.carriers import Neighbours, Stand
from geoskew.situation.ports import is_linear, old_port
from geoskew.situation.views import View

if TYPE_CHECKING:
    from geoskew.situation.links import Links

# The hand opposite to a circular one.
_HANDS = {"L", "R"}


def interference(situation: Links, stand: Stand, number: int) -> Neighbours:
    """Power of all neighbours of that moment over the wanted carrier's, as a function of the setting."""
    zero = np.zeros(())
    total = Neighbours(zero, zero, zero)
    for _, one in each_neighbour(situation, stand, number):
        total = Neighbours(*(a + b for a, b in zip(total, one, strict=True)))
    return total


def each_neighbour(situation: Links, stand: Stand, number: int) -> list[tuple[Any, Neighbours]]:
    """The neighbours of that moment in the scenario's order, and the power of each as `interference` adds it.

    Each comes along its own line of sight, by the receive pattern's gain at its angle from the
    dish's axis, with its own E-vector carried to that axis. Its path fades as the wanted one's does.
    Where phases are not known, or no turn changes anything, each counts as at its worst setting.
    """
    in_full = (
        situation.scenario.decision.addition == "phasor" or situation.fixed[stand.moment][number] is not None
    )
    found = []
    for neighbour in situation.scenario.neighbours:
        if neighbour.when in ("both", stand.moment):
            even, cosine, sine = _one(situation, stand, number, neighbour)
            if in_full:
                even, cosine, sine = even + np.hypot(cosine, sine), np.zeros(()), np.zeros(())
            found.append((neighbour, Neighbours(even, cosine, sine)))
    return found


def _one(situation: Links, stand: Stand, number: int, neighbour: object) -> Neighbours:
    carrier = situation.carriers(stand.moment)[number]
    wanted = situation.path(stand, number)
    dish = situation.before if stand.moment == "before" or stand.stays else situation.after
    view = View(neighbour, situation.places)
    off_axis = np.hypot(
        np.asarray(situation.terminal("pointing_error_deg"), dtype=np.float64),
        geometry.separation(view.sight.direction, dish.sight.direction),
    )
    antenna = {
        "diameter_m": situation.terminal("dish_m"),
        "efficiency": situation.terminal("efficiency"),
        "frequency_ghz": carrier.frequency_ghz,
    }
    mask = situation.terminal("receive_mask")
    gain = receiver.interference_gain(off_axis, **antenna, mask=mask)
    cross = receiver.interference_gain_cross(off_axis, **antenna, mask=mask)
    free_space = receiver.free_space_loss(view.sight.range_m / 1000.0, frequency_ghz=carrier.frequency_ghz)
    # Below the horizon a neighbour is shadowed by the Earth.
    over = ratio(
        (view.satellite.eirp_dbw - free_space + gain)
        - (wanted.eirp - wanted.free_space + wanted.gain - wanted.pointing)
    )
    over = np.where(view.elevation > 0.0, over, 0.0)
    leak = ratio(-np.asarray(view.satellite.isolation_db)) + ratio(cross - gain)
    leak = np.minimum(leak, 1.0)
    return _by_setting(situation, stand, number, view, dish, over, leak)


def _by_setting(
    situation: Links, stand: Stand, number: int, view: View, dish: View, over: Array, leak: Array
) -> Neighbours:
    carrier = situation.carriers(stand.moment)[number]
    theirs = view.satellite.polarisation
    middle, swing = 0.5 * over * (1.0 + leak), 0.5 * over * (1.0 - leak)
    zero = np.zeros(())
    old = situation.scenario.carriers_before[number]
    feed_linear = is_linear(old)
    if feed_linear != (theirs not in _HANDS):
        return Neighbours(middle, zero, zero)
    if not feed_linear:
        # A linear carrier in a circular feed stays on the port of the old one.
        same = theirs == (old if is_linear(carrier) else carrier).polarisation
        return Neighbours(over if same else over * leak, zero, zero)
    # The setting at which the neighbour would be received in full on the wanted carrier's port.
    port = old_port(situation.scenario.carriers_before)
    single = np.asarray(situation.terminal("ports")) == 1
    on_v_port = np.where(single & (port is not None), port == "V", carrier.polarisation == "V")
    theirs_suits = view.seen_from(dish) + np.where(theirs == "V", 0.0, 90.0) - np.where(on_v_port, 0.0, 90.0)
    apart = np.deg2rad(2.0 * (theirs_suits - situation.suits(stand, number)))
    return Neighbours(middle, swing * np.cos(apart), swing * np.sin(apart))
