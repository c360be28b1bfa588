"""What a valid scenario file gives: values, defaults, carriers of both moments."""

from __future__ import annotations

import subprocess
import sys
import tomllib
from datetime import UTC, date, datetime
from pathlib import Path
from typing import Any

import pytest

from geoskew import waveform
from geoskew.errors import InputError, MissingPartError
from geoskew.scenario import Scenario, from_dict, load

LEAST = """
[outgoing]
longitude_deg = -66.2
eirp_dbw = 50
[incoming]
longitude_deg = -66.2
eirp_dbw = 49.5
[carrier]
polarisation = "V"
frequency_ghz = 11.95
symbol_rate_mbaud = 27.5
modcod = "8PSK 3/4"
[region]
bounds_deg = [-76, -56, -53, -17]
step_deg = 0.5
"""


def read(folder: Path, text: str, **options: Any) -> Scenario:
    path = folder / "study.toml"
    path.write_text(text, encoding="utf-8")
    return load(path, **options)


def test_the_least_scenario_has_the_interface_s_defaults(tmp_path: Path) -> None:
    scenario = read(tmp_path, LEAST)
    assert scenario.title == "study"
    assert scenario.changeover is None
    assert scenario.overlap_hours == 0
    for satellite in (scenario.outgoing, scenario.incoming):
        assert (satellite.latitude_deg, satellite.tilt_deg, satellite.aim) == (0, 0, None)
        assert (satellite.isolation_db, satellite.eirp_offset_db, satellite.eirp_spread_db) == (30, 0, 0)
        assert (satellite.eirp_contours, satellite.eirp_raster, satellite.beams) == (None, None, ())
    (carrier,) = scenario.carriers_before
    assert scenario.carriers_after == scenario.carriers_before
    assert (carrier.roll_off, carrier.implementation_loss_db) == (0.2, 0)
    assert (carrier.crossed, carrier.crossed_offset_db) == (True, 0)
    assert (carrier.uplink_cn_db, carrier.adjacent_ci_db) == (None, None)
    assert carrier.required_es_n0_db == waveform.required_es_n0("8PSK 3/4")
    assert scenario.terminal.model_dump() == {
        "dish_m": 0.9,
        "efficiency": 0.65,
        "noise_figure_db": 0.8,
        "feed_loss_db": 0,
        "radome_loss_db": 0,
        "ground_noise_k": 10,
        "isolation_db": 25,
        "pointing_error_deg": 0,
        "setting_spread_deg": 3,
        "scale_step_deg": 5,
        "ports": 1,
        "mount": "azel",
        "transmits": False,
        "receive_mask": None,
    }
    assert scenario.decision.model_dump() == {
        "reserve_db": 1,
        "allowed_loss_db": 0.5,
        "judged_in": None,
        "addition": "power",
    }
    assert scenario.lowest_elevation_deg == 5
    assert (scenario.weather, scenario.terrain, scenario.sites) == (None, None, None)
    assert (scenario.visits, scenario.database) == (None, None)
    assert (scenario.neighbours, scenario.crews) == ((), ())
    assert scenario.judged_in == "clear"


def test_every_further_table_is_read(tmp_path: Path) -> None:
    for name in ("sites.csv", "dem.tif", "clutter.tif", "eirp.gpkg", "road.csv"):
        (tmp_path / name).write_bytes(name.encode())
    text = LEAST.replace("eirp_dbw = 49.5", 'eirp_contours = { file = "eirp.gpkg", field = "dbw" }')
    scenario = read(
        tmp_path,
        "changeover = 2027-05-18T00:00:00-03:00\n"
        + text
        + """
lowest_elevation_deg = 10
[sites]
file = "sites.csv"
columns = { id = "code", dish_m = "size" }
[weather]
availability_percent = 99.5
[terrain]
dem = "dem.tif"
unit = "ft"
clutter = "clutter.tif"
antenna_height_m = 3
[[neighbour]]
longitude_deg = 293.0
polarisation = "H"
eirp_dbw = 48
when = "after"
[[neighbour]]
name = "east"
longitude_deg = -63
polarisation = "V"
eirp_dbw = 48
[[crew]]
name = "north"
base = { lon_deg = -64, lat_deg = -31 }
visits_per_day = 5
km_per_day = 300
days = ["Sat", "monday"]
off = [2027-05-04, 2027-05-03]
[visits]
first_day = 2027-04-19
distances = "road.csv"
solver_seconds = 2
[database]
url_env = "SITES_DATABASE"
table = "assessed"
""",
    )
    assert scenario.changeover == datetime(2027, 5, 18, 3, tzinfo=UTC)
    assert scenario.incoming.eirp_contours is not None
    assert scenario.incoming.eirp_contours.file == tmp_path / "eirp.gpkg"
    assert scenario.lowest_elevation_deg == 10
    assert scenario.sites is not None
    assert scenario.sites.columns == {"id": "code", "dish_m": "size"}
    assert scenario.judged_in == "rain"
    assert scenario.terrain is not None
    assert (scenario.terrain.unit, scenario.terrain.clutter) == ("ft", tmp_path / "clutter.tif")
    assert [neighbour.name for neighbour in scenario.neighbours] == ["neighbour 1", "east"]
    assert [neighbour.when for neighbour in scenario.neighbours] == ["after", "both"]
    (crew,) = scenario.crews
    assert crew.days == ("monday", "saturday")
    assert crew.off == (date(2027, 5, 3), date(2027, 5, 4))
    assert (crew.base.lon_deg, crew.base.lat_deg) == (-64, -31)
    assert scenario.visits is not None
    assert (scenario.visits.first_day, scenario.visits.detour) == (date(2027, 4, 19), 1.3)
    assert scenario.database is not None
    assert (scenario.database.id, scenario.database.query) == ("id", None)
    assert set(scenario.input_files) == {"sites.csv", "dem.tif", "clutter.tif", "eirp.gpkg", "road.csv"}


def test_beam_is_one_table_or_several(tmp_path: Path) -> None:
    one = "beam = { peak_dbw = 52, major_deg = 3.2, minor_deg = 1.8, aim = { lon_deg = -60, lat_deg = -30 } }"
    scenario = read(tmp_path, LEAST.replace("eirp_dbw = 49.5", one))
    (beam,) = scenario.incoming.beams
    assert (beam.peak_dbw, beam.orientation_deg, beam.pattern) == (52, 0, "gaussian")
    assert beam.aim is not None
    several = LEAST.replace("eirp_dbw = 49.5", "") + "".join(
        f"[[incoming.beam]]\npeak_dbw = {peak}\nmajor_deg = 2\nminor_deg = 2\n" for peak in (50, 51)
    )
    assert [beam.peak_dbw for beam in read(tmp_path, several).incoming.beams] == [50, 51]


CARRIERS = LEAST.replace("[carrier]", '[[carrier]]\nname = "one"').replace(
    "[region]",
    """
[[carrier]]
name = "two"
polarisation = "H"
frequency_ghz = 12.1
symbol_rate_mbaud = 10
required_es_n0_db = 4.5
[region]""",
)


def test_an_override_without_a_name_is_for_all_carriers_and_gives_way_to_a_named_one(tmp_path: Path) -> None:
    scenario = read(
        tmp_path,
        CARRIERS
        + """
[[incoming.carrier]]
name = "two"
frequency_ghz = 12.4
[[incoming.carrier]]
roll_off = 0.05
frequency_ghz = 11.5
[outgoing.carrier]
crossed = false
""",
    )
    assert [carrier.name for carrier in scenario.carriers_after] == ["one", "two"]
    assert [carrier.frequency_ghz for carrier in scenario.carriers_before] == [11.95, 12.1]
    assert [carrier.frequency_ghz for carrier in scenario.carriers_after] == [11.5, 12.4]
    assert [carrier.roll_off for carrier in scenario.carriers_after] == [0.05, 0.05]
    assert [carrier.crossed for carrier in scenario.carriers_before] == [False, False]
    assert [carrier.crossed for carrier in scenario.carriers_after] == [True, True]


def test_an_override_of_the_threshold_replaces_either_kind(tmp_path: Path) -> None:
    scenario = read(
        tmp_path,
        CARRIERS
        + """
[[incoming.carrier]]
name = "one"
required_es_n0_db = 6.5
[[incoming.carrier]]
name = "two"
modcod = "EN 300 421 QPSK 3/4"
""",
    )
    assert [carrier.modcod for carrier in scenario.carriers_before] == ["8PSK 3/4", None]
    assert [carrier.modcod for carrier in scenario.carriers_after] == [None, "EN 300 421 QPSK 3/4"]
    thresholds = [carrier.required_es_n0_db for carrier in scenario.carriers_after]
    assert thresholds == [6.5, waveform.required_es_n0("EN 300 421 QPSK 3/4")]


def test_linear_before_and_circular_after_is_a_changeover_like_any_other(tmp_path: Path) -> None:
    scenario = read(tmp_path, LEAST + '[incoming.carrier]\npolarisation = "L"\n')
    assert scenario.carriers_before[0].polarisation == "V"
    assert scenario.carriers_after[0].polarisation == "L"


@pytest.mark.parametrize(
    ("longitude", "latitude", "differ"),
    [("-66.2", "0", False), ("293.8", "0", False), ("-66.2", "0.01", True), ("-66.8", "0", True)],
)
def test_slots_differ(tmp_path: Path, longitude: str, latitude: str, differ: bool) -> None:
    text = LEAST.replace(
        "[incoming]\nlongitude_deg = -66.2",
        f"[incoming]\nlongitude_deg = {longitude}\nlatitude_deg = {latitude}",
    )
    assert read(tmp_path, text).slots_differ is differ


def test_a_region_across_180_degrees_is_taken_as_given(tmp_path: Path) -> None:
    scenario = read(tmp_path, LEAST.replace("[-76, -56, -53, -17]", "[170, -25, -170, -10]"))
    assert scenario.region is not None
    assert scenario.region.bounds_deg == (170, -25, -170, -10)


def test_the_lowest_elevation_alone_makes_no_region(tmp_path: Path) -> None:
    (tmp_path / "sites.csv").write_text("id,lat,lon\n")
    text = (
        LEAST[: LEAST.index("[region]")] + '[region]\nlowest_elevation_deg = 7\n[sites]\nfile = "sites.csv"\n'
    )
    scenario = read(tmp_path, text)
    assert scenario.region is None
    assert scenario.lowest_elevation_deg == 7


def test_a_projected_region(tmp_path: Path) -> None:
    text = LEAST.replace("step_deg = 0.5", 'crs = "EPSG:32720"\nstep_m = 5000')
    region = read(tmp_path, text).region
    assert region is not None
    assert (region.crs, region.step_m, region.step_deg) == ("EPSG:32720", 5000, None)


def test_a_site_list_may_be_missing_where_no_site_is_looked_at(tmp_path: Path) -> None:
    text = LEAST + '[sites]\nfile = "later.csv"\n'
    with pytest.raises(InputError, match="does not exist"):
        read(tmp_path, text)
    scenario = read(tmp_path, text, sites_may_be_missing=True)
    assert scenario.sites is not None
    assert scenario.sites.file == tmp_path / "later.csv"
    assert scenario.input_files == {}


def test_a_bom_and_windows_line_ends_are_read(tmp_path: Path) -> None:
    path = tmp_path / "study.toml"
    path.write_bytes(b"\xef\xbb\xbf" + LEAST.replace("\n", "\r\n").encode())
    assert load(path).outgoing.eirp_dbw == 50


def test_a_dict_gives_the_same_as_a_file(tmp_path: Path) -> None:
    assert from_dict(tomllib.loads(LEAST), path=tmp_path / "study.toml") == read(tmp_path, LEAST)


def test_require_names_what_is_missing_and_for_what(tmp_path: Path) -> None:
    scenario = read(tmp_path, LEAST)
    scenario.require("region", for_what="a raster")
    with pytest.raises(
        MissingPartError, match=r"changeover: is missing, but needed for a plan of visits"
    ) as caught:
        scenario.require("changeover", "region", "crews", for_what="a plan of visits")
    assert [problem.key for problem in caught.value.problems] == ["changeover", "crews"]
    assert "[[crew]]" in str(caught.value)
    assert str(tmp_path / "study.toml") in str(caught.value)


def test_import_stays_light() -> None:
    script = "import sys, geoskew.scenario; print(*sorted({name.split('.')[0] for name in sys.modules}))"
    done = subprocess.run([sys.executable, "-c", script], capture_output=True, text=True, check=True)
    heavy = {"numpy", "pandas", "pyproj", "scipy", "rasterio", "geopandas", "shapely"}
    assert heavy.isdisjoint(done.stdout.split())
