"""Readings typed on the command line to Eh, one record each."""

from collections.abc import Sequence
from typing import Any

import numpy as np

from gley.constants import pe_from_Eh
from gley.errors import UsageError
from gley.probe.electrodes import find_electrode, half_cells
from gley.probe.naming import FILL_UNKNOWN
from gley.settings import Settings


def convert(
    readings: Sequence[float], electrode: str, temperature_C: float | None = None, settings: Settings | None = None
) -> list[dict[str, Any]]:
    """Eh of ORP readings against one reference electrode at one temperature.

    Parameters
    ----------
    readings : sequence of float
        ORP in mV.
    electrode : str
        Reference electrode with its filling solution.
    temperature_C : float, optional
        Temperature in °C; without it the assumed one of the settings (25 °C) is taken, said in `source` and added to
        the standard deviation.
    settings : Settings, optional
        Standard deviations and the assumed temperature.

    Returns
    -------
    list of dict
        `orp_mV`, `electrode`, `temperature_C`, `reference_mV`, `Eh_mV`, `Eh_sd_mV`, `pe`, `source`.

    Raises
    ------
    UsageError
        For an electrode that is missing or unknown, a temperature outside −5 … 100 °C, a reading beyond ±2000 mV.
    """
    settings = settings or Settings()
    stated, assumed = settings.probe, settings.stability.assumed_temperature_C
    if not electrode:
        message = "No reference electrode named."
        raise UsageError(message, f"Give --electrode, one of: {'; '.join(half_cells())}.")
    cell = half_cells()[find_electrode(electrode)]
    t = assumed if temperature_C is None else float(temperature_C)
    if not -5.0 <= t <= 100.0:
        message = f"Temperature {t:g} °C: −5 to 100 °C is wanted."
        raise UsageError(message, "Give the temperature of the sample in °C.")
    off = [value for value in readings if not abs(value) <= 2000.0]
    if off:
        message = f"ORP {off[0]:g} mV: −2000 to 2000 mV is wanted."
        raise UsageError(message, "Give the reading in mV.")
    potential, beyond = (float(part[0]) for part in cell.at(np.array([t])))
    parts = [stated.sd_unchecked_mV, beyond]
    parts += [stated.sd_fill_unknown_mV] if cell.name == FILL_UNKNOWN else []
    parts += [stated.sd_no_temperature_mV] if temperature_C is None else []
    source = "; ".join(cell.sources)
    source += f"; temperature not given, {t:g} °C taken" if temperature_C is None else ""
    if beyond:
        source += f"; {t:g} °C is outside the published {cell.T_C[0]:g} to {cell.T_C[-1]:g} °C, end value held"
    return [
        {
            "orp_mV": float(value),
            "electrode": cell.name,
            "temperature_C": t,
            "reference_mV": potential,
            "Eh_mV": float(value) + potential,
            "Eh_sd_mV": float(np.sqrt(np.sum(np.square(parts)))),
            "pe": float(pe_from_Eh(float(value) + potential, t)),
            "source": source,
        }
        for value in readings
    ]
