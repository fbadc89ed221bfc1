"""The whole job in order: survey, Eh, fields, evidence, places, charts. `run` writes nothing, `write` everything."""

import time
from collections.abc import Sequence
from pathlib import Path

import numpy as np
import pandas as pd

from gley import delivery, evidence, probe, site, stability
from gley.charts import chart_sheets, overlap_counts, with_background
from gley.columns import amount_column, columns
from gley.delivery import Result
from gley.errors import UsageError
from gley.findings import Findings, Place, some
from gley.settings import Settings
from gley.survey import Survey, read_survey


def run(
    survey: Survey | str | Path | Sequence[str | Path], settings: Settings | None = None, command: str = ""
) -> Result:
    """From a survey to everything a report needs; nothing is written.

    Parameters
    ----------
    survey : Survey, path or sequence of paths
        What `read_survey` gave, or the files to read.
    settings : Settings, optional
        All choices; defaults otherwise.
    command : str
        The command line, for the stamp.

    Raises
    ------
    GleyError
        When a file can't be read, no electrode is named, or the coordinates have no reference system.
    """
    settings = settings or Settings()
    clock = _Clock()
    if not isinstance(survey, Survey):
        paths = [survey] if isinstance(survey, (str, Path)) else list(survey)
        survey = read_survey(paths, settings)
    clock.lap("survey")
    findings = Findings(survey.findings)
    eh = probe.to_Eh(survey, settings, findings)
    read = engine_table(survey, eh)
    water_line_findings(read, survey, findings)
    clock.lap("probe")
    couples = evidence.couples_table(read, settings, findings)
    eh = evidence.Eh_from(eh, survey.samples["sample"], couples, settings, findings)
    waters = engine_table(survey, eh)
    # a map that can't be drawn is refused before the long part of the work
    places = site.places(survey, settings, findings)
    elements, settings = choose_elements(survey, settings, findings)
    assigned = stability.assignment(waters, elements, settings)
    fields = set_aside(assigned.fields, waters)
    rivals = assigned.rivals[assigned.rivals["sample"].isin(fields.loc[fields["field"] != "", "sample"])]
    _status_findings(fields, findings)
    clock.lap("stability")
    process = evidence.process_table(survey.amounts, settings)
    fields = evidence.with_measured(fields, waters, couples, settings, findings)
    scenarios = evidence.scenario_table(fields, waters, couples, settings)
    fields = evidence.with_robust(fields, scenarios)
    clock.lap("evidence")
    charts = chart_sheets(waters, fields, elements, settings)
    fields = with_background(fields, charts, findings)
    clock.lap("charts")
    return Result(
        survey=survey, settings=settings, eh=eh, fields=fields, evidence=process, places=places, charts=charts,
        findings=findings, elements=elements, rivals=rivals, couples=couples, scenarios=scenarios,
        overlaps=overlap_counts(charts, fields), timing=clock.laps, command=command,
    )  # fmt: skip


def write(result: Result, folder: str | Path, overwrite: bool = False) -> list[Path]:
    """Write tables, GIS layers, charts, maps, report and stamp to a folder, whole or not at all.

    Raises
    ------
    GleyError
        When the folder exists and `overwrite` isn't set, isn't one of ours, or can't be written.
    """
    return delivery.write(result, Path(folder), overwrite)


def check(survey: Survey, settings: Settings) -> tuple[pd.DataFrame, Findings]:
    """Survey, probe and water's lines only: Eh of every sample and all findings."""
    findings = Findings(survey.findings)
    eh = probe.to_Eh(survey, settings, findings)
    water_line_findings(engine_table(survey, eh), survey, findings)
    try:
        site.places(survey, settings, findings)
    except UsageError as error:
        findings.add("site.will_refuse", value=error.message, cure=error.cure)
    return eh, findings


def engine_table(survey: Survey, eh: pd.DataFrame) -> pd.DataFrame:
    """Samples, Eh and amounts side by side: what `stability.assign` takes."""
    samples = survey.samples.drop(columns=[name for name in survey.samples if name in eh])
    table = pd.concat([samples, eh, survey.amounts], axis=1)
    table["temperature_C"] = eh["temperature_used_C"]
    return table


def _beyond_water(waters: pd.DataFrame) -> np.ndarray:
    """How far in mV each potential lies outside water's stability (n,)."""
    return stability.beyond_water(*(waters[name].to_numpy(float) for name in ("pH", "Eh_mV", "temperature_used_C")))


def water_line_findings(waters: pd.DataFrame, survey: Survey, findings: Findings) -> None:
    """Say which potentials no water at rest can have."""
    beyond = _beyond_water(waters)
    for row in map(int, np.flatnonzero(np.abs(beyond) > stability.IMPLAUSIBLE_mV)):
        sample = waters.iloc[row]
        column = "ORP_mV" if pd.notna(sample["ORP_mV"]) else "Eh_given_mV"
        where = survey.origin.place(row, column)
        findings.add(
            "stability.outside_water", Place(where.file, where.sheet, where.cell, str(sample["sample"])),
            f"{sample['Eh_mV']:.0f}", pH=f"{sample['pH']:.2f}", beyond=f"{abs(beyond[row]):.0f}",
            side="above" if beyond[row] > 0 else "below",
        )  # fmt: skip


def set_aside(fields: pd.DataFrame, waters: pd.DataFrame) -> pd.DataFrame:
    """Fields without those of samples whose potential no water can have: they keep their rows, with the reason."""
    table = fields.copy()
    beyond = _beyond_water(waters)
    wrong = table["sample"].isin(waters.loc[np.abs(beyond) > stability.IMPLAUSIBLE_mV, "sample"])
    for name, column in columns("fields").items():
        if name != "status":
            table.loc[wrong, name] = np.nan if column.dtype == "number" else ""
    table.loc[wrong, "status"] = "not assigned: Eh outside water's stability"
    return table


def choose_elements(survey: Survey, settings: Settings, findings: Findings) -> tuple[tuple[str, ...], Settings]:
    """The elements to assign, and the settings with what had to be assumed for them."""
    stated = settings.stability
    elements = tuple(stated.elements) or stability.measured_elements(survey.amounts)
    metals = [key for key in ("Fe", "Mn") if amount_column(key) in survey.amounts or key in stated.assumed_mol_L]
    soil = survey.samples["depth_cm"].notna().any()
    if soil and not metals:
        total = stated.assumed_soil_mol_L
        findings.add("stability.assumed_total", value=f"{total:g}")
        assumed = {**stated.assumed_mol_L, "Fe": total, "Mn": total}
        return elements or ("Fe", "Mn"), settings.replace(stability={"assumed_mol_L": assumed})
    if not elements:
        findings.add("stability.nothing_to_assign", value=", ".join(stability.OFFERED))
    return elements, settings


def _status_findings(fields: pd.DataFrame, findings: Findings) -> None:
    """One finding per element and status, with the samples it concerns."""
    for element, part in fields.groupby("element", sort=False):
        phrases = part.assign(phrase=part["status"].str.split("; ")).explode("phrase")
        for phrase, group in phrases.groupby("phrase", sort=False):
            if phrase == "ok":
                continue
            names = list(group["sample"])
            rule = "stability.not_assigned" if str(phrase).startswith("not assigned") else "stability.status"
            findings.add(rule, value=phrase, element=element, count=len(names), total=len(part), names=some(names))


class _Clock:
    """Seconds spent per room."""

    def __init__(self) -> None:
        self.laps: dict[str, float] = {}
        self._last = time.perf_counter()

    def lap(self, name: str) -> None:
        now = time.perf_counter()
        self.laps[name] = round(now - self._last, 3)
        self._last = now
