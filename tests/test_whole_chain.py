"""One chain for grid, list and point: what the files say at a place agrees with one another."""

from __future__ import annotations

import csv
import math
from pathlib import Path

import numpy as np
import pytest
import rasterio
from pyproj import Transformer

from geoskew.study.core import Study
from geoskew.study.rasters import write_study_rasters
from geoskew.study.run import Settings, run
from geoskew.study.spot import spot_values

SCENARIO = """
title = "Chain"
changeover = 2027-05-18T03:00:00Z
[outgoing]
longitude_deg = -66.2
tilt_deg = 21.0
aim = {{ lon_deg = -64.0, lat_deg = -36.5 }}
beam = {{ peak_dbw = 52.0, major_deg = 4.0, minor_deg = 2.5, orientation_deg = 20.0 }}
[incoming]
longitude_deg = {incoming}
eirp_dbw = 50.5
[carrier]
polarisation = "V"
frequency_ghz = 11.95
symbol_rate_mbaud = 27.5
modcod = "8PSK 3/4"
[terminal]
dish_m = 1.2
pointing_error_deg = 0.1
[region]
{region}
[sites]
file = "sites.csv"
[weather]
availability_percent = 99.5
"""

GEOGRAPHIC = "bounds_deg = [-66.0, -36.0, -62.0, -33.0]\nstep_deg = 0.25"
PROJECTED = 'bounds_deg = [-66.0, -36.0, -62.0, -33.0]\ncrs = "EPSG:32720"\nstep_m = 30000'


def centres(region: str) -> list[tuple[int, int, float, float]]:
    """Some cells of the grid (row, column) and their centres, worked out from the bounds alone."""
    if region is GEOGRAPHIC:
        # Snapped to multiples of the step from −180/−90, pixel is area: the first centre is half a step in.
        return [
            (r, c, -66.0 + 0.25 * (c + 0.5), -33.0 - 0.25 * (r + 0.5)) for r, c in ((0, 0), (5, 3), (11, 15))
        ]
    return []


def write_scenario(folder: Path, region: str, sites: list[tuple[str, float, float]], incoming: float) -> Path:
    path = folder / "plan.toml"
    path.write_text(SCENARIO.format(region=region, incoming=incoming), encoding="utf-8")
    rows = "".join(f"{name},{lat!r},{lon!r}\n" for name, lat, lon in sites)
    (folder / "sites.csv").write_text("id,lat,lon\n" + rows, encoding="utf-8")
    return path


@pytest.mark.parametrize(("region", "incoming"), [(GEOGRAPHIC, -66.2), (PROJECTED, -65.6)])
def test_raster_table_and_spot_agree_at_cell_centres(tmp_path: Path, region: str, incoming: float) -> None:
    """A raster re-read with another library at a site's place gives the site table's value; so does `spot`."""
    path = write_scenario(tmp_path, region, [("one", -35.0, -64.0)], incoming)
    if region is GEOGRAPHIC:
        cells = centres(region)
    else:
        grid = Study(path).grid
        back = Transformer.from_crs(grid.crs, "EPSG:4326", always_xy=True)
        cells = []
        for row, column in ((1, 1), (4, 6), (9, 10)):
            # Multiples of the step: the outer corner is on the lattice, the centre half a step in.
            assert math.isclose(grid.west % 30000.0, 0.0, abs_tol=1e-6)
            assert math.isclose(grid.north % 30000.0, 0.0, abs_tol=1e-6)
            lon, lat = back.transform(
                grid.west + 30000.0 * (column + 0.5), grid.north - 30000.0 * (row + 0.5)
            )
            cells.append((row, column, lon, lat))
    write_scenario(tmp_path, region, [(f"s{r}-{c}", lat, lon) for r, c, lon, lat in cells], incoming)
    study = Study(path)
    run(study, tmp_path / "out", Settings(), lambda phase, done, total: None)
    with (tmp_path / "out" / "sites.csv").open(encoding="utf-8") as file:
        table = {row["id"]: row for row in csv.DictReader(file)}
    names = study.raster_names
    assert len(names) >= 40
    for name in names:
        with rasterio.open(tmp_path / "out" / "layers" / f"{name}.tif") as source:
            step = 2.0**-6 if source.units[0] == "km" else 2.0**-10
            for row, column, lon, lat in cells:
                stored = next(source.sample([source.xy(row, column)]))[0]
                there = table[f"s{row}-{column}"][name]
                if name == "action":
                    assert source.tags(1)[f"class_{int(stored)}"] == there
                    continue
                given = (
                    spot_values(path, lat, lon, None)[name]
                    if name in ("skew_after", "margin_realigned_rain")
                    else None
                )
                if source.nodata == 255:
                    assert (stored == 255 and there == "") or int(stored) == int(float(there)), name
                elif there == "":
                    assert np.isnan(stored), name
                else:
                    # Half a step of rounding, and what six decimals and float32 leave.
                    assert (
                        abs(float(stored) - float(there))
                        <= 0.5 * step + 2e-3 * (source.units[0] == "km") + 1e-5
                    ), name
                    if given is not None:
                        assert isinstance(given, float)
                        assert abs(given - float(there)) < 2e-6


def test_half_a_cell_would_be_noticed(tmp_path: Path) -> None:
    """The check above has teeth: half a cell away the values differ by far more than it allows."""
    path = write_scenario(tmp_path, GEOGRAPHIC, [("one", -35.0, -64.0)], -66.2)
    study = Study(path)
    write_study_rasters(study, tmp_path / "layers", ["skew_after"])
    with rasterio.open(tmp_path / "layers" / "skew_after.tif") as source:
        stored = float(source.read(1)[5, 3])
    shifted = spot_values(path, -33.0 - 0.25 * 5.5, -66.0 + 0.25 * 3.0, None)["skew_after"]
    assert isinstance(shifted, float)
    assert abs(stored - shifted) > 50 * 2.0**-10


@pytest.mark.parametrize("layer", ["skew_after", "margin_untouched", "turn_shared", "elevation_before"])
def test_turned_about_the_earth_across_180(tmp_path: Path, layer: str) -> None:
    """A scenario turned as a whole gives the same numbers: 246° further the region lies across 180°."""
    values = []
    for turn in (0.0, 246.0):
        folder = tmp_path / f"turned-{turn:g}"
        folder.mkdir()

        def at(longitude: float, turn: float = turn) -> float:
            return (longitude + turn + 180.0) % 360.0 - 180.0

        text = SCENARIO.format(
            region=f"bounds_deg = [{at(-66.75)}, -36.0, {at(-65.25)}, -33.0]\nstep_deg = 0.25",
            incoming=at(-66.2),
        )
        text = text.replace("longitude_deg = -66.2", f"longitude_deg = {at(-66.2)}").replace(
            "-64.0", f"{at(-64.0)}"
        )
        text = text.replace("[weather]\navailability_percent = 99.5\n", "")
        (folder / "plan.toml").write_text(text, encoding="utf-8")
        study = Study(folder / "plan.toml", needs_sites=False)
        write_study_rasters(study, folder / "layers", [layer], precision="full")
        with rasterio.open(folder / "layers" / f"{layer}.tif") as source:
            values.append(source.read(1))
            assert source.transform.a == pytest.approx(0.25)
    assert values[0].shape == values[1].shape
    # Clear-sky gas comes from maps of the real Earth: only margins see it, by some hundredths of a dB.
    np.testing.assert_allclose(
        values[0], values[1], atol=0.1 if layer.startswith(("margin", "turn_s")) else 2e-5
    )
