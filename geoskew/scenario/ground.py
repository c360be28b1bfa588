"""What stands on the ground: terminals, the region, the site list, terrain, weather and the decision."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated, Any, Literal

from pydantic import BeforeValidator, Field

from geoskew.scenario.parts import Isolation, Loss, Table
from geoskew.scenario.values import choice, existing, nearest, number, refuse, shown, text, whole, yes_no

_AZEL_ONLY = (
    "polar mounts are not supported yet, since their dish turns with the arc: "
    'leave such sites out and give mount = "azel" for the others'
)


def _guess_metres(value: float) -> str | None:
    """Explain a dish that was given in centimetres or millimetres."""
    for factor, unit in ((100, "cm"), (1000, "mm")):
        if 0.2 <= value / factor <= 5:
            return f"if that is in {unit}, write {value / factor:g}"
    return None


def _guess_share(value: float) -> str | None:
    """Explain an efficiency that was given in percent."""
    return f"if that is in percent, write {value / 100:g}" if 1 < value <= 100 else None


def _guess_figure(value: float) -> str | None:
    """Explain a noise figure that was given as a temperature."""
    return (
        "if that is a noise temperature T in K, the figure is 10·log10(1 + T/290) dB" if value > 20 else None
    )


def _guess_availability(value: float) -> str | None:
    """Explain an availability that was given as a fraction or as unavailability."""
    if 0.5 <= value <= 1:
        return f"if that is a fraction, write {value * 100:.9g}"
    if 0 < value <= 5:
        return f"if that is the share of time that may be lost, write {100 - value:.9g}"
    return None


class Terminal(Table):
    """Receiving terminals; a site list may give any of these for each site."""

    dish_m: Annotated[float, number("a diameter in metres", low=0.1, high=32, guess=_guess_metres)] = 0.9
    efficiency: Annotated[float, number("an efficiency", low=0, above=True, high=1, guess=_guess_share)] = (
        0.65
    )
    noise_figure_db: Annotated[float, number("a noise figure in dB", low=0, high=20, guess=_guess_figure)] = (
        0.8
    )
    feed_loss_db: Loss = 0.0
    radome_loss_db: Loss = 0.0
    ground_noise_k: Annotated[float, number("a noise temperature in K", low=0, high=300)] = 10.0
    isolation_db: Isolation = 25.0
    pointing_error_deg: Annotated[float, number("an angle in degrees", low=0, high=10)] = 0.0
    setting_spread_deg: Annotated[float, number("a standard deviation in degrees", low=0, high=45)] = 3.0
    scale_step_deg: Annotated[
        float, number("the step of the feed's scale in degrees", low=0, above=True, high=90)
    ] = 5.0
    ports: Annotated[int, whole("the number of ports led out", low=1, high=2)] = 1
    mount: Annotated[Literal["azel"], choice("mount", "azel", refused={"polar": _AZEL_ONLY})] = "azel"
    transmits: Annotated[bool, yes_no("the terminals transmit")] = False
    receive_mask: (
        Annotated[Literal["BO.1213", "S.465", "S.580"], choice("receive mask", "BO.1213", "S.465", "S.580")]
        | None
    ) = None


RESERVED_COLUMNS: tuple[str, ...] = (
    "id", "lat", "lon", "name", "height_m", "antenna_height_m", "setting_deg", "setting_source",
    "feed_low_deg", "feed_high_deg", "feed_fixed", "scale_zero_deg", "scale_sense", "carriers",
    "weight", "district", "access", "last_visit", *Terminal.model_fields,
)  # fmt: skip
"""Columns of a site list that have a meaning; the keys of ``[terminal]`` stand last."""


def _four_edges(value: object) -> tuple[float, float, float, float]:
    """Check west, south, east, north; west beyond east crosses 180°."""
    order = "give [west, south, east, north] in degrees"
    if not isinstance(value, list | tuple) or len(value) != 4:
        raise refuse(f"{shown(value)} is not four numbers: {order}")
    edges = []
    for edge, limit in zip(value, ((-180, 360), (-90, 90)) * 2, strict=True):
        if isinstance(edge, bool) or not isinstance(edge, int | float):
            raise refuse(f"{shown(edge)} is not a number: {order}")
        if not limit[0] <= edge <= limit[1]:
            raise refuse(f"{shown(edge)} is not from {limit[0]} to {limit[1]}: {order}")
        edges.append(float(edge))
    west, south, east, north = edges
    if south >= north:
        raise refuse(f"south {south:g} is not below north {north:g}: {order}")
    if west == east:
        raise refuse(f"west and east are both {west:g}: {order}; the whole circle is -180 and 180")
    if east - west > 360:
        raise refuse(f"from west {west:g} to east {east:g} is more than the whole circle: {order}")
    return west, south, east, north


def _crs(value: object, *, projected: bool) -> str:
    """Check a coordinate reference system by name; with ``projected``, one of a plane."""
    example = '"EPSG:32720"' if projected else '"EPSG:4326"'
    if not isinstance(value, str) or not value.strip():
        raise refuse(
            f"{shown(value)} is not the name of a coordinate reference system: give one such as {example}"
        )
    # Slow to import, and only some scenarios have one.
    from pyproj import CRS
    from pyproj.exceptions import CRSError

    try:
        system = CRS.from_user_input(value)
    except CRSError as error:
        raise refuse(
            f"{shown(value)} is not a known coordinate reference system: give one such as {example}"
        ) from error
    if projected and not system.is_projected:
        raise refuse(
            f"{shown(value)} is not a projected system: give one such as {example}, "
            "or leave crs out and give step_deg"
        )
    return value


class Region(Table):
    """Where a raster is wanted: bounds or outline; step in degrees, or a projected system and metres."""

    bounds_deg: Annotated[tuple[float, float, float, float], BeforeValidator(_four_edges)] | None = None
    outline: Annotated[Path, existing("a vector file with the region's outline")] | None = None
    step_deg: Annotated[float, number("the size of a cell in degrees", low=1e-5, high=30)] | None = None
    crs: Annotated[str, BeforeValidator(lambda value: _crs(value, projected=True))] | None = None
    step_m: Annotated[float, number("the size of a cell in metres", low=0.1, high=3e6)] | None = None


def _columns(value: object) -> dict[str, str]:
    """Check the renaming of columns: our name on the left, the file's on the right."""
    example = 'give our names on the left and the file\'s on the right, such as { id = "code" }'
    if not isinstance(value, dict):
        raise refuse(f"{shown(value)} is not a table: {example}")
    for ours, theirs in value.items():
        if ours not in RESERVED_COLUMNS:
            near = nearest(ours, RESERVED_COLUMNS)
            hint = f'; did you mean "{near}"?' if near else ""
            raise refuse(f"{shown(ours)} is not a column with a meaning: {example}{hint}")
        if not isinstance(theirs, str) or not theirs:
            raise refuse(f"{ours} = {shown(theirs)} does not name a column of the file: {example}")
    names = list(value.values())
    for name in names:
        if names.count(name) > 1:
            raise refuse(f"the file's column {shown(name)} is given two meanings: name it once")
    return dict(value)


class SitesTable(Table):
    """The site list's file, and how to read it where its column names or coordinates differ."""

    file: Annotated[Path, existing("the site list", optional_when="sites_may_be_missing")] = Field(
        description='the path of the site list, such as "sites.csv"'
    )
    columns: Annotated[dict[str, str], BeforeValidator(_columns)] = Field(default_factory=dict)
    crs: Annotated[str, BeforeValidator(lambda value: _crs(value, projected=False))] | None = None
    layer: Annotated[str, text("the name of a layer of the file")] | None = None


class Weather(Table):
    """The share of an average year for which the link must hold."""

    availability_percent: Annotated[
        float,
        number("an availability in percent", low=95, high=99.999, guess=_guess_availability),
    ] = Field(description="the share of an average year in percent, such as 99.5")


class Terrain(Table):
    """A digital elevation model: a raster, a virtual raster or a folder of rasters."""

    dem: Annotated[Path, existing("an elevation raster or a folder of them", folder_too=True)] = Field(
        description="the path of an elevation raster or a folder of them"
    )
    unit: Annotated[Literal["m", "ft"], choice("unit of height", "m", "ft")] = "m"
    clutter: Annotated[Path, existing("a raster of clutter heights", folder_too=True)] | None = None
    antenna_height_m: Annotated[float, number("a height above ground in metres", low=0, high=500)] = 0.0


class Decision(Table):
    """What the actions are judged by."""

    reserve_db: Loss = 1.0
    allowed_loss_db: Loss = 0.5
    judged_in: Annotated[Literal["clear", "rain"], choice("condition", "clear", "rain")] | None = None
    addition: Annotated[Literal["power", "phasor"], choice("addition", "power", "phasor")] = "power"


def frequency_outside_rain_models(value: Any) -> bool:
    """Tell whether a frequency in GHz lies above the range of the rain model (ITU-R P.618-14, 55 GHz)."""
    return isinstance(value, int | float) and 55 < value <= 100
