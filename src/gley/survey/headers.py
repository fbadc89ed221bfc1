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
    r"(?i)(?<![A-Za-z])(field|dissolved|diss|filtered|filt|conc|value|measured|in situ"
    r"|gelöst|gel|filtriert)(?![A-Za-z])"
)
_FILTERED = re.compile(r"(?i)(?<![A-Za-z])(dissolved|diss|filtered|filt|gelöst|gel|filtriert)(?![A-Za-z])")
_TOTAL = re.compile(r"(?i)(?<![A-Za-z])(total|tot|unfiltered|unfilt|recoverable|t|gesamt|ges|unfiltriert)(?![A-Za-z])")
_STATE = re.compile(r"\(\s*(?:III|II|IV|VII|VI|V|I)\s*\)")
_AS = re.compile(r"[\s_-]\(?as[\s_-]+\(?[A-Z][A-Za-z0-9]*\)?\s*$")
_REPLICATE = re.compile(r"^(pt|orp|redox|electrode|platinum|eh)\s*(\d{1,2})$")
_REFERENCE = re.compile(
    r"(?i)[\s_,;(\[]*(?:(?<![a-z])(?:vs|versus|against|relative to)\b\.?)?[\s_(\[]*"
    r"(?<![a-z])(SHE|NHE|Ag\s?/\s?AgCl|SCE|calomel|Hg\s?/\s?Hg2Cl2|Cu\s?/\s?CuSO4)(?![a-z])([^()\[\]]*)[)\]]*"
)
_VOLTS = re.compile(r"(?i)(?<![a-z])m?v(?![a-z])")
_CONCENTRATIONS = ("mass", "amount", "charge", "solid")
_SHARED = {
    "long": ("sample", "station", "date", "time", "date_time", "round", "sample_type"),
    "stations": tuple(columns("stations")),
    "checks": tuple(columns("checks")),
}
"""Targets of other kinds of table that are spelled as in the samples table."""


@dataclass(frozen=True)
class Header:
    """What a header cell means: `target` is a house column or a constituent's key, '' when it isn't understood.

    `replicate` is the number of one of several electrodes read side by side, `electrode` a reference named in the
    header of a potential.
    """

    text: str
    target: str
    unit: Unit | None = None
    replicate: int = 0
    ignored: bool = False
    electrode: str = ""


@cache
def _words() -> tuple[Mapping[str, str], ...]:
    text = (files("gley.survey") / "headers.csv").read_text(encoding="utf-8")
    return tuple(csv.DictReader(text.splitlines()))


@cache
def _spellings(kind: str) -> MappingProxyType:
    """Plain spelling → target for one kind of table."""
    sections = (kind, "constituents") if kind == "samples" else (kind,)
    found: dict[str, str] = {}
    for row in _words():
        if row["table"] in sections:
            found.setdefault(plain(row["spelling"]), row["target"])
    for row in _words():
        if row["table"] == "samples" and row["target"] in _SHARED.get(kind, ()):
            found.setdefault(plain(row["spelling"]), row["target"])
    return MappingProxyType(found)


@cache
def _section(table: str, value: str) -> MappingProxyType:
    """Plain spelling → what a column of the words file says, for one of its tables."""
    return MappingProxyType({plain(row["spelling"]): row[value] for row in _words() if row["table"] == table})


def plain(text: str) -> str:
    """A spelling without case, spaces, marks and charges: `Fe 2+` and `fe(II)` become `fe2` and `feii`."""
    return re.sub(r"[\s_\-–./#:,;'’\"()\[\]+^*°]", "", text).lower()


def understand(text: object, kind: str, stated: Mapping[str, str] | None = None) -> Header:
    """The meaning of one header cell in a table of a kind (`samples`, `stations`, `checks`, `long`).

    `stated` are the user's own words: header as it stands → column, `ignore` to leave it out.
    """
    shown = " ".join(str(text).split())
    own = {" ".join(key.split()).casefold(): value for key, value in (stated or {}).items()}.get(shown.casefold())
    if own == "ignore":
        return Header(shown, "", ignored=True)
    if own in targets(kind):
        return Header(shown, str(own), _split(shown)[1])
    known = _spellings(kind)
    name, unit = _split(shown)
    if plain(shown) in known:
        target = known[plain(shown)]
        # `As V` names a species, not volts
        return Header(shown, target, unit if unit and _fits(target, unit) else None)
    header = _potential(shown, name, unit) if kind == "samples" else None
    if header:
        return header
    target = known.get(plain(name), "") or known.get(plain(_BESIDE_THE_POINT.sub(" ", _AS.sub("", name))), "")
    if not target and kind == "samples":
        target = _of_total(name)
    if target == "O2" and unit and unit.kind == "percent":
        target = "O2_percent"
    if target in ("pH", "pH_lab") and unit and unit.kind != "none":
        target = ""  # the glass electrode's voltage beside its pH
    bracket = _BRACKET.match(shown)
    if not target and not unit and bracket:
        target = _with_remark(known.get(plain(bracket.group(1)), ""), kind)
    return Header(shown, soil_or_well(target, unit), unit)


def _fits(target: str, unit: Unit) -> bool:
    """Whether a unit can be one of what a header names."""
    if target in constituents():
        return unit.kind in _CONCENTRATIONS
    return unit.kind not in _CONCENTRATIONS and (unit.kind != "temperature" or target == "temperature_C")


def _potential(shown: str, name: str, unit: Unit | None) -> Header | None:
    """Headers of potentials beyond plain words: numbered electrodes, and references named beside them."""
    numbered = _REPLICATE.match(re.sub(r"[\s_\-]+", " ", name).strip().lower())
    if numbered:
        word, number = numbered[1], int(numbered[2])
        if word == "eh" and number == 7:
            return Header(shown, "", unit)  # Eh brought to pH 7
        return Header(shown, "Eh_given_mV" if word == "eh" else "ORP_mV", unit, replicate=number)
    reference = _REFERENCE.search(shown)
    if not reference:
        return None
    core = plain(_VOLTS.sub(" ", shown[: reference.start()] + " " + shown[reference.end() :]))
    if _spellings("samples").get(core) not in ("ORP_mV", "Eh_given_mV"):
        return None
    volts = _VOLTS.search(shown)
    of_potential = recognise(volts[0]) if volts else None
    if reference[1].upper() in ("SHE", "NHE"):
        return Header(shown, "Eh_given_mV", of_potential)
    couple, fill = re.sub(r"\s", "", reference[1]), _VOLTS.sub("", reference[2]).strip(" ,;_")
    return Header(shown, "ORP_mV", of_potential, electrode=f"{couple}, {fill}" if fill else couple)


def _of_total(name: str) -> str:
    """Key of an element whose total is named: `Total Fe`."""
    target = _spellings("samples").get(plain(_TOTAL.sub(" ", name)), "") if fraction(name) == "total" else ""
    return target if target in constituents() and constituents()[target].element == target else ""


def _with_remark(target: str, kind: str) -> str:
    """A target whose header carries a remark in brackets, where that can't be an unknown unit: `Date (UTC)`."""
    numeric = kind != "long" and target in columns(kind) and columns(kind)[target].dtype == "number"
    return "" if numeric else target


def soil_or_well(target: str, unit: Unit | None) -> str:
    """A depth in m or ft is that of a screen or a sampled interval, not of an electrode in the soil."""
    return "depth_bottom_m" if target == "depth_cm" and unit and unit.kind == "length" and unit.factor > 0.1 else target


def fraction(text: str) -> str:
    """`dissolved`, `total` or '' as a header, a laboratory's parameter or its fraction column says."""
    return "dissolved" if _FILTERED.search(text) else "total" if _TOTAL.search(text) else ""


def is_scale_open(header: Header) -> bool:
    """Whether the header of a potential leaves open if it is a reading or on the hydrogen scale: `Redox (mV)`."""
    name = plain(header.text)
    said = any(word in name for word in ("orp", "oxidation", "raw", "reading", "meas", "reference", "spannung"))
    return header.target == "ORP_mV" and "redox" in name and not said and not header.electrode


def sample_type(text: str) -> str:
    """`normal`, `duplicate`, `blank` or `spike` for the words and letters that deliveries use; '' for others."""
    return _section("types", "target").get(plain(text), "")


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


@cache
def counts_as(shown: str, element: str) -> str:
    """Formula that a header says is weighed: `NO3-N` N, `alkalinity as CaCO3` CaCO3, `SiO2` SiO2; '' when none."""
    name = _STATE.sub("", _split(shown)[0]).strip()
    said = re.search(r"[-\s_]\(?as[-\s_]+\(?([A-Z][A-Za-z0-9]*)\)?\s*$", name)
    said = said or re.search(r"[-\s_](N|P|S|C)\s*$", name) or re.match(r"^(N|P|S|C)-[A-Z]", name)
    named = _section("constituents", "weighed").get(plain(_BESIDE_THE_POINT.sub(" ", name)))
    text = said.group(1) if said else named or re.sub(r"\^?\d*[-+−]$", "", name)
    try:
        return text if parse(text).atoms.get(element) and molar_mass(text) else ""
    except GleyError:
        return ""


def nearest(text: str, kind: str) -> str:
    """The nearest known header, for a hint; '' when none is near."""
    name = plain(_split(" ".join(str(text).split()))[0])
    found = difflib.get_close_matches(name, _spellings(kind), 1, 0.75)
    target = _spellings(kind)[found[0]] if found else ""
    return "EC" if target == "EC_or_SC" else target


def targets(kind: str) -> frozenset[str]:
    """All names that a user may map a header to in a table of a kind."""
    if kind == "samples":
        return frozenset({*columns("samples"), *constituents(), "date_time"})
    return frozenset(_spellings(kind).values())


def fact_keys() -> MappingProxyType:
    """Plain spelling → key of the facts."""
    return _section("facts", "target")
