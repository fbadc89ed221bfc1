"""Eh of every sample of a survey: which electrode, temperature and check, how sure, in words a reviewer follows."""

import numpy as np
import pandas as pd

from gley.columns import columns
from gley.constants import pe_from_Eh
from gley.errors import UsageError
from gley.findings import Findings, some
from gley.probe.checks import Correction, corrections, read_checks
from gley.probe.electrodes import OWN_OFFSET, Curve, find_electrode, half_cells
from gley.probe.naming import FILL_UNKNOWN, HYDROGEN
from gley.settings import ProbeSettings, Settings
from gley.survey import of_station

POISED_mol_L = 1e-5
"""Dissolved iron or sulfide from which platinum settles on the water's own couple: the exchange-current rule of
Morris & Stumm 1967, about 1e-5 M (from memory)."""

_COMMON_CHECKED_mV = 5.0  # what stays common to a day's readings after a check: the window called good
_COMMON_UNCHECKED_mV = 15.0  # and without one: the window up to which a check would have been applied
_DELIVERED_APART_mV = 15.0


def to_Eh(survey, settings: Settings, findings: Findings) -> pd.DataFrame:
    """Eh on the hydrogen scale for every sample.

    Eh = ORP + E_ref(T) + δ, with the reference half-cell at the temperature of the sample and δ from check solutions.

    Parameters
    ----------
    survey : Survey
        Tables `samples`, `stations`, `checks`, `amounts` and `facts`.
    settings : Settings
        Groups `probe` (electrode, offset, standard deviations, policy) and `stability.assumed_temperature_C`.
    findings : Findings
        Added to: every default, doubt and refusal.

    Returns
    -------
    DataFrame
        Index as the samples, columns of the vocabulary's table `eh`.

    Raises
    ------
    UsageError
        When there are ORP readings and no electrode is named anywhere; lists the choices.
    """
    samples, stated = survey.samples, settings.probe
    table = _empty(samples)
    table["temperature_used_C"], table["temperature_basis"] = _temperatures(survey, settings, findings)
    orp = samples["ORP_mV"].to_numpy(float)
    given = samples["Eh_given_mV"].to_numpy(float)
    names = _electrodes(survey, stated, findings)
    reading = ~np.isnan(orp) & (names != "")
    reference, beyond = _references(names, table["temperature_used_C"].to_numpy(float), stated)
    _say_outside(names, beyond, reading, samples, findings)
    checks = read_checks(survey, _finder(survey, names, stated), stated, findings)
    correction = corrections(samples, checks, stated)
    _say_refused(correction, reading, orp + reference, samples, findings)
    if checks:
        _say_unserved(correction, reading, samples, findings)
    delivered = ~reading & ~np.isnan(given)
    Eh = np.where(reading, orp + reference + correction.delta_mV, np.where(delivered, given, np.nan))
    _say_delivered(Eh, given, reading, survey, findings)
    table["Eh_mV"] = Eh
    table["pe"] = pe_from_Eh(Eh, table["temperature_used_C"].to_numpy(float))
    table["reference_mV"] = np.where(reading, reference, np.where(delivered, 0.0, np.nan))
    table["check_offset_mV"] = np.where(reading & correction.checked, correction.delta_mV, np.nan)
    table["electrode_used"] = np.where(reading, names, np.where(delivered, HYDROGEN, ""))
    _spread(table, survey, names, beyond, correction, reading, stated)
    table["Eh_basis"] = _basis(table, correction, reading, delivered)
    table["Eh_status"] = _status(reading, delivered, orp, names)
    return table


def _empty(samples: pd.DataFrame) -> pd.DataFrame:
    n = len(samples)
    made = {
        name: np.full(n, np.nan) if column.dtype == "number" else np.full(n, "", dtype=object)
        for name, column in columns("eh").items()
    }
    return pd.DataFrame(made, index=samples.index)


def _temperatures(survey, settings: Settings, findings: Findings) -> tuple[np.ndarray, np.ndarray]:
    """Temperature of each sample in °C and its basis: measured, else the median of its round and unit, else assumed."""
    samples = survey.samples
    measured = samples["temperature_C"].to_numpy(float)
    used, basis = measured.copy(), np.where(np.isnan(measured), "", "measured").astype(object)
    unit = of_station(samples, survey.stations, "aquifer")
    keys = [[samples["round"], unit], [samples["round"]]]
    words = ["median of the round and unit", "median of the round"]
    for key, name in zip(keys, words, strict=True):
        median = samples["temperature_C"].groupby([part.to_numpy() for part in key]).transform("median").to_numpy(float)
        fill = np.isnan(used) & ~np.isnan(median)
        used, basis = np.where(fill, median, used), np.where(fill, name, basis)
    rest = np.isnan(used)
    assumed = settings.stability.assumed_temperature_C
    used, basis = np.where(rest, assumed, used), np.where(rest, f"assumed {assumed:g} °C", basis)
    has_reading = samples[["ORP_mV", "Eh_given_mV"]].notna().any(axis=1).to_numpy()
    for i in np.flatnonzero(np.isnan(measured) & has_reading):
        where = survey.origin.place(samples.index[i], "temperature_C")
        findings.add("probe.no_temperature", where, f"{used[i]:.1f}", sample=samples["sample"].iloc[i], basis=basis[i])
    return used, basis


def _electrodes(survey, stated: ProbeSettings, findings: Findings) -> np.ndarray:
    """Electrode of each sample by the table's name; '' where none is known."""
    samples = survey.samples
    declared = survey.facts.get("electrode", "")
    at_station = of_station(samples, survey.stations, "electrode")
    written = np.array(
        [own or its or declared for own, its in zip(samples["electrode"], at_station, strict=True)], object
    )
    chosen = (
        OWN_OFFSET if stated.offset_mV is not None else find_electrode(stated.electrode) if stated.electrode else ""
    )
    names = np.full(len(samples), chosen, dtype=object)
    for text in dict.fromkeys(written[written != ""]):
        rows = written == text
        try:
            name = find_electrode(text)
        except UsageError as error:
            where = survey.origin.place(samples.index[np.flatnonzero(rows)[0]], "electrode")
            rule = "probe.electrode_replaced" if chosen else "probe.unknown_electrode"
            said = {"reason": error.message, "cure": error.cure, "chosen": chosen}
            findings.add(rule, where, text, count=int(rows.sum()), **said)
            continue
        if chosen and chosen != name:
            findings.add("probe.electrode_differs", value=chosen, declared=name, count=int(rows.sum()))
        names[rows] = name
    readings = samples["ORP_mV"].notna().to_numpy()
    if readings.any() and not (written != "").any() and not chosen:
        message = "ORP readings, but no reference electrode is named: not in the file, not in the settings."
        raise UsageError(message, f"Give --electrode, one of: {'; '.join(half_cells())}.")
    return names


def _references(names: np.ndarray, temperature: np.ndarray, stated: ProbeSettings) -> tuple[np.ndarray, np.ndarray]:
    """Half-cell potential of each sample in mV and how many °C its temperature lies outside the published range."""
    reference, beyond = np.full(len(names), np.nan), np.zeros(len(names))
    for name in dict.fromkeys(names):
        rows = names == name
        if name == OWN_OFFSET:
            reference[rows] = stated.offset_mV
        elif name:
            reference[rows], beyond[rows] = half_cells()[name].at(temperature[rows])
    return reference, beyond


def _finder(survey, names: np.ndarray, stated: ProbeSettings):
    """(probe, electrode as written) → half-cell of a check: its own, else that of the samples read with the probe."""
    probes = survey.samples["probe"].str.casefold().to_numpy()

    def find(probe: str, written: str) -> Curve | None:
        if written:
            try:
                return half_cells()[find_electrode(written)]
            except UsageError:
                return None
        own = names[(probes == probe.casefold()) & (names != "")] if probe else names[names != ""]
        found = list(dict.fromkeys(own)) or list(dict.fromkeys(names[names != ""]))
        if len(found) != 1:
            return None
        return _own_offset(stated) if found[0] == OWN_OFFSET else half_cells()[found[0]]

    return find


def _own_offset(stated: ProbeSettings) -> Curve:
    """The half-cell the settings state, the same at every temperature."""
    return Curve(OWN_OFFSET, np.array([25.0]), np.array([stated.offset_mV]), ("settings",), "stated", "", "")


def _spread(table, survey, names, beyond, correction: Correction, reading, stated: ProbeSettings) -> None:
    """Standard deviation of Eh: the part of each reading alone and the part common to the day and probe."""
    poised = np.zeros(len(table), bool)
    for key in ("Fe", "Fe_II", "sulfide"):
        if f"{key}_mol_L" in survey.amounts:
            detected = survey.amounts.get(f"{key}_limit", pd.Series("", index=table.index)) != "<"
            poised |= ((survey.amounts[f"{key}_mol_L"] >= POISED_mol_L) & detected).to_numpy()
    base = np.where(poised, stated.sd_poised_mV, stated.sd_checked_mV)
    base = np.where(correction.checked & reading, base, stated.sd_unchecked_mV)
    shared = np.minimum(np.where(correction.checked & reading, _COMMON_CHECKED_mV, _COMMON_UNCHECKED_mV), base)
    own = np.square(base) - np.square(shared)
    common = np.square(shared) + np.square(correction.drift_mV) + np.square(np.where(reading, beyond, 0.0))
    common = common + np.where(names == FILL_UNKNOWN, stated.sd_fill_unknown_mV**2, 0.0) * reading
    own = own + np.where(table["temperature_basis"] != "measured", stated.sd_no_temperature_mV**2, 0.0)
    spread = survey.samples["ORP_spread_mV"].to_numpy(float)
    count = survey.samples["ORP_replicates"].to_numpy(float)
    own = own + np.nan_to_num(np.square(spread) / np.where(count > 0, count, np.nan))
    known = table["Eh_mV"].notna()
    table["Eh_sd_own_mV"] = np.where(known, np.sqrt(own), np.nan)
    table["Eh_sd_common_mV"] = np.where(known, np.sqrt(common), np.nan)
    table["Eh_sd_mV"] = np.where(known, np.sqrt(own + common), np.nan)


def _basis(table, correction: Correction, reading, delivered) -> np.ndarray:
    """How each Eh was obtained, in words."""
    words = []
    for i, row in enumerate(table.to_dict("records")):
        if delivered[i]:
            words.append("as delivered on the hydrogen scale")
        elif reading[i]:
            text = f"ORP + {row['reference_mV']:.0f} mV ({row['electrode_used']}, {row['temperature_used_C']:.1f} °C)"
            if correction.checked[i]:
                text += f" {correction.delta_mV[i]:+.0f} mV from check solution"
            elif not np.isnan(correction.refused_mV[i]):
                text += f"; check off by {correction.refused_mV[i]:+.0f} mV, not applied"
            elif correction.unclear[i]:
                text += "; checks of several probes, none applied"
            else:
                text += "; no check"
            words.append(text)
        else:
            words.append("")
    return np.array(words, dtype=object)


def _status(reading, delivered, orp, names) -> np.ndarray:
    why = np.where(np.isnan(orp), "no ORP reading", np.where(names == "", "no reference electrode", "no Eh"))
    return np.where(reading | delivered, "ok", why).astype(object)


def _say_outside(names, beyond, reading, samples, findings: Findings) -> None:
    """One finding per electrode whose published range a temperature leaves."""
    for name in dict.fromkeys(names[reading & (beyond > 0)]):
        rows = np.flatnonzero(reading & (beyond > 0) & (names == name))
        cell = half_cells()[name]
        span = f"{cell.T_C[0]:g} to {cell.T_C[-1]:g}"
        findings.add("probe.outside_range", value=name, range=span, count=len(rows), samples=_shown(samples, rows))


def _say_refused(correction: Correction, reading, plain, samples, findings: Findings) -> None:
    """For each sample whose check failed: Eh with and without it."""
    for i in np.flatnonzero(reading & ~np.isnan(correction.refused_mV)):
        findings.add(
            "probe.check_not_applied",
            value=f"{correction.refused_mV[i]:+.0f}",
            sample=samples["sample"].iloc[i],
            without=f"{plain[i]:.0f}",
            corrected=f"{plain[i] + correction.refused_mV[i]:.0f}",
        )


def _say_unserved(correction: Correction, reading, samples, findings: Findings) -> None:
    """Readings that no check serves though the survey has some: a probe's name or a day that doesn't match."""
    alone = ~correction.checked & np.isnan(correction.refused_mV) & ~correction.unclear
    for rule, rows in (("probe.check_missing", alone), ("probe.check_unclear", correction.unclear)):
        found = np.flatnonzero(reading & rows)
        if len(found):
            findings.add(rule, value=len(found), samples=_shown(samples, found))


def _shown(samples, rows: np.ndarray) -> str:
    return some(samples["sample"].iloc[rows])


def _say_delivered(Eh, given, reading, survey, findings: Findings) -> None:
    """Where a file holds both ORP and Eh and they don't agree."""
    samples = survey.samples
    for i in np.flatnonzero(reading & ~np.isnan(given) & (np.abs(given - Eh) > _DELIVERED_APART_mV)):
        where = survey.origin.place(samples.index[i], "Eh_given_mV")
        findings.add("probe.delivered_differs", where, f"{given[i]:.0f}", computed=f"{Eh[i]:.0f}")
