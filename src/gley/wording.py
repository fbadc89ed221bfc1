"""Answers of the commands as text and as records for JSON. Builds strings and plain values; prints nothing."""

from pathlib import Path
from typing import Any

import pandas as pd

from gley.delivery import PlainChart, Result
from gley.findings import Findings
from gley.stability import Chart, Conditions
from gley.survey import Survey


def run_record(result: Result, folder: Path, files: list[Path]) -> dict[str, Any]:
    """What a run found, as plain values: the same content as the library's `Result`."""
    eh, process = result.eh, result.evidence
    samples = pd.concat([result.survey.samples[["sample", "station", "pH"]], eh, process], axis=1)
    return {
        "folder": str(folder), "files": [path.as_posix() for path in files], "elements": list(result.elements),
        "samples": samples.to_dict("records"), "fields": result.fields.to_dict("records"),
        "findings": [item.as_dict() for item in result.findings], "counts": counts(result),
    }  # fmt: skip


def counts(result: Result) -> dict[str, Any]:
    """How many samples were read, got an Eh and were assigned, and how many findings of each severity there are."""
    per_element = {
        element: int((part["field"] != "").sum()) for element, part in result.fields.groupby("element", sort=False)
    }
    return {
        "samples": len(result.eh), "with_Eh": int(result.eh["Eh_mV"].notna().sum()), "assigned": per_element,
        **result.findings.counts(),
    }  # fmt: skip


def run_summary(result: Result, folder: Path) -> str:
    """A few lines on what was found and where it lies."""
    found = counts(result)
    lines = [f"{found['samples']} samples read, {found['with_Eh']} with Eh on the hydrogen scale."]
    for element, part in result.fields.groupby("element", sort=False):
        assigned = part[part["field"] != ""]
        shown = ", ".join(f"{name} {count}" for name, count in assigned["field"].value_counts().items())
        lines.append(
            f"{element}: {len(assigned)} of {len(part)} assigned: {shown}" if shown else f"{element}: none assigned"
        )
    processes = result.evidence["redox_process"].replace("", "not told").value_counts()
    lines.append("Redox process: " + ", ".join(f"{name} {count}" for name, count in processes.items()))
    lines.append(_severities(result.findings))
    lines.append(f"Written to {folder}; open {folder / 'report.html'}.")
    return "\n".join(lines)


def _severities(findings: Findings) -> str:
    number = findings.counts()
    return f"Findings: {number['error']} errors, {number['warning']} warnings, {number['note']} notes."


def check_record(survey: Survey, eh: pd.DataFrame, findings: Findings) -> dict[str, Any]:
    """Every finding and every sample's Eh, as plain values."""
    samples = pd.concat([survey.samples[["sample", "station", "pH"]], eh], axis=1)
    return {
        "samples": samples.to_dict("records"), "findings": [item.as_dict() for item in findings],
        "counts": {"samples": len(eh), "with_Eh": int(eh["Eh_mV"].notna().sum()), **findings.counts()},
    }  # fmt: skip


def check_text(survey: Survey, eh: pd.DataFrame, findings: Findings) -> str:
    """All findings, errors first, then what was read."""
    lines = [str(item) for severity in ("error", "warning", "note") for item in findings.of(severity)]
    chemistry = sum(str(name).endswith("_L") for name in survey.amounts)
    tables = f"{len(eh)} samples, {len(survey.stations)} stations, {len(survey.checks)} check readings"
    lines.append(f"{tables}, {chemistry} constituents; {int(eh['Eh_mV'].notna().sum())} samples with Eh.")
    return "\n".join([*lines, _severities(findings)])


def eh_text(rows: list[dict[str, Any]]) -> str:
    """One line per reading, then the source of the half-cell."""
    lines = [
        f"{row['orp_mV']:g} mV against {row['electrode']} at {row['temperature_C']:g} °C:"
        f" reference {row['reference_mV']:.0f} mV,"
        f" Eh {row['Eh_mV']:.0f} mV (sd {row['Eh_sd_mV']:.0f} mV), pe {row['pe']:.2f}"
        for row in rows
    ]
    return "\n".join([*lines, *dict.fromkeys(f"Source: {row['source']}" for row in rows)])


def conditions_text(conditions: Conditions) -> str:
    """`25 °C, total 1e-05 mol/L, I 0.01 mol/L, C 2e-03 mol/L, solids fresh`."""
    parts = [f"{conditions.temperature_C:g} °C", f"total {conditions.total_mol_L:g} mol/L"]
    parts.append(f"I {conditions.ionic_strength_M:g} mol/L")
    parts += [f"{name} {total:g} mol/L" for name, total in conditions.ligands_mol_L.items()]
    parts.append(f"solids {conditions.solids}")
    parts += [f"with {name}" for name in conditions.with_names] + [
        f"without {name}" for name in conditions.without_names
    ]
    return ", ".join(parts)


def chart_text(charts: list[PlainChart]) -> str:
    """Fields and lines of each chart as text, and the regions that two elements share."""
    blocks = []
    for item in charts:
        blocks.append(_one_chart(item.chart))
        blocks += [_one_chart(part) for part in (item.over, *(item.fan or ())) if part is not None]
        if item.over is not None:
            lines = [f"{item.over.element} over {item.chart.element}, part of the chart:"]
            lines += [f"  {100 * part.share:5.1f} %  {part.over} over {part.under}" for part in item.overlaps]
            blocks.append("\n".join(lines))
    return "\n\n".join(blocks)


def _one_chart(item: Chart) -> str:
    lines = [f"{item.element}: {conditions_text(item.conditions)}", "Fields:"]
    lines += [f"  {field.name} ({field.kind}, {field.oxidation_state})" for field in item.fields]
    lines.append("Lines:")
    for edge in item.boundaries:
        if edge.slope_mV_per_pH is None:
            where = f"pH {edge.pH:.2f}"
        else:
            where = f"{edge.slope_mV_per_pH:+.1f} mV/pH, {edge.E_mV_at_pH0:.0f} mV at pH 0"
        lines.append(f"  {edge.kind:<10} {edge.reaction}   [{where}]")
    return "\n".join(lines)


def data_record(element: str | None) -> dict[str, Any]:
    """Species of one element or all, and the reference electrodes, with sources.

    Raises
    ------
    UsageError
        For an element without species.
    """
    from gley.errors import UsageError
    from gley.probe import electrodes
    from gley.stability import species

    rows = [item for item in species().values() if element is None or item.element == element]
    if not rows:
        known = ", ".join(dict.fromkeys(item.element for item in species().values() if item.element))
        message = f"There are no species of '{element}'."
        raise UsageError(message, f"There are some of {known}.")
    return {
        "species": [
            {
                "name": item.name, "formula": item.formula, "phase": item.phase, "element": item.element,
                "oxidation_state": item.oxidation_state, "dGf_kJ_mol": item.dGf_kJ_mol, "dHf_kJ_mol": item.dHf_kJ_mol,
                "logK": item.given_logK, "reaction": item.reaction, "set": item.set, "T_basis": item.T_basis,
                "source": item.source, "seen": item.seen, "grade": item.grade, "alternatives": item.alternatives,
                "note": item.note,
            }
            for item in rows
        ],
        "electrodes": electrodes(),
    }  # fmt: skip


def data_text(record: dict[str, Any]) -> str:
    """The same as a table."""
    lines = [f"{'species':<32}{'set':<9}{'ΔGf kJ/mol':>11}  {'grade':<6}source"]
    for row in record["species"]:
        lines.append(f"{row['name']:<32}{row['set']:<9}{row['dGf_kJ_mol']:>11.2f}  {row['grade']:<6}{row['source']}")
    lines += ["", f"{'reference electrode':<40}{'25 °C, mV':>10}  source"]
    for row in record["electrodes"]:
        lines.append(f"{row['name']:<40}{row['E_25C_mV']:>10.1f}  {row['source']}")
    return "\n".join(lines)
