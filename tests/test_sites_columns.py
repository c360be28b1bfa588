"""Columns of a site list: those with a meaning, their rules, and the names they go by."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
import shapely
from region_files import written
from site_files import read_text, reasons

from geoskew.errors import InputError
from geoskew.scenario import Terminal
from geoskew.sites import RESERVED
from geoskew.sites.meanings import PLACE_COLUMNS

TERMINAL_CELLS = {
    ("dish_m", "-1"): "dish_m -1 is out of range: give a diameter in metres",
    ("dish_m", "90"): "if that is in cm, write 0.9",
    ("dish_m", "big"): "dish_m 'big' is not a number",
    ("efficiency", "65"): "if that is in percent, write 0.65",
    ("noise_figure_db", "-0.1"): "noise_figure_db -0.1 is out of range",
    ("isolation_db", "-3"): "isolation_db -3 is out of range",
    ("setting_spread_deg", "90"): "setting_spread_deg 90 is out of range",
    ("scale_step_deg", "0"): "scale_step_deg 0 is out of range",
    ("ports", "3"): "ports 3 is out of range: give the number of ports led out, 1 or 2",
    ("ports", "1.5"): "ports 1.5 is not a whole number",
    ("mount", "polar"): "mount \"polar\": polar mounts are not supported yet",
    ("mount", "horizon"): "mount \"horizon\" is not a known mount",
    ("receive_mask", "X"): "receive_mask \"X\" is not a known receive mask",
    ("transmits", "maybe"): "transmits 'maybe' is neither yes nor no",
    ("height_m", "99999"): "height_m 99999 is out of range",
    ("antenna_height_m", "-1"): "antenna_height_m -1 is out of range",
    ("setting_deg", "200"): "setting_deg 200 is out of range",
    ("feed_fixed", "2"): "feed_fixed '2' is neither yes nor no",
    ("scale_sense", "left"): "scale_sense \"left\" is not a known sense",
    ("weight", "-1"): "weight -1 is out of range",
}  # fmt: skip


@pytest.mark.parametrize(("name", "cell"), list(TERMINAL_CELLS))
def test_columns_with_a_meaning_are_checked(tmp_path: Path, name: str, cell: str) -> None:
    sites = read_text(tmp_path, f"id,lat,lon,{name}\nA,1,2,\nB,1,2,{cell}\n")
    assert sites.ids == ("A",)
    assert TERMINAL_CELLS[name, cell] in reasons(sites)[3]


def test_every_key_of_the_terminal_is_a_column() -> None:
    numbers = {key for key, field in Terminal.model_fields.items() if field.annotation in (int, float)}
    assert numbers | {"setting_deg", "antenna_height_m", "scale_zero_deg"} == set(PLACE_COLUMNS)
    assert set(Terminal.model_fields) <= set(RESERVED)


def test_values_of_a_site_override_the_terminal(tmp_path: Path) -> None:
    text = (
        "id,lat,lon,dish_m,ports,setting_deg,height_m,transmits,feed_fixed,mount,name\n"
        "A,1,2,1.2,2,-12.5,640,yes,0,azel,x\nB,1,2,,,,,,,,\n"
    )
    sites = read_text(tmp_path, text)
    columns = {name: values.tolist() for name, values in sites.places.columns.items()}
    assert columns == {
        "dish_m": [1.2, pytest.approx(np.nan, nan_ok=True)],
        "ports": [2.0, pytest.approx(np.nan, nan_ok=True)],
        "setting_deg": [-12.5, pytest.approx(np.nan, nan_ok=True)],
    }
    np.testing.assert_array_equal(sites.places.height, [640.0, np.nan])
    front = sites.front()
    assert front["ports"].astype(object).tolist()[0] == 2
    assert front["transmits"].tolist()[0] == 1
    assert front[["ports", "transmits", "feed_fixed"]].dtypes.astype(str).tolist() == ["Int64"] * 3
    assert front["mount"].tolist() == ["azel", ""]


def test_stops_that_leave_no_room(tmp_path: Path) -> None:
    sites = read_text(tmp_path, "id,lat,lon,feed_low_deg,feed_high_deg\nA,1,2,40,-40\nB,1,2,-40,\n")
    assert reasons(sites) == {2: "feed_low_deg 40 is not below feed_high_deg -40"}


def test_decimals_where_latitudes_are_whole(tmp_path: Path) -> None:
    sites = read_text(tmp_path, "id;lat;lon;dish_m\nA;1;2;1,2\nB;1;2;0,9\n")
    assert sites.places.columns["dish_m"].tolist() == [1.2, 0.9]
    sites = read_text(tmp_path, "id;lat;lon;dish_m\nA;1,5;2;1.2\nB;1;2;0,9\n")
    assert reasons(sites) == {
        2: "dish_m '1.2' is not a number; the other numbers of this file have a decimal comma"
    }


def test_mapped_names_and_names_that_come_close(tmp_path: Path) -> None:
    text = "site,y,x,lat,Dish_m\nA,1,2,north,1.2\n"
    sites = read_text(tmp_path, text, columns={"id": "site", "lat": "y", "lon": "x"})
    assert sites.places.latitude.tolist() == [1.0]
    assert sites.extra == ("lat_given", "Dish_m")
    assert sites.warnings == [
        "column 'lat' is not used as lat; it is passed through as 'lat_given'",
        "column 'Dish_m' is passed through without a meaning; is 'dish_m' meant?",
    ]
    with pytest.raises(
        InputError, match=r"sites.columns.id: 'Site' is no column of sites.csv; did you mean 'site'\?"
    ):
        read_text(tmp_path, text, columns={"id": "Site", "lat": "y", "lon": "x"})
    swapped = read_text(tmp_path, "id,lon,lat\nA,1,2\n", columns={"lat": "lon", "lon": "lat"})
    assert (swapped.places.latitude.tolist(), swapped.places.longitude.tolist()) == ([1.0], [2.0])


def test_columns_without_a_name_or_with_the_same(tmp_path: Path) -> None:
    sites = read_text(tmp_path, "id,lat,lon,note,note,,\nA,1,2,a,b,,c\n")
    assert sites.extra == ("note", "note_2", "column_7")
    assert sites.frame.iloc[0].tolist() == ["A", "1", "2", "a", "b", "c"]
    assert len(sites.warnings) == 2


def test_positions_in_another_crs(tmp_path: Path) -> None:
    # By the definition of UTM: easting 500 000 m is the central meridian (63° W in zone 20), northing
    # 10 000 000 m the equator of a southern zone.
    sites = read_text(
        tmp_path, "id,lat,lon\nA,10000000,500000\nB,x,500000\nC,1e30,500000\nD,500000,1e9\n", crs="EPSG:32720"
    )
    assert sites.places.longitude.tolist() == pytest.approx([-63.0], abs=1e-9)
    assert sites.places.latitude.tolist() == pytest.approx([0.0], abs=1e-9)
    assert reasons(sites)[3] == "lat 'x' is not a number"
    for line in (4, 5):
        assert "is no place in EPSG:32720; lon is the easting and lat the northing" in reasons(sites)[line]


def test_latitude_and_longitude_exchanged_throughout(tmp_path: Path) -> None:
    region = {"bounds_deg": [-76.0, -56.0, -53.0, -17.0], "step_deg": 1.0}
    rows = "".join(f"{n},{-70 + n / 10},{-33 - n / 10}\n" for n in range(9)) + "ok,-33,-70\n"
    sites = read_text(tmp_path, "id,lat,lon\n" + rows, region=region)
    assert len(sites) == 10
    assert sites.warnings == [
        "9 of 10 sites lie outside of the region, but inside it with lat and lon exchanged; check which column is which"
    ]
    right = read_text(tmp_path, "id,lon,lat\n" + rows.replace("ok,-33,-70\n", ""), region=region)
    assert right.warnings == []
    far = read_text(tmp_path, "id,lat,lon\nA,50,10\n", region=region)
    assert (len(far), far.warnings) == (1, [])  # sites outside of the region are assessed too


REGION = {"bounds_deg": [-76.0, -56.0, -53.0, -17.0], "step_deg": 1.0}


def test_a_single_row_with_latitude_and_longitude_exchanged_is_rejected(tmp_path: Path) -> None:
    rows = "A,-33,-70\nB,-34,-71\nturned,-71.4,-35.7\nbeside,-16.5,-60\nfar,40,10\nA,-70,-33\n"
    sites = read_text(tmp_path, "id,lat,lon\n" + rows, region=REGION)
    assert sites.ids == ("A", "B", "beside", "far")
    assert reasons(sites)[4] == (
        "latitude and longitude look exchanged: lat -71.4, lon -35.7 lies outside of the region, "
        "but inside it the other way round; exchange them"
    )
    # A row that is rejected for this holds no id, so that it is not called a repeated one as well.
    assert reasons(sites)[7].startswith("latitude and longitude look exchanged")
    assert "already" not in reasons(sites)[7]
    assert sites.warnings == []


def test_nothing_is_taken_for_exchanged_without_a_region_or_in_a_list_of_elsewhere(tmp_path: Path) -> None:
    text = "id,lat,lon\nA,-33,-70\nB,-34,-71\nturned,-71.4,-35.7\n"
    assert read_text(tmp_path, text).rejected == []
    # Most of this list lies elsewhere: its one row at sea is as good as the others.
    elsewhere = "id,lat,lon\nA,40,10\nB,41,11\nC,42,12\nturned,-71.4,-35.7\n"
    assert read_text(tmp_path, elsewhere, region=REGION).rejected == []


def test_a_place_within_a_degree_of_the_region_is_not_taken_for_exchanged(tmp_path: Path) -> None:
    # Both stand in the region when exchanged; the first lies 0.5° north of it, the second 2°.
    region = {"bounds_deg": [30.0, 30.0, 43.0, 40.0], "step_deg": 1.0}
    text = "id,lat,lon\nA,35,35\nB,36,36\nC,36.5,37\nnear,40.5,35\nfar,42,35\n"
    assert list(reasons(read_text(tmp_path, text, region=region))) == [6]


def test_exchanged_rows_across_the_antimeridian_and_in_an_outline(tmp_path: Path) -> None:
    region = {"bounds_deg": [166.0, -24.0, -168.0, -8.0], "step_deg": 1.0}
    # Longitudes of that region are no latitudes: such rows are out of range, not exchanged.
    sites = read_text(tmp_path, "id,lat,lon\nA,-17,178\nB,-14,-171\nC,178,-17\n", region=region)
    assert sites.ids == ("A", "B")
    assert "out of range" in reasons(sites)[4]
    written(tmp_path / "outline.gpkg", shapely.Point(-65, -33).buffer(5))
    outline = {"outline": "outline.gpkg", "step_deg": 0.5}
    text = "id,lat,lon\nA,-33,-66\nB,-34,-65\nturned,-66,-34\ncorner,-69,-29\n"
    sites = read_text(tmp_path, text, region=outline)
    # The corner of the outline's bounds lies outside of the outline, exchanged or not.
    assert (sites.ids, list(reasons(sites))) == (("A", "B", "corner"), [4])
