"""Check solutions: how far the probe was off, and what to do about it.

δ = Eh_solution(T) − reading − E_ref(T) is what a perfect probe would have had to be raised by. Between two checks of
one probe and day it is taken linear in time; a single one is constant.
"""

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
import pandas as pd

from gley.findings import Findings, Place
from gley.probe.electrodes import half_cells
from gley.probe.solutions import curves, find_solution
from gley.settings import ProbeSettings

_SAME_mV = 5.0


@dataclass(frozen=True)
class Check:
    """One usable check reading: whose, when (minutes of the day, NaN unknown), and δ in mV."""

    probe: str
    day: pd.Timestamp
    minute: float
    delta_mV: float


@dataclass(frozen=True)
class Correction:
    """What checks give the samples (n,): δ to apply and half the drift between checks in mV, whether a check counts."""

    delta_mV: np.ndarray
    drift_mV: np.ndarray
    checked: np.ndarray
    refused_mV: np.ndarray


def minutes(text: pd.Series) -> np.ndarray:
    """Minutes of the day from `HH:MM` (NaN where there is no time)."""
    parts = text.fillna("").astype(str).str.extract(r"^(\d{1,2}):(\d{2})")
    return (pd.to_numeric(parts[0]) * 60 + pd.to_numeric(parts[1])).to_numpy(float)


def read_checks(
    survey, electrode_of: Callable[[str, str], str], stated: ProbeSettings, findings: Findings
) -> list[Check]:
    """Usable checks of a survey; each that can't be used, and each deviation, is a finding.

    Parameters
    ----------
    survey : Survey
        Its table `checks`.
    electrode_of : callable
        (probe, electrode as written) → the table's electrode name, '' when there is none.
    stated : ProbeSettings
        Policy.
    findings : Findings
        Added to.
    """
    table, times = survey.checks, minutes(survey.checks["time"])
    found = []
    for row, minute in zip(table.index, times, strict=True):
        words = table.loc[row]
        where = survey.origin.of("checks", row, "reading_mV")
        solution = find_solution(words["solution"])
        cell = electrode_of(words["probe"], words["electrode"])
        lacking = _lacking(words, solution, cell)
        if lacking:
            findings.add("probe.check_unusable", where, words["reading_mV"], reason=lacking)
            continue
        temperature = np.array([float(words["temperature_C"])])
        expected, beyond = (float(part[0]) for part in curves()[solution].at(temperature))
        reference = float(half_cells()[cell].at(temperature)[0][0])
        if beyond:
            words_T = {"T": f"{temperature[0]:g}", "solution": solution, "held": f"{expected:.0f}"}
            findings.add("probe.check_outside", where, words["reading_mV"], **words_T)
        delta = expected - float(words["reading_mV"]) - reference
        _judge(delta, solution, expected, float(words["reading_mV"]), temperature, cell, where, stated, findings)
        found.append(Check(words["probe"], words["date"], float(minute), delta))
    return found


def _lacking(words: pd.Series, solution: str, cell: str) -> str:
    """Why a check can't be used; '' when it can."""
    if not solution:
        return f"'{words['solution']}' isn't a check solution in the table ({', '.join(curves())})"
    if np.isnan(words["temperature_C"]):
        return "its temperature is missing, and the solution's potential depends on it"
    if np.isnan(words["reading_mV"]):
        return "its reading is missing"
    return "" if cell else "no reference electrode is known for it"


def _judge(delta, solution, expected, reading, temperature, cell, where: Place, stated, findings: Findings) -> None:
    """A finding for every deviation, by the policy of the settings; a fill that would explain a large one is named."""
    size = abs(delta)
    words = {"solution": solution, "delta": f"{delta:+.0f}", "expected": f"{expected:.0f}", "T": f"{temperature[0]:g}"}
    if size <= stated.check_good_mV:
        rule = "probe.check_good"
    elif size <= stated.check_accepted_mV:
        rule = "probe.check_accepted"
    elif size <= stated.check_flagged_mV:
        rule = "probe.check_flagged"
    else:
        findings.add(
            "probe.check_failed", where, f"{reading:g}", **words, explained=_explained(delta, cell, temperature)
        )
        return
    findings.add(rule, where, f"{reading:g}", **words)


def _explained(delta: float, cell: str, temperature: np.ndarray) -> str:
    """Which other electrode would bring the check within 5 mV, in words."""
    own = half_cells()[cell].at(temperature)[0][0]
    off = {name: abs(own + delta - item.at(temperature)[0][0]) for name, item in half_cells().items() if name != cell}
    name, least = min(off.items(), key=lambda item: item[1])
    return (
        f"an electrode {name} would explain it" if least <= _SAME_mV else "no other electrode of the table explains it"
    )


def corrections(samples: pd.DataFrame, checks: list[Check], stated: ProbeSettings) -> Correction:
    """δ for each sample from the checks of its probe and day.

    A check without a day serves all days of its probe, one without a probe serves all probes. Where one of a day's
    checks deviates by more than the flagged limit nothing is applied (`refused_mV` tells what it would have been).
    """
    n = len(samples)
    delta, drift, refused = np.zeros(n), np.zeros(n), np.full(n, np.nan)
    checked = np.zeros(n, bool)
    minute = minutes(samples["time"])
    for i, (probe, day) in enumerate(zip(samples["probe"], samples["date"], strict=True)):
        own = _serving(checks, probe, day)
        if not own:
            continue
        value, spread = _at(own, minute[i])
        if max(abs(item.delta_mV) for item in own) > stated.check_flagged_mV:
            refused[i] = value
            continue
        delta[i], drift[i], checked[i] = value, spread, True
    return Correction(delta, drift, checked, refused)


def _serving(checks: list[Check], probe: str, day: pd.Timestamp) -> list[Check]:
    of_probe = [item for item in checks if not item.probe or not probe or item.probe.casefold() == probe.casefold()]
    return [item for item in of_probe if pd.isna(item.day) or (not pd.isna(day) and item.day == day)]


def _at(own: list[Check], minute: float) -> tuple[float, float]:
    """δ at a time of the day and half the spread of the checks around it."""
    values = np.array([item.delta_mV for item in own])
    times = np.array([item.minute for item in own])
    spread = float(values.max() - values.min()) / 2
    if np.isnan(minute) or np.isnan(times).any():
        return float(values.mean()), spread
    order = np.argsort(times, kind="stable")
    return float(np.interp(minute, times[order], values[order])), spread
