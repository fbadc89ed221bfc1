"""Physical constants and the three functions of temperature that every room needs.

Values are the exact CODATA 2018 ones (SI redefinition of 2019).
"""

import math

R_J_MOL_K = 8.314462618
"""Molar gas constant, J/(mol K)."""

F_C_MOL = 96485.33212
"""Faraday constant, C/mol."""

LN10 = math.log(10.0)

ZERO_C_K = 273.15
"""0 °C in kelvin."""

T0_K = 298.15
"""Reference temperature of the thermodynamic tables, K (25 °C)."""


def kelvin(temperature_C):
    """Temperature in K from °C (scalar or array)."""
    return temperature_C + ZERO_C_K


def nernst_slope_mV(temperature_C):
    """RT ln10 / F in mV per decade at a temperature in °C (scalar or array): 59.16 at 25 °C."""
    return 1000.0 * R_J_MOL_K * kelvin(temperature_C) * LN10 / F_C_MOL


def pe_from_Eh(Eh_mV, temperature_C):
    """pe = Eh F / (RT ln10); Eh in mV, temperature in °C (scalars or arrays)."""
    return Eh_mV / nernst_slope_mV(temperature_C)
