"""The page's own geometry against the package's, and its sun against astropy."""

from __future__ import annotations

import json
import subprocess
from collections.abc import Callable
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from geoskew import geometry, polarisation
from geoskew.angles import fold

SCRIPTS = Path(__file__).resolve().parents[1] / "geoskew" / "outputs" / "fieldmap" / "assets" / "js"
PLACES = 1000

SATELLITES = {
    "same slot": ((-66.2, 0.0, 21.0, (-64.0, -36.5)), (-66.2, 0.0, 0.0, (-64.0, -36.5))),
    "other slot": ((-66.2, 0.0, 21.0, (-64.0, -36.5)), (-65.6, 0.0, -3.0, None)),
    "inclined, across 180°": ((178.0, 1.5, 0.0, (172.0, -40.0)), (-179.0, -0.7, 10.0, (170.0, 50.0))),
}


def in_node(node: str, expression: str, given: object) -> Any:
    """Value of an expression of `given` in the page's scripts, run outside a browser."""
    program = "\n".join(
        [
            "globalThis.FieldMap = {};",
            *((SCRIPTS / name).read_text(encoding="utf-8") for name in ("geodesy.js", "sun.js")),
            "const fm = globalThis.FieldMap;",
            "const given = JSON.parse(require('fs').readFileSync(0, 'utf8'));",
            f"console.log(JSON.stringify({expression}));",
        ]
    )
    done = subprocess.run(
        [node, "-e", program], input=json.dumps(given), capture_output=True, text=True, check=True
    )
    return json.loads(done.stdout)


def facts(satellite: tuple[float, float, float, tuple[float, float] | None]) -> dict[str, Any]:
    """A satellite as the page has it."""
    longitude, latitude, tilt, aim = satellite
    return {"longitude": longitude, "latitude": latitude, "tilt": tilt, "aim": aim}


def from_python(satellites: Any, longitude: Any, latitude: Any, port: float) -> dict[str, Any]:
    """The same values by the package's functions."""
    sights, arriving, out = [], [], {}
    for satellite, ending in zip(satellites, ("before", "after"), strict=True):
        at, tilt, aim = geometry.satellite_position(*satellite[:2]), satellite[2], satellite[3]
        sight = geometry.line_of_sight(longitude, latitude, 0.0, at)
        frame = polarisation.beam_frame(at, aim)
        sights.append(sight)
        arriving.append(polarisation.vertical_axis(frame, tilt, sight.direction, longitude, latitude))
        out[f"azimuth_{ending}"] = geometry.azimuth(sight.direction)
        out[f"elevation_{ending}"] = geometry.elevation(sight.direction)
        out[f"range_{ending}"] = sight.range_m / 1000.0
        out[f"skew_{ending}"] = polarisation.skew(frame, tilt, sight.direction, longitude, latitude)
    seen = polarisation.seen_in_dish(arriving[1], sights[1].direction, sights[0].direction)
    out["seen_after"] = seen
    out["turn_realigned"] = fold(out["skew_after"] + port - out["skew_before"])
    out["mismatch_untouched"] = polarisation.mismatch(fold(out["skew_before"] - seen - port))
    return out


@pytest.mark.parametrize("port", [0.0, 90.0])
@pytest.mark.parametrize("name", SATELLITES)
def test_page_and_package_agree(name: str, port: float, needs_tool: Callable[[str], str]) -> None:
    satellites = SATELLITES[name]
    random = np.random.default_rng(11)
    middle = satellites[0][0]
    longitude = middle + random.uniform(-75, 75, PLACES)
    latitude = np.degrees(np.arcsin(random.uniform(-0.97, 0.97, PLACES)))
    given = {
        "geometry": {
            "outgoing": facts(satellites[0]),
            "incoming": facts(satellites[1]),
            "lowest": -90,
            "port": port,
            "linear": True,
        },
        "places": np.column_stack([longitude, latitude]).tolist(),
    }
    rows = in_node(
        needs_tool("node"), "given.places.map(([x, y]) => fm.atPlace(given.geometry, x, y, 0))", given
    )
    wanted = from_python(satellites, longitude, latitude, port)
    for key, values in wanted.items():
        found = np.array([row[key] for row in rows], dtype=float)
        if key.startswith(("azimuth", "elevation", "skew", "seen", "turn")):
            period = 360.0 if key.startswith("azimuth") else 180.0
            off = np.mod(found - values + period / 2, period) - period / 2
            assert np.abs(off).max() < 0.01, key
        elif key.startswith("range"):
            assert np.abs(found - values).max() < 0.1
        else:
            # Near 90° a hundredth of a degree is decibels; there both are near the cap of 40 dB.
            assert np.abs(found - values)[values < 30].max() < 0.01


def test_known_skew_at_45_south(needs_tool: Callable[[str], str]) -> None:
    """45° S, 10° west of the satellite: +9.86° untilted, +30.86° with a tilt of +21° (an agreed example)."""
    given = [
        {"outgoing": facts((0.0, 0.0, tilt, None)), "incoming": facts((0.0, 0.0, tilt, None)), "lowest": 5,
         "port": 0, "linear": True}
        for tilt in (0.0, 21.0)
    ]  # fmt: skip
    rows = in_node(needs_tool("node"), "given.map((g) => fm.atPlace(g, -10, -45, 0).skew_before)", given)
    assert rows == pytest.approx([9.86, 30.86], abs=0.005)


def test_no_value_below_the_lowest_elevation_and_none_for_circular(needs_tool: Callable[[str], str]) -> None:
    base = {"outgoing": facts((0, 0, 0, None)), "incoming": facts((30, 0, 0, None)), "lowest": 5, "port": 0}
    given = [{**base, "linear": True}, {**base, "linear": False}]
    expression = "[fm.atPlace(given[0], 95, 0, 0), fm.atPlace(given[1], 20, 30, 0)]"
    low, circular = in_node(needs_tool("node"), expression, given)
    assert low["skew_before"] is None
    assert low["skew_after"] is not None
    assert low["azimuth_before"] == pytest.approx(270.0, abs=0.01)
    for key in ("seen_after", "turn_realigned", "mismatch_untouched"):
        assert low[key] is None
    assert circular["turn_realigned"] is None
    assert circular["skew_after"] is not None


def test_line_along_an_azimuth_against_the_ellipsoid(needs_tool: Callable[[str], str]) -> None:
    """Pyproj's geodesics on WGS 84: an azimuth line of 20 km ends within 0.6 percent of its length."""
    from pyproj import Geod

    random = np.random.default_rng(3)
    starts = np.column_stack([random.uniform(-180, 180, 200), random.uniform(-65, 65, 200)])
    azimuth = random.uniform(0, 360, 200)
    given = [[*start, turn] for start, turn in zip(starts.tolist(), azimuth.tolist(), strict=True)]
    ends = np.array(
        in_node(needs_tool("node"), "given.map(([x, y, a]) => fm.placeAlong(x, y, a, 20000))", given)
    )
    geod = Geod(ellps="WGS84")
    x, y, _ = geod.fwd(starts[:, 0], starts[:, 1], azimuth, np.full(200, 20_000.0))
    _, _, off = geod.inv(ends[:, 0], ends[:, 1], x, y)
    assert np.max(off) < 120.0
    back = in_node(
        needs_tool("node"),
        "given.map(([x, y, u, v]) => fm.between(x, y, u, v))",
        np.column_stack([starts, x, y]).tolist(),
    )
    turn = np.array([row["azimuth"] for row in back]) - azimuth
    assert np.abs(np.mod(turn + 180, 360) - 180).max() < 0.2


def test_sun_against_astropy(needs_tool: Callable[[str], str]) -> None:
    """Astropy's apparent sun at 300 times and places of 2018 to 2026, without refraction: 0.05°."""
    from astropy import units as u
    from astropy.coordinates import AltAz, EarthLocation, get_sun
    from astropy.time import Time
    from astropy.utils import iers

    random = np.random.default_rng(7)
    when = random.uniform(1_514_764_800, 1_767_225_600, 300)
    longitude, latitude = random.uniform(-180, 180, 300), random.uniform(-70, 70, 300)
    given = [[moment * 1000, x, y] for moment, x, y in zip(when, longitude, latitude, strict=True)]
    found = in_node(needs_tool("node"), "given.map(([t, x, y]) => fm.sunAt(t, x, y))", given)
    # Earth's rotation is known ahead to a second, which is 0.004° here; nothing is downloaded for it.
    with iers.conf.set_temp("auto_download", False), iers.conf.set_temp("iers_degraded_accuracy", "ignore"):
        time = Time(when, format="unix")
        frame = AltAz(obstime=time, location=EarthLocation.from_geodetic(longitude * u.deg, latitude * u.deg))
        sun = get_sun(time).transform_to(frame)
        elevation, azimuth = sun.alt.deg, sun.az.deg
    assert np.abs(np.array([row["elevation"] for row in found]) - elevation).max() < 0.05
    side = np.array([row["azimuth"] for row in found]) - azimuth
    off = (np.mod(side + 180, 360) - 180) * np.cos(np.radians(elevation))
    assert np.abs(off).max() < 0.05


def test_moments_at_which_the_sun_crosses_an_azimuth(needs_tool: Callable[[str], str]) -> None:
    given = {"start": 1_800_000_000_000, "azimuth": 35.0, "place": [-64.0, -36.5]}
    moments = in_node(
        needs_tool("node"),
        "fm.sunCrossings(given.start, ...given.place, given.azimuth).map((t) => [t, fm.sunAt(t, ...given.place)])",
        given,
    )
    assert len(moments) == 1
    moment, sun = moments[0]
    assert given["start"] <= moment < given["start"] + 86_400_000
    assert sun["azimuth"] == pytest.approx(35.0, abs=0.02)
    assert sun["elevation"] > 0
