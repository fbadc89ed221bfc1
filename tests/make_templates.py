"""Write `templates/` anew from the vocabulary and the settings: `python tests/make_templates.py`."""

from pathlib import Path

from gley.probe import electrodes
from gley.settings import template
from gley.survey import write_sheet

TEMPLATES = Path(__file__).parent.parent / "templates"
WORKBOOK, SETTINGS, DELIVERY = "field_workbook.xlsx", "survey.toml", "laboratory_delivery.csv"

UNITS = {
    "Fe": "mg/L", "Mn": "mg/L", "As": "µg/L", "nitrate": "mg/L as N", "ammonium": "mg/L as N", "sulfate": "mg/L",
    "sulfide": "mg/L as S", "chloride": "mg/L", "alkalinity": "mg/L as CaCO3", "calcium": "mg/L", "DOC": "mg/L",
}  # fmt: skip
RESULTS = {  # invented; a non-detect holds its limit and the flag
    "KB1-A": ("0.02 <", "0.005", "0.5 <", "6.4", "0.04 <", "48", "0.05 <", "22", "185", "71", "0.9"),
    "KB2-A": ("2.1", "0.62", "14", "0.2 <", "0.31", "27", "0.05 <", "19", "240", "78", "2.6"),
    "KB3-A": ("5.8", "0.34", "41", "0.2 <", "1.7", "2.4", "0.6", "17", "310", "84", "6.1"),
}


def delivery() -> str:
    """An invented laboratory delivery, one row per result."""
    lines = ["sample;parameter;value;unit;limit flag"]
    for sample, values in RESULTS.items():
        for (parameter, unit), value in zip(UNITS.items(), values, strict=True):
            number, _, flag = value.partition(" ")
            lines.append(f"{sample};{parameter};{number};{unit};{flag}")
    return "\n".join(lines) + "\n"


def write(folder: Path) -> None:
    """All generated templates into a folder, over what is there."""
    write_sheet(folder / WORKBOOK, [item["name"] for item in electrodes()], overwrite=True)
    (folder / SETTINGS).write_text(template(), encoding="utf-8", newline="\n")
    (folder / DELIVERY).write_text(delivery(), encoding="utf-8", newline="\n")


if __name__ == "__main__":
    write(TEMPLATES)
