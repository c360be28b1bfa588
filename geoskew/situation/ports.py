"""Which port of the feed a carrier is received on, and what a single port costs."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

import numpy as np

from geoskew.geometry import Array


def is_linear(carrier: Any) -> bool:
    """Whether a carrier is linearly polarised."""
    return carrier.polarisation in ("V", "H")


def old_port(before: Sequence[Any]) -> str | None:
    """The port in use before, "V" or "H"; None where carriers differ, so that it is switched."""
    linear = {carrier.polarisation for carrier in before if is_linear(carrier)}
    return linear.pop() if len(linear) == 1 else None


def port_offset(before: Sequence[Any], after: Sequence[Any], ports: Any) -> list[Array]:
    """Degrees to add, a new carrier, to the angle that suits it.

    The same array for carriers of the same offset. With one port, the old carriers' port takes the new
    ones too: a carrier of the other linear polarisation suits at 90° more. With two ports, or a
    switched one, it is simply taken at the other.
    """
    port = old_port(before)
    quarter, none = np.where(np.asarray(ports) == 1, 90.0, 0.0), np.zeros(())
    return [
        quarter
        if port is not None and is_linear(old) and is_linear(new) and new.polarisation != port
        else none
        for old, new in zip(before, after, strict=True)
    ]
