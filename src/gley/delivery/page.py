"""The report: one self-contained HTML page, plain and complete, that prints well."""

import base64
import re
from html import escape
from importlib.resources import files
from pathlib import Path

import numpy as np
import pandas as pd

from gley import __version__
from gley.delivery.result import Result
from gley.delivery.stamp import data_version
from gley.delivery.tables import short_table
from gley.formula import markup
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

_PLAIN_FORMULA = re.compile(r"\b(?:O2|NO3|NO2|NH4|SO4|HCO3|H2S|CH4|H2O|CO2)\b")
_SEVERITIES = {"error": "Errors", "warning": "Warnings", "note": "Notes"}
_HEADS = {
    "sample": "Sample", "station": "Station", "date": "Date", "round": "Round", "temperature_C": "T (°C)",
    "ORP_mV": "ORP (mV)", "Eh_mV": "Eh (mV)", "Eh_sd_mV": "± (mV)", "redox_category": "Redox category",
    "redox_process": "Redox process",
}  # fmt: skip
_KEPT_WHOLE = ("sample", "Sample", "station", "date")


def page(result: Result, folder: Path) -> str:
    """The report as HTML; pictures are taken from the folder that is being written."""
    stated = result.settings.report
    title = stated.title or result.survey.facts.get("project", "") or "Redox assessment"
    css = files("gley.delivery").joinpath("page.css").read_text(encoding="utf-8")
    body = "\n".join(
        [
            _head(result, title),
            _summary(result),
            _section("Cautions", "<ul>" + "".join(f"<li>{chemical(text)}</li>" for text in CAUTIONS) + "</ul>"),
            _pictures(result, folder, "charts", "E–pH charts"),
            _pictures(result, folder, "maps", "Site maps"),
            _section(
                "Samples", table(short_table(result)) + "<p class=small>Eh to 10 mV, ± one standard deviation.</p>"
            ),
            *[_element(result, element) for element in result.elements],
            _findings(result),
            _foot(result),
        ]
    )
    head = f'<meta charset="utf-8"><title>{escape(title)}</title><style>{css}</style>'
    return f'<!doctype html>\n<html lang="en"><head>{head}</head>\n<body>\n{body}\n</body></html>\n'


def table(frame: pd.DataFrame) -> str:
    """A frame as an HTML table; formulas set properly, numbers to what they are worth."""
    heads = "".join(f"<th>{escape(_HEADS.get(str(name), str(name)))}</th>" for name in frame)
    rows = []
    for record in frame.to_dict("records"):
        cells = "".join(f"<td{_style(str(name), value)}>{_cell(value)}</td>" for name, value in record.items())
        rows.append(f"<tr>{cells}</tr>")
    return f'<div class="wide"><table><thead><tr>{heads}</tr></thead><tbody>{"".join(rows)}</tbody></table></div>'


def _style(name: str, value: object) -> str:
    if isinstance(value, (int, float)):
        return ' class="n"'
    return ' class="k"' if name in _KEPT_WHOLE else ""


def _cell(value: object) -> str:
    if isinstance(value, float):
        text = "" if value != value else f"{value:.3g}" if abs(value) < 10 else f"{value:.0f}"
        return text.replace("-", "−")
    return chemical(str(value))


def chemical(text: str) -> str:
    """Text with the names of species set as formulas."""
    words = [_word(word) for word in text.split(" ")]
    return _PLAIN_FORMULA.sub(lambda found: markup(found.group(0)), " ".join(words))


def _word(word: str) -> str:
    """A word set as a formula when it is a dissolved form's name, with what stands behind it."""
    name = word.rstrip(",;.:")
    if name in species() and species()[name].dissolved:
        return markup(species()[name].formula) + escape(word[len(name) :])
    return markup(escape(word)) if "^" in word else escape(word)


def _section(title: str, inner: str) -> str:
    return f"<section><h2>{escape(title)}</h2>{inner}</section>"


def _head(result: Result, title: str) -> str:
    stated, facts = result.settings.report, result.survey.facts
    days = result.survey.samples["date"].dropna()
    span = "" if days.empty else f"{days.min():%Y-%m-%d} to {days.max():%Y-%m-%d}"
    entries = {
        "Project": stated.project or facts.get("project", ""),
        "Site": facts.get("site", ""),
        "Sampled": span,
        "Prepared by": stated.prepared_by,
        "Survey files": ", ".join(str(item["path"]) for item in result.survey.inputs),
    }
    cells = "".join(f"<dt>{name}</dt><dd>{escape(text)}</dd>" for name, text in entries.items() if text)
    return f"<header><h1>{escape(title)}</h1><dl>{cells}</dl></header>"


def _summary(result: Result) -> str:
    eh = result.eh["Eh_mV"]
    parts = [f"<p>{len(eh)} samples, {int(eh.notna().sum())} with Eh on the hydrogen scale"]
    if eh.notna().any():
        parts.append(f", {_span(result)}")
    counted = result.findings.counts()
    parts.append(
        f". {counted['error']} errors, {counted['warning']} warnings and {counted['note']} notes on the data.</p>"
    )
    process = result.evidence["redox_process"].replace("", "not told").value_counts().rename_axis("Redox process")
    blocks = [process.reset_index(name="samples")]
    for element in result.elements:
        own = result.fields[(result.fields["element"] == element) & (result.fields["field"] != "")]
        count = own["field"].value_counts().rename_axis(f"{element}: field")
        blocks.append(count.reset_index(name="samples"))
    inner = "".join(parts) + '<div class="side">' + "".join(table(block) for block in blocks if len(block)) + "</div>"
    return _section("Summary", inner)


def _span(result: Result) -> str:
    """Range of Eh in words, potentials that no water can have left aside and counted."""
    pH, Eh = (result.survey.samples["pH"], result.eh["Eh_mV"])
    beyond = np.abs(
        beyond_water(pH.to_numpy(float), Eh.to_numpy(float), result.eh["temperature_used_C"].to_numpy(float))
    )
    wrong = beyond > IMPLAUSIBLE_mV
    kept = Eh[~wrong].dropna()
    text = f"from {kept.min():.0f} to {kept.max():.0f} mV".replace("-", "−") if len(kept) else "none believable"
    return text + (f" ({int(wrong.sum())} outside water's stability left aside)" if wrong.any() else "")


def _pictures(result: Result, folder: Path, kind: str, title: str) -> str:
    """All drawings of a folder, in the order of the charts, inside the page."""
    found = sorted((folder / kind).glob("*.svg")) if (folder / kind).is_dir() else []
    if not found:
        return ""
    order = {sheet.key: number for number, sheet in enumerate(result.charts)}
    notes = {sheet.key: sheet.notes for sheet in result.charts} if kind == "charts" else {}
    titles = {sheet.key: sheet.title for sheet in result.charts} if kind == "charts" else {}
    figures = []
    for path in sorted(found, key=lambda item: (order.get(item.stem, 99), item.stem)):
        picture = base64.b64encode(path.read_bytes()).decode("ascii")
        name = titles.get(path.stem, path.stem.replace("_", " "))
        image = f'<img alt="{escape(name)}" src="data:image/svg+xml;base64,{picture}">'
        said = "".join(f"<p>{escape(note)}</p>" for note in notes.get(path.stem, ()))
        figures.append(f"<figure>{image}<figcaption>{escape(name)}{said}</figcaption></figure>")
    return _section(title, "".join(figures))


def _element(result: Result, element: str) -> str:
    own = result.fields[result.fields["element"] == element]
    rows = [_field_row(row) for row in own.to_dict("records")]
    return _section(f"{element}: stability fields", table(pd.DataFrame(rows)))


def _field_row(row: dict) -> dict[str, str]:
    """One assignment in the words of the report: what it is, how sure, what lies beside it and how far the next is."""

    def with_number(name: str, value: float, form: str, unit: str = "") -> str:
        if not row[name] or value != value:
            return ""
        return f"{row[name]} {format(value, form).replace('-', '−')}{unit}"

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
    blocks = []
    for severity, title in _SEVERITIES.items():
        rows = [
            {"Where": str(item.place), "What": item.message, "What to do": item.cure}
            for item in result.findings.of(severity)
        ]
        if rows:
            blocks.append(f"<h3>{title} ({len(rows)})</h3>{table(pd.DataFrame(rows))}")
    return _section("Findings on the data", "".join(blocks) or "<p>None.</p>")


def _foot(result: Result) -> str:
    stated = result.settings.stability
    names = sorted(item.name for item in species().values() if item.set in _sets(stated.solids) and not item.dissolved)
    text = (
        f"gley {__version__}, data {data_version()}. Solids taking part ({stated.solids}): {', '.join(names)}"
        f"{'; added: ' + ', '.join(stated.with_names) if stated.with_names else ''}"
        f"{'; left out: ' + ', '.join(stated.without_names) if stated.without_names else ''}. "
        "Activities by Davies; see run.json for all settings, hashes of inputs and data, and versions."
    )
    inputs = "".join(f"<li>{escape(item['path'])}: {item['sha256']}</li>" for item in result.survey.inputs)
    return f"<footer><p>{escape(text)}</p><ul>{inputs}</ul></footer>"


def _sets(solids: str) -> tuple[str, ...]:
    return {"none": (), "fresh": ("fresh",), "aged": ("fresh", "aged")}[solids]
