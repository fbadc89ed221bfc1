"""The stamp of a run: versions, hashes of inputs and data, settings, counts, time; enough to say what made a number."""

import datetime as dt
import hashlib
import os
import platform
from collections.abc import Iterator
from importlib.metadata import version
from importlib.resources import files
from typing import Any

from gley import __version__
from gley.delivery.result import Result

SCHEMA = 1
_PACKAGES = ("numpy", "pandas", "geopandas", "matplotlib", "openpyxl", "shapely", "pyproj")
_DATA = (
    ("gley.data", "atomic_weights.csv"),
    ("gley.data", "constituents.csv"),
    ("gley.probe", "electrodes.csv"),
    ("gley.probe", "solutions.csv"),
    ("gley.stability", "species.csv"),
    ("gley.stability", "couples.csv"),
)

_READING = (("gley.data", "columns.csv"), ("gley.survey", "headers.csv"))
"""Tables that say how a survey is read; no number comes from them."""


def data_hashes() -> dict[str, str]:
    """sha256 of every data table that numbers come from, by its name."""
    return dict(_hashes(_DATA))


def _hashes(tables: tuple[tuple[str, str], ...]) -> Iterator[tuple[str, str]]:
    for package, name in tables:
        where = files("gley").joinpath(*package.split(".")[1:], name)
        yield name, hashlib.sha256(where.read_bytes()).hexdigest()


def data_version() -> str:
    """A short name for the state of all data tables together."""
    return hashlib.sha256("".join(data_hashes().values()).encode()).hexdigest()[:8]


def made_at() -> str:
    """Time of the run, UTC; SOURCE_DATE_EPOCH wins, for output that repeats to the byte."""
    epoch = os.environ.get("SOURCE_DATE_EPOCH", "")
    fixed = epoch.isascii() and epoch.isdigit()
    moment = dt.datetime.fromtimestamp(int(epoch), dt.UTC) if fixed else dt.datetime.now(dt.UTC)
    return moment.strftime("%Y-%m-%dT%H:%M:%SZ")


def stamp(result: Result) -> dict[str, Any]:
    """Everything that made the result, as plain values."""
    assigned = {
        element: int((part["field"] != "").sum()) for element, part in result.fields.groupby("element", sort=False)
    }
    return {
        "schema": SCHEMA,
        "gley": __version__,
        "made": made_at(),
        "command": result.command,
        "python": platform.python_version(),
        "packages": {name: version(name) for name in _PACKAGES},
        "inputs": [dict(item) for item in result.survey.inputs],
        "data": {**data_hashes(), **dict(_hashes(_READING))},
        "data_version": data_version(),
        "settings": result.settings.as_dict(),
        "facts": dict(result.survey.facts),
        "elements": list(result.elements),
        "charts": [
            {"key": sheet.key, "reference": sheet.reference, "notes": list(sheet.notes)} for sheet in result.charts
        ],
        "counts": {
            "samples": len(result.eh),
            "with_Eh": int(result.eh["Eh_mV"].notna().sum()),
            "assigned": assigned,
            **result.findings.counts(),
        },
        "seconds": dict(result.timing) if not os.environ.get("SOURCE_DATE_EPOCH") else {},
    }
