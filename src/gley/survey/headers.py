"""Header words to columns of the house vocabulary: spellings live in `headers.csv`, units in the header or below."""

import csv
import difflib
import re
from collections.abc import Mapping
from dataclasses import dataclass
from functools import cache
from importlib.resources import files
from types import MappingProxyType

from gley.columns import columns, constituents
from gley.errors import GleyError
from gley.formula import molar_mass, parse
from gley.units import Unit, recognise

KINDS = ("samples", "stations", "checks", "long")
_BRACKET = re.compile(r"^(.*?)\s*[\(\[]\s*([^()\[\]]*(?:\([^()]*\))?[^()\[\]]*)\s*[\)\]]\s*$")
_BESIDE_THE_POINT = re.compile(
    r"(?i)(?<![A-Za-z])(field|dissolved|diss|filtered|filt|conc|value|measured|in situ)(?![A-Za-z])"
)
_STATE = re.compile(r"\(\s*(?:III|II|IV|VII|VI|V|I)\s*\)")
_AS = re.compile(r"[\s_-]as[\s_-]+\(?[A-Z][A-Za-z0-9]*\)?\s*$")
_REPLICATE = re.compile(r"^(?:pt|orp|redox|eh|electrode|platinum)\s*(\d{1,2})$")


@dataclass(frozen=True)
class Header:
    """What a header cell means: `target` is a house column or a constituent's key, '' when it isn't understood.

    `replicate` is the number of one of several electrodes read side by side.
    """

    text: str
    target: str
    unit: Unit | None = None
    replicate: int = 0
    ignored: bool = False


@cache
def _spellings(kind: str) -> MappingProxyType:
    """Plain spelling → target for one kind of table."""
    rows = csv.DictReader((files("gley.survey") / "headers.csv").read_text(encoding="utf-8").splitlines())
    sections = (kind, "constituents") if kind == "samples" else (kind,)
    found: dict[str, str] = {}
    shared: dict[str, list[str]] = {}
    for row in rows:
        if row["table"] in sections:
            found.setdefault(plain(row["spelling"]), row["target"])
        if row["table"] == "samples":
            shared.setdefault(row["target"], []).append(row["spelling"])
    if kind in ("stations", "checks", "long"):
        names = ("sample",) if kind == "long" else columns(kind)
        for target in names:
            for spelling in shared.get(target, []):
                found.setdefault(plain(spelling), target)
    return MappingProxyType(found)


def plain(text: str) -> str:
    """A spelling without case, spaces, marks and charges: `Fe 2+` and `fe(II)` become `fe2` and `feii`."""
    return re.sub(r"[\s_\-–./#:,;'’\"()\[\]+^*°]", "", text).lower()


def understand(text: object, kind: str, stated: Mapping[str, str] | None = None) -> Header:
    """The meaning of one header cell in a table of a kind (`samples`, `stations`, `checks`, `long`).

    `stated` are the user's own words: header as it stands → column, `ignore` to leave it out.
    """
    shown = " ".join(str(text).split())
    own = {key.strip().casefold(): value for key, value in (stated or {}).items()}
    if shown.casefold() in own:
        target = own[shown.casefold()]
        if target == "ignore":
            return Header(shown, "", ignored=True)
        return Header(shown, target, _split(shown)[1])
    known = _spellings(kind)
    if plain(shown) in known:
        return Header(shown, known[plain(shown)], _split(shown)[1])
    name, unit = _split(shown)
    replicate = _REPLICATE.match(re.sub(r"[\s_\-]+", " ", name).strip().lower())
    if kind == "samples" and replicate:
        return Header(shown, "ORP_mV", unit, replicate=int(replicate.group(1)))
    if (
        kind == "samples"
        and plain(name) in ("do", "dissolvedoxygen", "o2", "oxygen")
        and unit
        and unit.kind == "percent"
    ):
        return Header(shown, "O2_percent", unit)
    target = known.get(plain(name), "") or known.get(plain(_BESIDE_THE_POINT.sub(" ", _AS.sub("", name))), "")
    if target == "depth_cm" and unit and unit.kind == "length" and unit.factor > 0.1:
        # a depth in m or ft is that of a screen or a sampled interval, not of an electrode in the soil
        target = "depth_bottom_m"
    return Header(shown, target, unit)


def _split(shown: str) -> tuple[str, Unit | None]:
    """Header text into name and unit: `As (µg/L)`, `Fe [mg/l]`, `As_ug_L`, `Fe_ugL`, `ORP mV`, `T, °C`."""
    found = _BRACKET.match(shown)
    if found:
        unit = recognise(found.group(2))
        if unit:
            return found.group(1), unit
    parts = re.split(r"[\s_,;]+", shown)
    for count in (4, 3, 2, 1):
        if len(parts) <= count:
            continue
        tail = parts[-count:]
        joined = "".join(tail)
        for text in dict.fromkeys((" ".join(tail), "/".join(tail), joined, re.sub(r"(?i)(?<=[gq])l$", "/L", joined))):
            unit = recognise(text)
            if unit and unit.kind not in ("none",):
                return " ".join(parts[:-count]), unit
    return shown, None


def counts_as(shown: str, element: str) -> str:
    """Formula that a header says is weighed: `NO3-N` N, `alkalinity as CaCO3` CaCO3, `SiO2` SiO2; '' when none."""
    name = _STATE.sub("", _split(shown)[0]).strip()
    found = re.search(r"[-\s_]as[-\s_]+\(?([A-Z][A-Za-z0-9]*)\)?\s*$", name) or re.search(r"[-\s_](N|P|S|C)\s*$", name)
    text = found.group(1) if found else re.sub(r"\^?\d*[-+−]$", "", name)
    try:
        return text if parse(text).atoms.get(element) and molar_mass(text) else ""
    except GleyError:
        return ""


def nearest(text: str, kind: str) -> str:
    """The nearest known header, for a hint; '' when none is near."""
    name = plain(_split(" ".join(str(text).split()))[0])
    found = difflib.get_close_matches(name, _spellings(kind), 1, 0.75)
    return _spellings(kind)[found[0]] if found else ""


def targets(kind: str) -> frozenset[str]:
    """All names that a user may map a header to in a table of a kind."""
    if kind == "samples":
        return frozenset({*columns("samples"), *constituents(), "date_time"})
    return frozenset(_spellings(kind).values())


@cache
def fact_keys() -> MappingProxyType:
    """Plain spelling → key of the facts."""
    rows = csv.DictReader((files("gley.survey") / "headers.csv").read_text(encoding="utf-8").splitlines())
    return MappingProxyType({plain(row["spelling"]): row["target"] for row in rows if row["table"] == "facts"})
