"""The commented scenario to start from."""

from __future__ import annotations

from typing import Final

TEMPLATE: Final = """\
# A changeover study: a network of fixed dishes moves from one geostationary satellite to another.
# Lines that begin with "#" and a space explain. Lines that begin with "#" and a word are keys left out,
# with their default or an example: remove the "#" to use one. Times are in UTC, angles in degrees,
# east and north positive. Paths are relative to this file. `geoskew check FILE` lists all that is wrong.

title = "Changeover of the lesson network"

# When the new satellite takes over: with Z for UTC, or an offset such as -03:00.
# Needed for the plan of visits, the job cards and the report.
changeover = 2027-05-18T03:00:00Z
# How many hours both satellites carry the traffic.
#overlap_hours = 0

# ---- The satellite in service ------------------------------------------------------------------------
[outgoing]
name = "Old satellite"
longitude_deg = -66.2
# Latitude of the point below the satellite at the changeover, for one in an inclined orbit.
#latitude_deg = 0.0
# Turn of the polarisation planes, as the operator states it: counter-clockwise from the equatorial plane
# as seen from the satellite. Nominal H lies along the equator at 0.
tilt_deg = 21.0
# Where the beam's axis meets the Earth; without it, the point below the satellite.
#aim = { lon_deg = -64.0, lat_deg = -36.5 }
# Cross-polar isolation of the satellite's antenna, dB.
#isolation_db = 30.0
# Power towards the ground: exactly one of these four.
eirp_dbw = 50.0
#eirp_contours = { file = "eirp-old.gpkg", field = "dbw" }
#eirp_raster = "eirp-old.tif"
#beam = { peak_dbw = 52.0, major_deg = 3.2, minor_deg = 1.8, orientation_deg = 20.0, pattern = "gaussian" }
# Operating point against a footprint of saturated power, dB, and how far the footprint may be wrong
# (standard deviation, dB).
#eirp_offset_db = 0.0
#eirp_spread_db = 0.0

# ---- The satellite that takes over: the same keys ----------------------------------------------------
[incoming]
name = "New satellite"
longitude_deg = -66.2
tilt_deg = 0.0
eirp_dbw = 50.0

# Keys of [carrier] that change with the changeover stand here; [outgoing.carrier] does the same for the
# time before. With several carriers, write [[incoming.carrier]] with the name of the one it is for.
#[incoming.carrier]
#frequency_ghz = 12.05

# ---- The carrier that the dishes receive -------------------------------------------------------------
# Several carriers: write [[carrier]] above each and give each a name = "...".
[carrier]
# V, H, L (left-hand circular) or R.
polarisation = "V"
frequency_ghz = 11.95
symbol_rate_mbaud = 27.5
#roll_off = 0.20
# A waveform of EN 302 307-1 ("8PSK 3/4") or EN 300 421 ("EN 300 421 QPSK 3/4"); or the Es/N0 it needs.
modcod = "8PSK 3/4"
#required_es_n0_db = 7.9
#implementation_loss_db = 0.0
# Is the crossed polarisation in use, and how strong is it against this carrier, dB?
#crossed = true
#crossed_offset_db = 0.0
# Ratios for the uplink and for adjacent satellites, dB; without them, no such noise.
#uplink_cn_db = 24.0
#adjacent_ci_db = 20.0

# ---- The terminals -----------------------------------------------------------------------------------
# What holds where the site list has no column of that name.
[terminal]
dish_m = 0.9
#efficiency = 0.65
#noise_figure_db = 0.8
#feed_loss_db = 0.0
#radome_loss_db = 0.0
# Noise picked up from the ground, K.
#ground_noise_k = 10.0
# Cross-polar isolation of dish and feed, dB.
#isolation_db = 25.0
#pointing_error_deg = 0.0
# How well feeds are set: standard deviation around the intended setting.
#setting_spread_deg = 3.0
# Distance of the marks on the feed's scale.
#scale_step_deg = 5.0
# 2 where both polarisations are led out of the feed, so that ports can be swapped.
#ports = 1
#mount = "azel"
#transmits = false
# Receive pattern off the axis: "BO.1213", "S.465" or "S.580"; without it, the one that fits the band.
#receive_mask = "S.465"

# ---- Where results are wanted: a region for rasters and maps, a site list, or both --------------------
[region]
# west, south, east, north; west beyond east crosses 180.
bounds_deg = [-76.0, -56.0, -53.0, -17.0]
# Or a polygon from a vector file, in place of the bounds.
#outline = "region.gpkg"
# Size of a cell; or crs, a projected system in metres, with step_m.
step_deg = 0.25
#crs = "EPSG:32720"
#step_m = 5000
# Below this elevation a satellite serves nobody.
#lowest_elevation_deg = 5.0

#[sites]
# CSV, GeoPackage, GeoJSON, GeoParquet or XLSX with columns id, lat, lon.
#file = "sites.csv"
# Where the file names its columns otherwise: ours = "theirs".
#columns = { id = "code", lat = "latitude", lon = "longitude" }
# Where its coordinates are not in WGS 84, and which layer of a file with several.
#crs = "EPSG:4326"
#layer = "sites"

# ---- Optional: weather and terrain -------------------------------------------------------------------
#[weather]
# Share of an average year for which the link must hold.
#availability_percent = 99.5

#[terrain]
# An elevation raster or a folder of them, its unit ("m" or "ft"), clutter heights above it.
#dem = "dem.tif"
#unit = "m"
#clutter = "clutter.tif"
#antenna_height_m = 0.0

# ---- What the actions are judged by ------------------------------------------------------------------
[decision]
# Margin kept for what the budget does not model, dB.
#reserve_db = 1.0
# Where the reserve cannot be kept at all: how much below the best margin is still accepted, dB.
#allowed_loss_db = 0.5
# "rain" or "clear"; without it, rain where there is [weather].
#judged_in = "clear"
# How crossed polarisations add up: "power", or "phasor" for the worst case.
#addition = "power"

# ---- Optional: satellites that disturb; write it once for each ---------------------------------------
#[[neighbour]]
#name = "Neighbour east"
#longitude_deg = -63.0
#latitude_deg = 0.0
#polarisation = "H"
#eirp_dbw = 49.0
#tilt_deg = 0.0
#isolation_db = 30.0
# "both", "before" or "after" the changeover.
#when = "both"

# ---- Optional: who goes out and when; one [[crew]] for each ------------------------------------------
#[[crew]]
#name = "Crew north"
#base = { lon_deg = -64.2, lat_deg = -31.4 }
#visits_per_day = 5
#km_per_day = 350
#days = ["monday", "tuesday", "wednesday", "thursday", "friday"]
#off = [2027-05-03]

#[visits]
#first_day = 2027-04-19
# Road over straight distance, or a file of distances.
#detour = 1.3
#distances = "distances.csv"
#solver_seconds = 5

# ---- Optional: a database; the environment variable holds its address, which never stands here --------
# query gives the site list in place of [sites]; table takes results, where run (else this file's name)
# tells the rows of this study from those of others.
#[database]
#url_env = "SITES_DATABASE"
#query = "select id, lat, lon from sites"
#id = "id"
#table = "assessed_sites"
#run = "plan"
"""
