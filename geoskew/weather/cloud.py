"""Attenuation by clouds: Rec. ITU-R P.840-8."""

from __future__ import annotations


def liquid_coefficient(frequency_ghz: float, temperature_c: float = 0.0) -> float:
    """Specific attenuation coefficient of cloud liquid water, (dB/km)/(g/m³): P.840-8, eq. (2)-(11).

    Rayleigh scattering with a double-Debye model of water, up to 200 GHz. The reduced columns of the
    recommendation's maps belong to 0 °C. The slant attenuation is column × coefficient / sin θ,
    eq. (12), for elevations of 5° to 90°.
    """
    f = frequency_ghz
    theta = 300.0 / (temperature_c + 273.15)
    static = 77.66 + 103.3 * (theta - 1.0)
    middle, optical = 0.0671 * static, 3.52
    principal = 20.20 - 146.0 * (theta - 1.0) + 316.0 * (theta - 1.0) ** 2
    secondary = 39.8 * principal
    first = (static - middle) / (1.0 + (f / principal) ** 2)
    second = (middle - optical) / (1.0 + (f / secondary) ** 2)
    real = first + second + optical
    imaginary = f / principal * first + f / secondary * second
    eta = (2.0 + real) / imaginary
    return 0.819 * f / (imaginary * (1.0 + eta * eta))
