"""One sample's working in full: from the cell of the reading to the line of the next field, to recompute by hand."""

from difflib import get_close_matches
from typing import Any

import pandas as pd

from gley import pipeline, probe, stability
from gley.columns import amount_column, constituents
from gley.errors import UsageError
from gley.findings import Findings
from gley.settings import Settings
from gley.survey import Survey


def explain(survey: Survey, sample: str, elements: tuple[str, ...], settings: Settings) -> dict[str, Any]:
    """The working of one sample.

    Parameters
    ----------
    survey : Survey
        What `read_survey` gave.
    sample : str
        Its name.
    elements : tuple of str
        Symbols; empty = those the survey would be assigned for.
    settings : Settings
        As for a run.

    Returns
    -------
    dict
        `sample`; `potential` (reading, half-cell with source, check offset, Eh, pe and their places); `amounts` (as
        reported, cell, mol/L); `elements` (the assignment and its working, see `stability.working`).

    Raises
    ------
    UsageError
        When the survey has no sample of this name.
    """
    findings = Findings()
    eh = probe.to_Eh(survey, settings, findings)
    row = _row(survey, sample)
    waters = pipeline.engine_table(survey, eh)
    chosen, settings = pipeline.choose_elements(survey, settings, findings)
    one = waters.loc[[row]]
    fields = stability.assign(one, elements or chosen, settings)
    return {
        "sample": sample,
        "potential": _potential(survey, eh, row),
        "amounts": _amounts(survey, row),
        "elements": [_element(one, fields.loc[i].to_dict(), settings) for i in fields.index],
    }


def _row(survey: Survey, sample: str) -> int:
    names = list(survey.samples["sample"])
    if sample in names:
        return names.index(sample)
    near = get_close_matches(sample, names, 3, 0.4)
    message = f"There is no sample '{sample}' in the survey."
    raise UsageError(message, f"Near names: {', '.join(near)}." if near else f"The first ones: {', '.join(names[:5])}.")


def _potential(survey: Survey, eh: pd.DataFrame, row: int) -> dict[str, Any]:
    sample, made = survey.samples.loc[row], eh.loc[row]
    sources = {item["name"]: item["source"] for item in probe.electrodes()}
    return {
        "ORP_mV": sample["ORP_mV"],
        "ORP_cell": str(survey.origin.place(row, "ORP_mV")),
        "pH": sample["pH"],
        "pH_cell": str(survey.origin.place(row, "pH")),
        **{name: made[name] for name in eh.columns},
        "reference_source": sources.get(made["electrode_used"], ""),
    }


def _amounts(survey: Survey, row: int) -> list[dict[str, Any]]:
    """Each constituent as reported, where, and what it is in mol/L."""
    amounts, reported = (table.loc[row].to_dict() for table in (survey.amounts, survey.reported))
    found = []
    for key in constituents():
        column = amount_column(key)
        amount = amounts.get(column)
        if amount is None or amount != amount:
            continue
        delivered = [(str(name), text) for name, text in reported.items() if str(name).startswith(f"{key}_") and text]
        name, text = next(item for item in delivered if item[0] != f"{key}_flag")
        unit = name.removeprefix(f"{key}_").replace("_L", "/L").replace("_", " ")
        where = str(survey.origin.place(row, key))
        record = {"key": key, "reported": f"{text} {unit}", "cell": where, column: float(amount)}
        found.append({**record, "limit": amounts[f"{key}_limit"]})
    return found


def _element(one: pd.DataFrame, assigned: dict[str, Any], settings: Settings) -> dict[str, Any]:
    record = {"assigned": assigned, "working": None}
    if assigned["field"]:
        record["working"] = stability.working(one, assigned["element"], settings)
    return record


def explain_text(record: dict[str, Any]) -> str:
    """The working in lines."""
    lines = [
        f"Sample {record['sample']}",
        "",
        "Potential",
        *_potential_lines(record["potential"]),
        "",
        "Concentrations",
    ]
    for item in record["amounts"]:
        amount = next(value for name, value in item.items() if name.endswith("_L"))
        unit = "eq/L" if item["key"] == "alkalinity" else "mol/L"
        lines.append(
            f"  {item['key']:<11}{item['reported']:<28}= {item['limit']}{amount:.4g} {unit}   [{item['cell']}]"
        )
    for part in record["elements"]:
        lines += ["", *_element_lines(part)]
    return "\n".join(lines)


def _potential_lines(at: dict[str, Any]) -> list[str]:
    if at["Eh_mV"] != at["Eh_mV"]:
        return [f"  no Eh: {at['Eh_status']}"]
    if at["ORP_mV"] != at["ORP_mV"] or at["reference_mV"] == 0:
        first = f"  Eh {at['Eh_mV']:.1f} mV: {at['Eh_basis']}"
    else:
        offset = 0.0 if at["check_offset_mV"] != at["check_offset_mV"] else at["check_offset_mV"]
        terms = f"{at['ORP_mV']:g} + {at['reference_mV']:.1f} + {offset:.1f}"
        first = f"  Eh = ORP + E_ref + δ = {terms} = {at['Eh_mV']:.1f} mV   [{at['ORP_cell']}]"
    T = f"{at['temperature_used_C']:g} °C ({at['temperature_basis']})"
    return [
        first,
        f"  {at['electrode_used']} at {T}: {at['reference_source']}",
        f"  {at['Eh_basis']}; standard deviation {at['Eh_sd_mV']:.0f} mV",
        f"  pe = Eh F/(RT ln10) = {at['pe']:.3f};  pH {at['pH']:g}   [{at['pH_cell']}]",
    ]


def _element_lines(part: dict[str, Any]) -> list[str]:
    assigned, working = part["assigned"], part["working"]
    head = f"{assigned['element']}: {assigned['field'] or 'not assigned'}; status {assigned['status']}"
    if working is None:
        return [head]
    lines = [
        f"{head}; {assigned['outcome']} (probability {assigned['probability']:.2f})",
        f"  total {working['total_mol_L']:.4g} mol/L; ionic strength {working['ionic_strength_M']:.4g} mol/L"
        f" ({working['ionic_strength_basis']}); Davies, A {working['debye_hueckel_A']:.4f}: log γ of z = 1, 2, 3: "
        + ", ".join(f"{value:.4f}" for value in working["log_gamma"].values()),
    ]
    lines += [
        f"  ligand {item['channel']}: {item['total_mol_L']:.4g} mol/L (from {item['from']}), log a of the element"
        f" {item['log_a']:.4f}{', as ' + item['state'] if item['state'] else ''}"
        for item in working["ligands"]
    ]
    lines.append("  log activity of the element at which each candidate reaches its limit; the lowest wins:")
    for item in working["candidates"]:
        lines.append(f"    {item['log_a']:9.4f}  {item['name']} {item['limit']}, {item['per_pe']:+g} per pe")
        lines += [
            f"                 {form['name']}: log m {form['log_m']:.3f}, {form['share']:.1%}" for form in item["forms"]
        ]
    if assigned["solid"]:
        lines.append(f"  SI of {assigned['solid']}: {assigned['SI']:+.3f}")
    return lines + _line_lines(working, assigned)


def _line_lines(working: dict[str, Any], assigned: dict[str, Any]) -> list[str]:
    lines = []
    line = working["line"]
    if line:
        at = working["Eh_mV"] + line["margin_mV"]
        lines.append(f"  next along Eh: {line['next_field']}, {line['margin_mV']:+.1f} mV (line at {at:.1f} mV)")
        straight = line["E_straight_mV"]
        if line["reaction"]:
            behind = "" if straight is None else f"; straight line of these forms alone {straight:.1f} mV"
            lines.append(f"    {line['reaction']}{behind}")
    if assigned["next_field_pH"]:
        lines.append(f"  next along pH: {assigned['next_field_pH']}, {assigned['margin_pH']:+.3f}")
    return lines
