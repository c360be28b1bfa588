"""Physical and geodetic constants, each with its unit and its authority."""

from __future__ import annotations

from typing import Final

# WGS 84, NGA.STND.0036.
EARTH_EQUATORIAL_RADIUS_M: Final = 6_378_137.0
EARTH_FLATTENING: Final = 1.0 / 298.257223563
EARTH_ECCENTRICITY_SQUARED: Final = EARTH_FLATTENING * (2.0 - EARTH_FLATTENING)

# Radius of the geostationary circle: (GM T² / 4π²)^(1/3) with GM = 3.986004418e14 m³/s² and
# the sidereal day T = 86 164.0905 s gives 42 164.1696 km.
GEOSTATIONARY_RADIUS_M: Final = 42_164_170.0

# Exact by the definition of the metre and of the kelvin (SI, 2019).
SPEED_OF_LIGHT_M_S: Final = 299_792_458.0
# −10·log10(k) with k = 1.380649e-23 J/K, in dBW/(K·Hz).
BOLTZMANN_DB: Final = 228.599_167_7

# Reference temperature of noise figures (IEEE), K.
REFERENCE_TEMPERATURE_K: Final = 290.0
# Mean radiating temperature of the medium and cosmic background, ITU-R P.618-14 §3.
MEDIUM_TEMPERATURE_K: Final = 275.0
COSMIC_TEMPERATURE_K: Final = 2.7
