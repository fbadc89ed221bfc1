"""Check solutions: how far the probe was off, and what to do about it.

δ = Eh_solution(T) − reading − E_ref(T) is what a perfect probe would have had to be raised by. Between two checks of
one probe and day it is taken linear in time; a single one is constant.
"""

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
import pandas as pd

from gley.findings import Findings, Place
from gley.probe.electrodes import Curve, half_cells
from gley.probe.naming import FILL_UNKNOWN
from gley.probe.solutions import curves, find_solution
from gley.settings import ProbeSettings

_SAME_mV = 5.0


@dataclass(frozen=True)
class Check:
    """One usable check reading: whose, when (minutes of the day, NaN unknown), δ and its own doubt in mV."""

    probe: str
    day: pd.Timestamp
    minute: float
    delta_mV: float
    doubt_mV: float = 0.0


@dataclass(frozen=True)
class Correction:
    """What checks give the samples (n,): δ to apply and its doubt in mV, whether a check counts.

    The doubt is half the drift between the day's checks, with that of a solution outside its published range.
    `refused_mV` is δ where it was too large to apply, `unclear` marks samples that can't be told to one probe.
    """

    delta_mV: np.ndarray
    drift_mV: np.ndarray
    checked: np.ndarray
    refused_mV: np.ndarray
    unclear: np.ndarray


def minutes(text: pd.Series) -> np.ndarray:
    """Minutes of the day from `HH:MM` (NaN where there is no time)."""
    parts = text.fillna("").astype(str).str.extract(r"^(\d{1,2}):(\d{2})")
    return (pd.to_numeric(parts[0]) * 60 + pd.to_numeric(parts[1])).to_numpy(float)


def read_checks(
    survey, electrode_of: Callable[[str, str], Curve | None], stated: ProbeSettings, findings: Findings
) -> list[Check]:
    """Usable checks of a survey; each that can't be used, and each deviation, is a finding.

    Parameters
    ----------
    survey : Survey
        Its table `checks`.
    electrode_of : callable
        (probe, electrode as written) → the half-cell, None when there is none.
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
        if lacking or cell is None:
            findings.add("probe.check_unusable", where, words["reading_mV"], reason=lacking)
            continue
        reading, temperature = float(words["reading_mV"]), float(words["temperature_C"])
        expected, doubt = _expected(solution, temperature, where, reading, findings)
        delta = expected - reading - float(cell.at(np.array([temperature]))[0][0])
        _judge(delta, solution, expected, reading, temperature, cell, where, stated, findings)
        found.append(Check(words["probe"], words["date"], float(minute), delta, doubt))
    return found


def _expected(solution: str, temperature: float, where: Place, reading: float, findings: Findings):
    """What a solution should show in mV, and the doubt in mV where its temperature leaves the published range.

    There the end value is held; it is as far off as the curve's end slope makes it, at least 1 mV/°C.
    """
    curve = curves()[solution]
    expected, beyond = (float(part[0]) for part in curve.at(np.array([temperature])))
    if not beyond:
        return expected, 0.0
    ends = slice(0, 2) if temperature < curve.T_C[0] else slice(-2, None)
    steep = abs(float(np.ptp(curve.E_mV[ends]) / np.ptp(curve.T_C[ends]))) if len(curve.T_C) > 1 else 0.0
    doubt = beyond * max(1.0, steep)
    words = {"T": f"{temperature:g}", "solution": solution, "held": f"{expected:.0f}", "doubt": f"{doubt:.0f}"}
    findings.add("probe.check_outside", where, f"{reading:g}", **words)
    return expected, doubt


def _lacking(words: pd.Series, solution: str, cell: Curve | None) -> str:
    """Why a check can't be used; '' when it can."""
    if not solution:
        return f"'{words['solution']}' isn't a check solution in the table ({', '.join(curves())})"
    if np.isnan(words["temperature_C"]):
        return "its temperature is missing, and the solution's potential depends on it"
    if np.isnan(words["reading_mV"]):
        return "its reading is missing"
    return "" if cell else "no one reference electrode is known for it"


def _judge(delta, solution, expected, reading, temperature, cell, where: Place, stated, findings: Findings) -> None:
    """A finding for every deviation, by the policy of the settings; a fill that would explain a large one is named."""
    size = abs(delta)
    words = {"solution": solution, "delta": f"{delta:+.0f}", "expected": f"{expected:.0f}", "T": f"{temperature:g}"}
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


def _explained(delta: float, cell: Curve, temperature: float) -> str:
    """Which other electrodes would bring the check within 5 mV, the nearest first, in words."""
    at = np.array([temperature])
    needed = float(cell.at(at)[0][0]) + delta
    others = [item for name, item in half_cells().items() if name not in (cell.name, FILL_UNKNOWN)]
    off = {item.name: abs(needed - float(item.at(at)[0][0])) for item in others}
    fitting = sorted((name for name in off if off[name] <= _SAME_mV), key=off.__getitem__)
    return f"{' or '.join(fitting)} would explain it" if fitting else "no other electrode of the table explains it"


def corrections(samples: pd.DataFrame, checks: list[Check], stated: ProbeSettings) -> Correction:
    """δ for each sample from the checks of its probe and day.

    A check without a day serves all days of its probe, one without a probe serves all probes. Where one of a day's
    checks deviates by more than the flagged limit nothing is applied (`refused_mV` tells what it would have been);
    nor where the sample names no probe and the day's checks are of several.
    """
    n = len(samples)
    delta, drift, refused = np.zeros(n), np.zeros(n), np.full(n, np.nan)
    checked, unclear = np.zeros(n, bool), np.zeros(n, bool)
    minute = minutes(samples["time"])
    for i, (probe, day) in enumerate(zip(samples["probe"], samples["date"], strict=True)):
        own = _serving(checks, probe, day)
        if not own:
            continue
        if not probe and len({item.probe.casefold() for item in own if item.probe}) > 1:
            unclear[i] = True
            continue
        value, spread = _at(own, minute[i])
        if max(abs(item.delta_mV) for item in own) > stated.check_flagged_mV:
            refused[i] = value
            continue
        delta[i], drift[i], checked[i] = value, spread, True
    return Correction(delta, drift, checked, refused, unclear)


def _serving(checks: list[Check], probe: str, day: pd.Timestamp) -> list[Check]:
    of_probe = [item for item in checks if not item.probe or not probe or item.probe.casefold() == probe.casefold()]
    return [item for item in of_probe if pd.isna(item.day) or (not pd.isna(day) and item.day == day)]


def _at(own: list[Check], minute: float) -> tuple[float, float]:
    """δ at a time of the day and its doubt: half the spread of the day's checks, with their largest own doubt."""
    values = np.array([item.delta_mV for item in own])
    times = np.array([item.minute for item in own])
    spread = float(np.hypot(np.ptp(values) / 2, max(item.doubt_mV for item in own)))
    if np.isnan(minute) or np.isnan(times).any():
        return float(values.mean()), spread
    order = np.argsort(times, kind="stable")
    return float(np.interp(minute, times[order], values[order])), spread
