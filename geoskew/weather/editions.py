"""Which recommendation, in which edition, each weather number comes from: one line each, for reports."""

from __future__ import annotations

EDITIONS: tuple[str, ...] = (
    "All weather values are statistics of an average year, not of the worst month",
    "Total attenuation: ITU-R P.618-14 §2.5, gas and cloud held at their 5 % values below 5 %, "
    "no rain above 5 %",
    "Rain attenuation: ITU-R P.618-14 §2.2.1.1, 0.001 to 5 %, up to 55 GHz",
    "Specific attenuation of rain: ITU-R P.838-3, with each place's own polarisation tilt",
    "Rain rate exceeded for 0.01 %: map of ITU-R P.837-7; rain height: map of ITU-R P.839-4 plus 0.36 km",
    "Gas: ITU-R P.676-12 Annex 2, elevation 5° and above",
    "Surface data of the gas: ITU-R P.836-6 (water vapour), P.1510-1 (temperature), P.835-6 (pressure)",
    "Clear sky: gas alone, water vapour at its median (50 %)",
    "Cloud: ITU-R P.840-8, elevation 5° and above",
    "Scintillation: ITU-R P.618-14 §2.4.1 with the median map of ITU-R P.453-13; "
    "below 0.01 % its value at 0.01 %",
    "Depolarisation by rain and ice: ITU-R P.618-14 §4.1, 4 to 55 GHz, elevation held to 60°, "
    "canting interpolated in the logarithm of the percentage",
    "Height of places without one, for weather alone: topography of ITU-R P.1511-2",
)
