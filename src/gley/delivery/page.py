"""The report: one self-contained HTML page, plain and complete, that prints well."""

import base64
import dataclasses
import platform
from html import escape
from importlib.resources import files
from pathlib import Path

import numpy as np
import pandas as pd

from gley import __version__
from gley.delivery.htmltable import chemical, number, table
from gley.delivery.result import Result
from gley.delivery.stamp import data_hashes, data_version, made_at
from gley.delivery.tables import short_table
from gley.settings import Settings
from gley.stability import IMPLAUSIBLE_mV, beyond_water, species

CAUTIONS = (
    "Platinum shows a mixed potential: it follows the fastest of the couples present and is blind to O2 and NO3.",
    "Where O2 or NO3 prevail, trust the redox process from the chemistry more than Eh.",
    "A solid's field means that the water is oversaturated with it at the log K of the table.",
    "It never means that the element is bound, immobile or safe: the concentration was measured in solution.",
    "Sorption, which holds much of the arsenic in most aquifers, is not computed, nor is kinetics.",
    "Probabilities are given the model: uncertain readings and constants are in them, wrong assumptions are not.",
    "No drinking-water limits are drawn: they depend on jurisdiction and edition.",
    "This page supports, and doesn't replace, the judgement of licensed professionals and the local codes that apply.",
)

_SEVERITIES = {"error": "Errors", "warning": "Warnings", "note": "Notes"}
_SHOWN_PLACES = 6


def page(result: Result, folder: Path) -> str:
    """The report as HTML; pictures are taken from the folder that is being written."""
    stated = result.settings.report
    title = stated.title or result.survey.facts.get("project", "") or "Redox assessment"
    css = files("gley.delivery").joinpath("page.css").read_text(encoding="utf-8")
    cautions = "<ul>" + "".join(f"<li>{chemical(text)}</li>" for text in CAUTIONS) + "</ul>"
    body = "\n".join(
        [
            _head(result, title),
            _summary(result),
            _section("Cautions", cautions),
            _charts(result, folder),
            _maps(result, folder),
            _samples(result),
            _process(result),
            *[_element(result, element) for element in result.elements],
            _findings(result),
            _stamp(result),
        ]
    )
    head = (
        f'<meta charset="utf-8"><meta name="viewport" content="width=device-width">'
        f"<title>{escape(title)}</title><style>{css}</style>"
    )
    return f'<!doctype html>\n<html lang="en"><head>{head}</head>\n<body>\n{body}\n</body></html>\n'


def map_title(layer: str) -> str:
    """Title of a map: of the redox process or of an element's fields."""
    return "Redox process from chemistry" if layer == "redox_process" else f"{layer}: stability field"


def _section(title: str, inner: str) -> str:
    return f"<section><h2>{escape(title)}</h2>{inner}</section>"


def _head(result: Result, title: str) -> str:
    stated, facts = result.settings.report, result.survey.facts
    days = result.survey.samples["date"].dropna()
    span = " to ".join(sorted({f"{day:%Y-%m-%d}" for day in (days.min(), days.max())})) if len(days) else ""
    project = stated.project or facts.get("project", "")
    entries = {
        "Project": "" if project == title else project,
        "Site": facts.get("site", ""),
        "Sampled": span,
        "Sampled by": facts.get("operator", ""),
        "Prepared by": stated.prepared_by,
        "Survey files": ", ".join(str(item["path"]) for item in result.survey.inputs),
        "Remarks": facts.get("remarks", ""),
    }
    cells = "".join(f"<dt>{name}</dt><dd>{escape(text)}</dd>" for name, text in entries.items() if text)
    return f"<header><h1>{escape(title)}</h1><dl>{cells}</dl></header>"


def _summary(result: Result) -> str:
    eh = result.eh["Eh_mV"]
    words = [f"<p>{_many(len(eh), 'sample')}, {int(eh.notna().sum())} with Eh on the hydrogen scale"]
    if eh.notna().any():
        words.append(f", {_span(result)}")
    counts = result.findings.counts()
    counted = ", ".join(_many(counts[severity], severity) for severity in _SEVERITIES)
    words.append(f". Findings on the data: {counted}.</p>")
    blocks = []
    for column, head in (("redox_category", "Redox category"), ("redox_process", "Redox process")):
        blocks.append(result.evidence[column].value_counts().rename_axis(head).reset_index(name="samples"))
    for element in result.elements:
        own = result.fields[(result.fields["element"] == element) & (result.fields["field"] != "")]
        count = own["field"].value_counts().rename_axis(f"{element}: field")
        blocks.append(count.reset_index(name="samples"))
    inner = "".join(words) + '<div class="side">' + "".join(table(block) for block in blocks if len(block)) + "</div>"
    return _section("Summary", inner)


def _many(count: int, word: str) -> str:
    return f"{count} {word}{'' if count == 1 else 's'}"


def _outside(result: Result) -> np.ndarray:
    """Which samples have a potential that no water can have."""
    pH, Eh = result.survey.samples["pH"].to_numpy(float), result.eh["Eh_mV"].to_numpy(float)
    return np.abs(beyond_water(pH, Eh, result.eh["temperature_used_C"].to_numpy(float))) > IMPLAUSIBLE_mV


def _span(result: Result) -> str:
    """Range of Eh in words to 10 mV, potentials that no water can have left aside and counted."""
    wrong = _outside(result)
    kept = result.eh["Eh_mV"][~wrong].dropna().round(-1)
    text = f"from {number(kept.min(), '.0f')} to {number(kept.max(), '.0f')} mV" if len(kept) else "none believable"
    return text + (f" ({int(wrong.sum())} outside water's stability left aside)" if wrong.any() else "")


def _samples(result: Result) -> str:
    said = "Eh to 10 mV on the hydrogen scale, ± one standard deviation. An empty cell: see the findings."
    names = ", ".join(result.survey.samples.loc[_outside(result), "sample"].astype(str))
    if names:
        said += f" Outside water's stability, not to be used: {names}."
    return _section("Samples", table(short_table(result), "samples.csv") + f"<p class=small>{escape(said)}</p>")


def _charts(result: Result, folder: Path) -> str:
    figures = []
    for sheet in result.charts:
        words = f"{sheet.title} in the E–pH plane, drawn at {sheet.reference}."
        figures.append(_figure(folder / "charts" / f"{sheet.key}.svg", sheet.title, words))
    return _section("E–pH charts", "".join(figures)) if any(figures) else ""


def _maps(result: Result, folder: Path) -> str:
    figures = []
    for layer in ("redox_process", *result.elements):
        words = f"{map_title(layer)}, by colour and shape."
        figures.append(_figure(folder / "maps" / f"{layer}.svg", map_title(layer), words))
    return _section("Site maps", "".join(figures)) if any(figures) else ""


def _figure(path: Path, name: str, said: str) -> str:
    """A drawing inside the page; as an image of its own, so that two drawings' ids can't meet."""
    if not path.is_file():
        return ""
    picture = base64.b64encode(path.read_bytes()).decode("ascii")
    image = f'<img alt="{escape(name)}" src="data:image/svg+xml;base64,{picture}">'
    where = f"{path.parent.name}/{path.stem}"
    return f"<figure>{image}<figcaption>{chemical(said)} ({escape(where)}.svg, .png)</figcaption></figure>"


def _process(result: Result) -> str:
    if (result.evidence["redox_category"] == "undetermined").all():
        words = "None of O2, NO3, Mn, Fe, SO4 and sulfide was analysed closely enough to tell a process."
        return _section("Redox process from chemistry", f"<p>{chemical(words)}</p>")
    shown = pd.concat([result.survey.samples[["sample"]], result.evidence], axis=1)
    shown = shown[[name for name in shown if name == "sample" or (shown[name] != "").any()]]
    stated = (
        "<p class=small>Thresholds of McMahon and Chapelle 2008, iron/sulfide mass ratio of Chapelle and others 2009."
        " Fe(III)-SO4: both reductions; Fe(III)/SO4: the data can't tell which.</p>"
    )
    return _section("Redox process from chemistry", table(shown, "samples.csv") + stated)


def _element(result: Result, element: str) -> str:
    own = result.fields[result.fields["element"] == element]
    rows = pd.DataFrame([_field_row(row) for row in own.to_dict("records")])
    return _section(f"{element}: stability fields", table(rows, "fields.csv"))


def _field_row(row: dict) -> dict[str, str]:
    """One assignment in the words of the report: what it is, how sure, what lies beside it and how far the next is."""

    def with_number(name: str, value: float, form: str, unit: str = "") -> str:
        return f"{row[name]} {number(value, form)}{unit}" if row[name] and value == value else ""

    return {
        "Sample": row["sample"],
        "Field": row["field"],
        "Outcome": row["outcome"],
        "Probability": "" if row["probability"] != row["probability"] else f"{row['probability']:.2f}",
        "Most abundant form": with_number("dissolved_form", 100 * row["share"], ".0f", " %"),
        "Solid, SI": with_number("solid", row["SI"], "+.1f"),
        "Next field along Eh": with_number("next_field", round(row["margin_mV"], -1), "+.0f", " mV"),
        "Next field along pH": with_number("next_field_pH", row["margin_pH"], "+.2f"),
        "Status": row["status"],
    }


def _findings(result: Result) -> str:
    """Grouped by severity; what is said alike of several places stands once."""
    blocks = []
    for severity, title in _SEVERITIES.items():
        said: dict[tuple[str, str], list[str]] = {}
        for item in result.findings.of(severity):
            said.setdefault((item.message, item.cure), []).append(str(item.place))
        if said:
            rows = [{"Where": _places(where), "What": what, "What to do": cure} for (what, cure), where in said.items()]
            count = len(result.findings.of(severity))
            blocks.append(f"<h3>{title} ({count})</h3>{table(pd.DataFrame(rows), 'findings.csv')}")
    return _section("Findings on the data", "".join(blocks) or "<p>None.</p>")


def _places(places: list[str]) -> str:
    shown = "; ".join(place for place in places[:_SHOWN_PLACES] if place)
    return f"{shown} and {len(places) - _SHOWN_PLACES} more" if len(places) > _SHOWN_PLACES else shown


def _stamp(result: Result) -> str:
    """Settings, data and versions: what made the numbers."""
    stated = result.settings.stability
    names = sorted(item.name for item in species().values() if item.set in _sets(stated.solids) and not item.dissolved)
    words = (
        f"gley {__version__}, data {data_version()}, Python {platform.python_version()}, made {made_at()}. "
        f"Solids taking part ({stated.solids}): {', '.join(names)}"
        f"{'; added: ' + ', '.join(stated.with_names) if stated.with_names else ''}"
        f"{'; left out: ' + ', '.join(stated.without_names) if stated.without_names else ''}. "
        "Activities by Davies. run.json holds the same with the versions of all libraries."
    )
    sums = [{"File": str(item["path"]), "sha256": str(item["sha256"])} for item in result.survey.inputs]
    sums += [{"File": name, "sha256": value} for name, value in data_hashes().items()]
    command = f"<p class=small>Command: {escape(result.command)}</p>" if result.command else ""
    chosen = f"<h3>Settings</h3>{_settings(result.settings)}"
    hashes = f"<h3>Survey files and data tables</h3>{table(pd.DataFrame(sums), small=True)}"
    return _section("Settings and data", f"<p>{escape(words)}</p>{command}{chosen}{hashes}")


def _settings(settings: Settings) -> str:
    """Every setting with its meaning; those that differ from the default are marked."""
    rows = []
    for group in dataclasses.fields(settings):
        own, usual = getattr(settings, group.name), getattr(Settings(), group.name)
        for item in dataclasses.fields(own):
            value = getattr(own, item.name)
            unit = item.metadata.get("unit", "")
            rows.append(
                {
                    "Setting": f"{group.name}.{item.name}",
                    "Value": f"{_shown(value)} {unit}".strip() if value not in (None, "", (), {}) else "",
                    "Changed": "" if value == getattr(usual, item.name) else "yes",
                    "Meaning": item.metadata.get("meaning", ""),
                }
            )
    shown = pd.DataFrame(rows)
    return table(shown if (shown["Changed"] != "").any() else shown.drop(columns="Changed"), small=True)


def _shown(value: object) -> str:
    if isinstance(value, dict):
        return ", ".join(f"{name} = {_shown(part)}" for name, part in value.items())
    if isinstance(value, tuple):
        return ", ".join(map(str, value))
    if isinstance(value, bool):
        return "yes" if value else "no"
    return number(value, "g") if isinstance(value, (int, float)) else str(value)


def _sets(solids: str) -> tuple[str, ...]:
    return {"none": (), "fresh": ("fresh",), "aged": ("fresh", "aged")}[solids]
