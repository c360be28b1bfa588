"""Layers of geometry: where the satellites stand and how their polarisation arrives."""

from __future__ import annotations

from geoskew.geometry import Array
from geoskew.layers import layer
from geoskew.situation import Situation

BOTH = ("before", "after")


@layer(
    unit="deg",
    description="Azimuth of the old satellite, clockwise from true north",
    ramp="cycle",
    limits=(0.0, 360.0),
    contour_step=10.0,
    kind="circular",
    period=360.0,
)
def azimuth_before(situation: Situation) -> Array:
    return situation.before.azimuth


@layer(
    unit="deg",
    description="Azimuth of the new satellite, clockwise from true north",
    ramp="cycle",
    limits=(0.0, 360.0),
    contour_step=10.0,
    kind="circular",
    period=360.0,
)
def azimuth_after(situation: Situation) -> Array:
    return situation.after.azimuth


@layer(
    unit="deg",
    description="Elevation of the old satellite, geometric, without refraction",
    ramp="level",
    limits=(0.0, 90.0),
    contour_step=5.0,
)
def elevation_before(situation: Situation) -> Array:
    return situation.before.elevation


@layer(
    unit="deg",
    description="Elevation of the new satellite, geometric, without refraction",
    ramp="level",
    limits=(0.0, 90.0),
    contour_step=5.0,
)
def elevation_after(situation: Situation) -> Array:
    return situation.after.elevation


@layer(
    unit="km",
    description="Distance to the old satellite",
    ramp="level",
    limits=(35_700.0, 41_700.0),
    contour_step=250.0,
)
def range_before(situation: Situation) -> Array:
    return situation.before.sight.range_m / 1000.0


@layer(
    unit="km",
    description="Distance to the new satellite",
    ramp="level",
    limits=(35_700.0, 41_700.0),
    contour_step=250.0,
)
def range_after(situation: Situation) -> Array:
    return situation.after.sight.range_m / 1000.0


@layer(
    unit="deg",
    description="Skew of the old satellite's V axis, clockwise from the local vertical, looking towards the satellite",
    ramp="signed",
    limits=(-90.0, 90.0),
    contour_step=5.0,
    kind="circular",
    period=180.0,
    of=("before",),
)
def skew_before(situation: Situation) -> Array:
    return situation.before.skew


@layer(
    unit="deg",
    description="Skew of the new satellite's V axis, clockwise from the local vertical, looking towards the satellite",
    ramp="signed",
    limits=(-90.0, 90.0),
    contour_step=5.0,
    kind="circular",
    period=180.0,
    of=("after",),
)
def skew_after(situation: Situation) -> Array:
    return situation.after.skew


@layer(
    unit="deg",
    description="Setting that suits the new satellite's V axis in a dish that still looks at the old slot",
    ramp="signed",
    limits=(-90.0, 90.0),
    contour_step=5.0,
    kind="circular",
    period=180.0,
    of=BOTH,
)
def seen_after(situation: Situation) -> Array:
    return situation.seen_after
