"""The table of wrong inputs: what is broken in a plain scenario, and what must be said of it."""

from __future__ import annotations

import re
import warnings
from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from small_scenarios import PLAIN, PLAIN_SITES

RUN = ("run", "{plan}", "--out", "{out}")


@dataclass(frozen=True)
class Wrong:
    """One wrong input.

    ``said`` holds a pattern for each line on standard error, in its order: value, rule or remedy.
    """

    name: str
    said: tuple[str, ...]
    arguments: tuple[str, ...] = RUN
    text: str | None = PLAIN
    sites: str | bytes | None = PLAIN_SITES
    prepare: Callable[[Path], None] | None = None
    status: int = 2


def _with(old: str, new: str, text: str = PLAIN) -> str:
    assert text.count(old) >= 1, old
    return text.replace(old, new, 1)


def _toml(name: str, old: str, new: str, *said: str, **more: Any) -> Wrong:
    return Wrong(name, said, text=_with(old, new), **more)


def _sites(name: str, sites: str | bytes | None, *said: str, **more: Any) -> Wrong:
    return Wrong(name, said, sites=sites, **more)


def _line(name: str, arguments: str, *said: str, **more: Any) -> Wrong:
    return Wrong(name, said, arguments=tuple(arguments.split(" ")), **more)


def _without(table: str, text: str = PLAIN) -> str:
    """The text without a table."""
    return re.sub(rf"\[{table}\]\n(?:[^\[\n].*\n)+\n?", "", text)


def _file(name: str, content: bytes = b"nothing of the kind") -> Callable[[Path], None]:
    def prepare(folder: Path) -> None:
        (folder / name).write_bytes(content)

    return prepare


def _folder(name: str) -> Callable[[Path], None]:
    def prepare(folder: Path) -> None:
        (folder / name).mkdir(parents=True)

    return prepare


def _vector(
    name: str, geometries: list[str], crs: str | None = "EPSG:4326", **columns: list[float]
) -> Callable[[Path], None]:
    """A vector file of geometries given as well-known text."""

    def prepare(folder: Path) -> None:
        import geopandas
        import shapely

        shapes = [shapely.from_wkt(text) for text in geometries]
        with warnings.catch_warnings():
            warnings.simplefilter("ignore")  # of a file without a CRS: the very fault that is made
            geopandas.GeoDataFrame(columns, geometry=shapes, crs=crs).to_file(folder / name, driver="GPKG")

    return prepare


def _raster(name: str, *, crs: str | None, value: float) -> Callable[[Path], None]:
    """A raster of one value over the whole region."""

    def prepare(folder: Path) -> None:
        import numpy as np
        import rasterio

        profile = {"driver": "GTiff", "width": 20, "height": 20, "count": 1, "dtype": "float32"}
        transform = rasterio.Affine(1.0, 0.0, -75.0, 0.0, -1.0, -25.0)
        with warnings.catch_warnings():
            warnings.simplefilter("ignore")  # of a raster without a place: the very fault that is made
            with rasterio.open(
                folder / name, "w", crs=crs, transform=transform, nodata=-1.0, **profile
            ) as made:
                made.write(np.full((1, 20, 20), value, dtype=np.float32))

    return prepare


EIRP = "eirp_dbw = 50.0"
CONTOURS = 'eirp_contours = { file = "eirp.gpkg", field = "dbw" }'
RASTER = 'eirp_raster = "eirp.tif"'
OUTLINE = ("bounds_deg = [-70.0, -40.0, -60.0, -30.0]", 'outline = "outline.gpkg"')
SQUARE = "POLYGON((-70 -40, -60 -40, -60 -30, -70 -30, -70 -40))"
CREW = """
[[crew]]
name = "North"
base = { lon_deg = -65.0, lat_deg = -33.0 }
visits_per_day = 4
km_per_day = 500
days = ["monday"]
"""

FILE_AS_A_WHOLE = [
    _line("no such scenario", "run nowhere.toml --out {out}", r"nowhere\.toml: there is no such scenario file: .*geoskew new"),
    _line("a folder as scenario", "run {in} --out {out}", "is a folder: give the scenario file in it"),
    Wrong("empty scenario", (r"plan\.toml: is empty: a scenario needs",), text=""),
    Wrong("not UTF-8", (r"plan\.toml:1: byte 0xf1 is not UTF-8: save",), text=None, prepare=_file("plan.toml", b'title = "\xf1"\n')),
    Wrong("not TOML at all", (r"plan\.toml:1: is not TOML in column \d+: .*; a line is a \[header\], key = value or a # comment",), text="dishes and satellites\n"),
    _toml("decimal comma", "longitude_deg = -66.2", "longitude_deg = -66,2", r"plan\.toml:6: is not TOML.*; numbers take a decimal point, not a comma"),
    _toml("number with its unit", "frequency_ghz = 11.95", "frequency_ghz = 11.95 GHz", r":17: is not TOML.*; numbers stand without a unit"),
    _toml("text without quotes", 'polarisation = "V"', "polarisation = V", r":16: is not TOML.*; text needs quotes"),
    _toml("a key twice", "tilt_deg = 21.0", "tilt_deg = 21.0\ntilt_deg = 20.0", r"is not TOML"),
    _toml("a header left open", "[terminal]", "[terminal", r":21: is not TOML.*a header ends with \]"),
]  # fmt: skip

KEYS_AND_VALUES = [
    _toml("unknown key", "dish_m = 0.9", "dish_size = 0.9", r"plan\.toml:22: terminal\.dish_size: is not a known key of \[terminal\]: did you mean dish_m\?"),
    _toml("misspelt key", "reserve_db = 1.0", "reserv_db = 1.0", r"decision\.reserv_db: .*did you mean reserve_db\?"),
    _toml("misspelt table", "[terminal]", "[terminals]", r"terminals: .*did you mean terminal\?"),
    _toml("a key in the wrong table", "step_deg = 2.0", "step_deg = 2.0\nreserve_db = 1.0", r"region\.reserve_db: is not a key of \[region\]: it belongs in \[decision\]"),
    _toml("frequency in MHz", "frequency_ghz = 11.95", "frequency_ghz = 11950", r"frequency_ghz: 11950 is out of range.*11\.95"),
    _toml("dish in cm", "dish_m = 0.9", "dish_m = 90", r"dish_m: 90 is out of range.*if that is in cm, write 0\.9"),
    _toml("efficiency in percent", "dish_m = 0.9", "efficiency = 65", r"efficiency: 65 is out of range.*if that is in percent, write 0\.65"),
    _toml("EIRP in dBm", EIRP, "eirp_dbw = 80.0", r"eirp_dbw: 80.* is out of range.*if that is in dBm, write 50"),
    _toml("a number in quotes", "dish_m = 0.9", 'dish_m = "0.9"', r'dish_m: "0\.9" is not a number.*quotes'),
    _toml("not a number", "dish_m = 0.9", "dish_m = nan", r"dish_m: nan is not a usable number: give"),
    _toml("an infinite number", "reserve_db = 1.0", "reserve_db = inf", r"reserve_db: inf is not a usable number"),
    _toml("a longitude beyond the circle", "longitude_deg = -66.2", "longitude_deg = 660.2", r"plan\.toml:6: outgoing\.longitude_deg: 660\.2 is out of range.*west negative"),
    _toml("a polarisation in words", 'polarisation = "V"', 'polarisation = "vertical"', r'polarisation: "vertical" is not a known .*give one of "V", "H"'),
    _toml("a waveform that no standard has", "8PSK 3/4", "8PSK 3/7", r"modcod: .*8PSK 3/7"),
    _toml("no threshold", 'modcod = "8PSK 3/4"', "", r"plan\.toml:15: carrier\.required_es_n0_db: is missing: give the threshold, or modcod"),
    _toml("two thresholds", 'modcod = "8PSK 3/4"', 'modcod = "8PSK 3/4"\nrequired_es_n0_db = 8', r"required_es_n0_db: modcod is given too: keep one of the two"),
    _toml("no EIRP", EIRP, "", r"plan\.toml:4: outgoing: has no EIRP: give one of"),
    _toml("two kinds of EIRP", EIRP, EIRP + "\nbeam = { peak_dbw = 50, major_deg = 3, minor_deg = 2 }", r"outgoing\.beam: eirp_dbw is given too: keep one kind of EIRP"),
    Wrong("no carrier", (r"carrier: the table is missing: add \[carrier\]",), text=_without("carrier")),
    Wrong("no satellite in service", (r"outgoing: the table is missing: add \[outgoing\]",), text=_without("outgoing")),
    Wrong("nothing to assess", (r"there is neither a \[region\] nor \[sites\]: add one",), text=_without("region", _without("sites"))),
    _toml("a moment without its zone", "03:00:00Z", "03:00:00", r"plan\.toml:2: changeover: .*Z"),
    _toml("margins in rain without weather", "reserve_db = 1.0", 'judged_in = "rain"', r'judged_in: "rain" needs \[weather\]'),
    _toml("availability as a share", "[decision]", "[weather]\navailability_percent = 0.995\n\n[decision]", r"availability_percent: 0\.995 is out of range"),
    _toml("crews of one name", "[decision]", CREW + CREW + "\n[decision]", r'crew\[2\]\.name: "North" is the name of two crews: rename one'),
    _toml("work that begins after the changeover", "[decision]", CREW + "[visits]\nfirst_day = 2027-06-01\n\n[decision]", r"first_day: 2027-06-01 is after the changeover on 2027-05-18"),
    Wrong(
        "four faults at once",
        (r":6: outgoing\.longitude_deg: ", r":17: carrier\.frequency_ghz: ", r":22: terminal\.dish_m: ", r":32: decision\.reserv: "),
        text=_with("-66.2", '"west"', _with("11.95", "11950", _with("dish_m = 0.9", "dish_m = -1", _with("reserve_db", "reserv")))),
    ),
]  # fmt: skip

REGIONS = [
    _toml("south above north", "[-70.0, -40.0, -60.0, -30.0]", "[-70.0, -30.0, -60.0, -40.0]", r"region\.bounds_deg: .*-30.*-40"),
    _toml("three bounds", "[-70.0, -40.0, -60.0, -30.0]", "[-70.0, -40.0, -60.0]", r"region\.bounds_deg: .*west, south, east, north"),
    _toml("bounds and outline", "step_deg = 2.0", 'step_deg = 2.0\noutline = "outline.gpkg"', r"region\.outline: bounds_deg is given too: keep one of the two", prepare=_vector("outline.gpkg", [SQUARE])),
    _toml("a step of nothing", "step_deg = 2.0", "step_deg = 0", r"region\.step_deg: 0 is out of range"),
    _toml("a step wider than the region", "step_deg = 2.0", "step_deg = 20.0", r"region\.step_deg: 20 is larger than the region, 10 across"),
    _toml("no step", "step_deg = 2.0", "", r"region: has no step: give step_deg"),
    _toml("metres without a CRS", "step_deg = 2.0", "step_m = 50000", r'region\.step_m: needs crs = "EPSG:\.\.\."'),
    _toml("an unknown CRS", "step_deg = 2.0", 'step_m = 50000\ncrs = "EPSG:999999"', r"region\.crs: .*EPSG:999999"),
    _toml("metres in degrees", "step_deg = 2.0", 'step_m = 50000\ncrs = "EPSG:4326"', r"region\.crs: .*EPSG:4326.*projected"),
    _toml("a region out of sight", "[-70.0, -40.0, -60.0, -30.0]", "[100.0, -40.0, 110.0, -30.0]", r"no cell of the region has a value in .*out of sight of the satellites.*check \[region\]", arguments=("raster", "{plan}", "--out", "{out}", "--layer", "skew_after")),
    _toml("no outline's file", *OUTLINE, r'region\.outline: "outline\.gpkg"'),
    _toml("an outline that is no vector file", *OUTLINE, r"outline\.gpkg: cannot be read", prepare=_file("outline.gpkg")),
    _toml("an outline of points", *OUTLINE, r"outline\.gpkg: .*polygon", prepare=_vector("outline.gpkg", ["POINT(-65 -35)"])),
    _toml("an outline without a CRS", *OUTLINE, r"outline\.gpkg: .*CRS", prepare=_vector("outline.gpkg", [SQUARE], crs=None)),
    _toml("an outline between the cells", *OUTLINE, r"region\.step_deg: 2 is larger than the region|no cell's centre lies within", prepare=_vector("outline.gpkg", ["POLYGON((-65 -35, -64.9 -35, -64.9 -34.9, -65 -35))"])),
]  # fmt: skip

SITE_LISTS = [
    _sites("no site list", None, r'sites\.file: "sites\.csv"'),
    _sites("a folder as site list", None, r"sites\.file: .*folder", prepare=_folder("sites.csv")),
    _sites("an empty file", b"", r"sites\.csv: .*empty"),
    _sites("a header alone", "id,lat,lon\n", r"sites\.csv: has a header but no row; give one row a site"),
    _sites("no latitude", "id,latitude,lon\nA,-33,-65\n", r"sites\.csv:1: has no column 'lat'; is 'latitude' meant\?"),
    _sites("only rows that cannot be used", "id,lat,lon\nA,north,-65\nB,-91,-65\n", r"no row can be used: all 2 are rejected", r":2: lat 'north' is not a number", r":3: lat -91 is out of range"),
    _sites("a site list that is not UTF-8", "id,lat,lon,name\nA,-33,-65,Ñandú\n".encode("latin-1"), r"sites\.csv:2: .*UTF-8"),
    _sites("a header cut by nothing", "id lat lon\nA -33 -65\n", r"sites\.csv:1: the separator cannot be told from the header.*part the columns by comma, semicolon or tab"),
    _sites("both decimal signs", "id;lat;lon\nA;-33,5;-65,25\nB;-33.5;-65.25\n", r"sites\.csv:\d+: .*decimal"),
    _sites("a column twice", "id,lat,lon,lat\nA,-33,-65,-34\n", r"sites\.csv:1: column 'lat' stands 2 times"),
    _sites("a rejected row where none may be", PLAIN_SITES + "D,-35,x,\n", r"sites\.csv:5: lon 'x' is not a number", arguments=(*RUN, "--strict")),
    _sites("a repeated id where none may be", PLAIN_SITES + "A,-35,-65,\n", r"sites\.csv:5: id 'A' is that of line 2 already", arguments=(*RUN, "--strict")),
    _sites("exchanged coordinates where none may be", PLAIN_SITES + "D,-66,-34,\n", r"sites\.csv:5: latitude and longitude look exchanged", arguments=(*RUN, "--strict")),
    _toml("a mapping to no column", 'file = "sites.csv"', 'file = "sites.csv"\ncolumns = { lat = "latitud" }', r"plan\.toml: sites\.columns\.lat: 'latitud' is no column of sites\.csv"),
    _toml("a site list as a text document", 'file = "sites.csv"', 'file = "sites.odt"', r"sites\.odt: the ending '\.odt' is not read", prepare=_file("sites.odt")),
    _toml("a workbook that is none", 'file = "sites.csv"', 'file = "sites.xlsx"', r"sites\.xlsx: .*read", prepare=_file("sites.xlsx")),
    _toml("a GeoPackage that is none", 'file = "sites.csv"', 'file = "sites.gpkg"', r"sites\.gpkg: .*read", prepare=_file("sites.gpkg")),
]  # fmt: skip

FOOTPRINTS = [
    _toml("no raster of EIRP", EIRP, RASTER, r'outgoing\.eirp_raster: "eirp\.tif"'),
    _toml("a raster that is none", EIRP, RASTER, r"eirp\.tif: cannot be read as a raster", prepare=_file("eirp.tif")),
    _toml("a raster without a CRS", EIRP, RASTER, r"eirp\.tif: has no coordinate reference system; store the raster with one", prepare=_raster("eirp.tif", crs=None, value=50.0)),
    _toml("a raster without a value", EIRP, RASTER, r"eirp\.tif: has no value in any cell", prepare=_raster("eirp.tif", crs="EPSG:4326", value=-1.0)),
    _toml("a raster in dBm", EIRP, RASTER, r"eirp\.tif: .*dBW", prepare=_raster("eirp.tif", crs="EPSG:4326", value=80.0)),
    _toml("contours that are no vector file", EIRP, CONTOURS, r"eirp\.gpkg: cannot be read as a vector file", prepare=_file("eirp.gpkg")),
    _toml("contours without their field", EIRP, CONTOURS, r"eirp\.gpkg: .*dbw.*level", prepare=_vector("eirp.gpkg", [SQUARE], level=[50.0])),
    _toml("contours that cross", EIRP, CONTOURS, r"eirp\.gpkg: feature 2 \(48 dBW\) and feature 1 \(50 dBW\) meet near .*mend one of them", prepare=_vector("eirp.gpkg", [SQUARE.replace("POLYGON((", "LINESTRING(").replace("))", ")"), "LINESTRING(-65 -45, -55 -45, -55 -35, -65 -35, -65 -45)"], dbw=[50.0, 48.0])),
    _toml("a contour left open", EIRP, CONTOURS, r"eirp\.gpkg: feature 1 .*clos", prepare=_vector("eirp.gpkg", ["LINESTRING(-70 -40, -60 -40, -60 -30, -70 -30)", "LINESTRING(-75 -45, -55 -45, -55 -25, -75 -25, -75 -45)"], dbw=[50.0, 48.0])),
    _toml("contours without a feature", EIRP, CONTOURS, r"eirp\.gpkg: has no features", prepare=_vector("eirp.gpkg", [], dbw=[])),
    _toml("distances that are none", "[decision]", CREW + '[visits]\nfirst_day = 2027-05-03\ndistances = "km.csv"\n\n[decision]', r"km\.csv:2: 'far' is not a distance in km", arguments=("check", "{plan}"), prepare=_file("km.csv", b"from,to,km\nA,B,far\n")),
]  # fmt: skip

COMMAND_LINES = [
    _line("an unknown command", "rasters {plan} --out {out}", r"no command is named 'rasters'; did you mean raster\?"),
    _line("an unknown option", "run {plan} --output {out}", r"--output.*--out"),
    _line("no output", "run {plan}", r"Missing option '--out'"),
    _line("no scenario", "check", r"Missing argument 'SCENARIO'"),
    _line("a place of one number", "spot {plan} --at -33.9", r"'-33\.9' is not LAT,LON in degrees, as in --at=-33\.9,18\.4"),
    _line("longitude before latitude", "spot {plan} --at 118.4,-33.9", r"latitude 118\.4 is not within −90 to 90 \(latitude comes first\)"),
    _line("a place that is not a number", "spot {plan} --at nan,10", r"latitude nan is not within"),
    _line("a height in space", "spot {plan} --at -33,-65 --height 90000", r"--height.*90000"),
    _line("an unknown layer", "raster {plan} --out {out} --layer skew_afer", r"no layer is named 'skew_afer'; did you mean skew_after\?"),
    _line("an unknown layer on the map", "fieldmap {plan} --out {in}/m.html --layer skew", r"layer 'skew'"),
    _line("a layer without its part", "raster {plan} --out {out} --layer margin_after_rain --layer rain_after", r"no layer is named 'margin_after_rain'"),
    _line("rain without weather", "raster {plan} --out {out} --layer rain_after", r"layer rain_after needs \[weather\]"),
    _line("contours of classes", "contours {plan} --out {in}/c.gpkg --layer action", r"layer action holds classes, which have no contours"),
    _line("contours at no distance", "contours {plan} --out {in}/c.gpkg --layer skew_after --every 0", r"a step of 0 between contours is not above 0"),
    _line("contours without end", "contours {plan} --out {in}/c.gpkg --layer skew_after --every 0.0001", r"layer skew_after: contours every 0\.0001 deg would be about \d+ levels"),
    _line("contours as another format", "contours {plan} --out {in}/c.shp", r"c\.shp: contours are written as GeoPackage; give a name that ends in \.gpkg"),
    _line("a table as another format", "sites {plan} --out {in}/s.ods", r"s\.ods: the ending tells the format of a table; give one of \.csv"),
    _line("cards as another format", "cards {plan} --out {in}/c.docx", r"c\.docx: job cards are written as \.html or \.pdf"),
    _line("a map as another format", "fieldmap {plan} --out {in}/m.png", r"m\.png: the map is an HTML file"),
    _line("visits as another format", "visits {plan} --out {in}/v.json", r"v\.json: the ending \.json names no form of a plan of visits"),
    _line("rejected rows as the result", "sites {plan} --out {in}/rejected.csv", r"rejected\.csv is the list of rows that cannot be used"),
    _line("a nodata number that layers take", "raster {plan} --out {out} --layer eirp_after --nodata 49", r"nodata 49 is a value of layer eirp_after"),
    _line("a nodata number that does not fit", "raster {plan} --out {out} --layer skew_after --nodata 1e300", r"nodata 1e\+300 does not fit a 32-bit float"),
    _line("an unknown precision", "raster {plan} --out {out} --precision half", r"'half' is not one of 'standard', 'full'"),
    _line("no worker", "raster {plan} --out {out} --workers 0", r"--workers.*0 is not in the range"),
    _line("tiles without their numbers", "run {plan} --out {out} --tiles https://tiles.example/map.png", r"tiles: 'https://tiles\.example/map\.png' is not the address of a tile server"),
    _line("sites of an unknown column", "fieldmap {plan} --out {in}/m.html --only area=North", r"--only area=North: the assessed sites have no column 'area'"),
    _line("sites that do not exist", "fieldmap {plan} --out {in}/m.html --only district=West", r"--only district=West: no site is left"),
    _line("a choice that is none", "fieldmap {plan} --out {in}/m.html --only North", r"'North' is not COLUMN=VALUE"),
    _line("a blur across the globe", "fieldmap {plan} --out {in}/m.html --blur 20", r"--blur.*20.*is not in the range"),
    _line("a report as another format", "report {plan} --out {in}/r.docx", r"r\.docx: a report is written as \.html or \.pdf"),
    _line("a comparison with nothing", "report {plan} --against {in}/other.toml --out {in}/r.html", r"other\.toml: there is no such scenario file"),
    _line("zones as another format", "zones {plan} --tolerance 5 --out {in}/z.shp", r"z\.shp: zones are written as \.gpkg or \.geojson"),
    _line("zones of no width", "zones {plan} --tolerance 0 --out {in}/z.gpkg", r"--tolerance 0 is not above 0 and at most 90 degrees"),
    _line("zones without their districts", "zones {plan} --tolerance 5 --districts {in}/d.gpkg --out {in}/z.gpkg", r"d\.gpkg: no such file"),
    _line("reports that do not exist", "reports {plan} --reports {in}/week.csv --out {out}", r"week\.csv: no such file; give the report file that a crew sent"),
    _line("a database that nobody named", "database {plan}", r"database: is missing, but needed for .*: add \[database\] with url_env"),
    _line("a cluster that is none", "run {plan} --out {out} --cluster nonsense", r"--cluster 'nonsense' is neither the address of a scheduler"),
    _line("an unknown demonstration", "demo --scenario moon --out {out}", r"demonstration 'moon' is not one of: slot-change, southern-cone"),
    _line("the scenario as the result", "sites {plan} --out {in}/sites.csv --overwrite", r"sites\.csv is an input of this scenario"),
    _line("new over a folder", "new {in}/taken", r"taken is a folder; give the name of a file", prepare=_folder("taken")),
    _line("new in no folder", "new {out}/plan.toml", r"the folder .*out does not exist; make it"),
]  # fmt: skip

PARTS_AND_PLACES = [
    Wrong("cards without the moment", (r"changeover: is missing, but needed for job cards: add changeover = ",), ("cards", "{plan}", "--out", "{in}/c.html"), text=_with("changeover = 2027-05-18T03:00:00Z\n", "")),
    Wrong("visits without crews", (r"crews: is missing, but needed for a plan of visits: add \[\[crew\]\]",), ("visits", "{plan}", "--out", "{in}/v.csv")),
    Wrong("contours without a region", (r"region: is missing, but needed for contours: add \[region\]",), ("contours", "{plan}", "--out", "{in}/c.gpkg"), text=_without("region")),
    Wrong("rasters without a region", (r"region: is missing, but needed for a raster",), ("raster", "{plan}", "--out", "{out}"), text=_without("region")),
    Wrong("a table without sites", (r"sites: is missing, but needed for an assessed site list: add \[sites\]",), ("sites", "{plan}", "--out", "{in}/s.csv"), text=_without("sites")),
    _line("a file where the folder is to be", "run {plan} --out {in}/taken", r"taken is a file, not a folder", prepare=_file("taken")),
    _line("a file where a folder above is to be", "raster {plan} --out {in}/taken/layers", r"taken is a file, not a folder", prepare=_file("taken")),
    _line("no folder for a single file", "sites {plan} --out {out}/s.csv", r"the folder .*out does not exist; make it"),
    _line("a foreign file under a final name", "sites {plan} --out {in}/s.csv", r"s\.csv already exists and is not a result .*--overwrite to replace", prepare=_file("s.csv")),
    _line("foreign files in the folder of a run", "run {plan} --out {in}/mine", r"contours\.gpkg already exists.*--overwrite", prepare=lambda folder: (_folder("mine")(folder), _file("mine/contours.gpkg")(folder))[0]),
    _line("a folder under a final name", "sites {plan} --out {in}/s.csv --overwrite", r"s\.csv is a folder; give the name of a file", prepare=_folder("s.csv")),
    _line("a GeoPackage that is open elsewhere", "sites {plan} --out {in}/s.gpkg --overwrite", r"s\.gpkg is open in another program", prepare=lambda folder: (_file("s.gpkg")(folder), _file("s.gpkg-wal")(folder))[0], status=1),
]  # fmt: skip

WRONG = [
    *FILE_AS_A_WHOLE,
    *KEYS_AND_VALUES,
    *REGIONS,
    *SITE_LISTS,
    *FOOTPRINTS,
    *COMMAND_LINES,
    *PARTS_AND_PLACES,
]
