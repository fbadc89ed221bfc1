"""Reference half-cells against the hydrogen electrode: the table, its range, and names as people write them."""

import csv
import re
from dataclasses import dataclass
from functools import cache
from importlib.resources import files
from types import MappingProxyType
from typing import Any

import numpy as np

from gley.errors import UsageError

FILL_UNKNOWN = "Ag/AgCl, fill unknown"
HYDROGEN = "hydrogen scale (already Eh)"
OWN_OFFSET = "own offset"

_UNKNOWN_MEMBERS = ("Ag/AgCl, 3 M KCl", "Ag/AgCl, 3.5 M KCl", "Ag/AgCl, 4 M KCl", "Ag/AgCl, saturated KCl")
_UNKNOWN_SOURCE = "mean of 3, 3.5, 4 M and saturated KCl at the temperature; fill not known"


@dataclass(frozen=True)
class Curve:
    """A published potential against temperature: `T_C` and `E_mV` rise in T; interpolated linearly between points."""

    name: str
    T_C: np.ndarray
    E_mV: np.ndarray
    sources: tuple[str, ...]
    seen: str
    grade: str
    note: str

    def at(self, temperature_C: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
        """Potential in mV (n,), and by how many °C each temperature lies outside the published range (n,).

        Outside, the end value is held.
        """
        t = np.asarray(temperature_C, float)
        beyond = np.maximum(self.T_C[0] - t, 0.0) + np.maximum(t - self.T_C[-1], 0.0)
        return np.interp(t, self.T_C, self.E_mV), beyond


def read_curves(file: str, name: str, value: str) -> MappingProxyType:
    """Curves of a table of the room by name; the worst grade of a curve's points stands for it."""
    rows = list(csv.DictReader((files("gley.probe") / file).read_text(encoding="utf-8").splitlines()))
    found = {}
    for key in dict.fromkeys(row[name] for row in rows):
        own = [row for row in rows if row[name] == key]
        found[key] = Curve(
            key,
            np.array([float(row["T_C"]) for row in own]),
            np.array([float(row[value]) for row in own]),
            tuple(dict.fromkeys(row["source"] for row in own)),
            ", ".join(dict.fromkeys(row["seen"] for row in own)),
            max(row["grade"] for row in own),
            " ".join(dict.fromkeys(row["note"] for row in own if row["note"])),
        )
    return MappingProxyType(found)


@cache
def half_cells() -> MappingProxyType:
    """All reference electrodes by name, `fill unknown` included."""
    found = dict(read_curves("electrodes.csv", "electrode", "E_mV"))
    members = [found[name] for name in _UNKNOWN_MEMBERS]
    T = np.arange(max(item.T_C[0] for item in members), min(item.T_C[-1] for item in members) + 1)
    mean = np.mean([item.at(T)[0] for item in members], axis=0)
    note = "10 mV are added to the standard deviation"
    found[FILL_UNKNOWN] = Curve(FILL_UNKNOWN, T, mean, (_UNKNOWN_SOURCE,), "derived", "C", note)
    return MappingProxyType(found)


def electrodes() -> list[dict[str, Any]]:
    """The table as plain values: name, potential at 25 °C [mV], published range [°C], source, seen, grade, note."""
    return [{**described(item), "E_25C_mV": float(item.at(np.array([25.0]))[0][0])} for item in half_cells().values()]


def described(item: Curve) -> dict[str, Any]:
    """A curve as plain values: name, published range [°C], source, seen, grade, note."""
    return {
        "name": item.name,
        "T_min_C": float(item.T_C[0]),
        "T_max_C": float(item.T_C[-1]),
        "source": "; ".join(item.sources),
        "seen": item.seen,
        "grade": item.grade,
        "note": item.note,
    }


def reference_mV(electrode: str, temperature_C: float) -> float:
    """Potential in mV against the hydrogen electrode of a reference electrode at a temperature in °C.

    Raises
    ------
    UsageError
        When the name isn't a known electrode, or leaves the filling solution open.
    """
    return float(half_cells()[find_electrode(electrode)].at(np.array([temperature_C]))[0][0])


def find_electrode(text: str) -> str:
    """The table's name for an electrode as people write it.

    Knows `Ag/AgCl 3M`, `silver chloride sat. KCl`, `SCE`, `Ag/AgCl (3,5 mol/L)`, `SHE`, `already Eh` and the like.

    Raises
    ------
    UsageError
        For an unknown electrode, an unknown strength, or a missing filling solution; names the choices.
    """
    plain = " ".join(str(text).replace(",", ", ").split())
    for name in half_cells():
        if name.lower().replace(" ", "") == plain.lower().replace(" ", ""):
            return name
    couple = _couple(plain.lower())
    if couple == HYDROGEN:
        return HYDROGEN
    if not couple:
        message = f"'{text}' isn't a reference electrode in the table."
        raise UsageError(message, f"Choose from: {_choices()}.")
    fill = _fill(str(text).lower(), couple)
    own = [name for name in half_cells() if name.startswith(couple)]
    if not fill and len(own) == 1:
        return own[0]
    for name in own:
        if fill and name.split(", ")[1].startswith(fill):
            return name
    shown = "; ".join(own)
    if not fill:
        message = f"'{text}' leaves the filling solution open."
        raise UsageError(message, f"Choose from: {shown}.")
    message = f"'{text}': there is no {couple} with this filling solution in the table."
    raise UsageError(message, f"Choose from: {shown}; or give offset_mV under [probe] in the settings.")


def _choices() -> str:
    return "; ".join(half_cells())


def _couple(plain: str) -> str:
    """Which couple a text names; '' when none."""
    tight = re.sub(r"[\s_\-]", "", plain)
    if re.search(r"hg2so4|mercurous?sul|mercurysul|\bmse\b", tight):
        return "Hg/Hg2SO4"
    if re.search(r"cu/?cuso4|coppersul|\bcse\b", tight):
        return "Cu/CuSO4"
    if re.search(r"calomel|kalomel|hg2?/?hg2?cl2?|\bsce\b", tight):
        return "calomel"
    if re.search(r"ag/?agcl|silver/?silver|silverchloride|silber|^agcl", tight):
        return "Ag/AgCl"
    if re.search(r"\bshe\b|\bnhe\b|hydrogen|alreadyeh|^eh$|standardhydrogen", tight):
        return HYDROGEN
    return ""


def _fill(plain: str, couple: str) -> str:
    """The filling solution as the table's names begin with it: `3.5 M`, `saturated`, `fill unknown`; '' when none."""
    if re.search(r"unknown|unbekannt|not known|\?", plain):
        return "fill unknown"
    if re.search(r"\bsat|gesät|gesaet|saturat|\bsce\b", plain):
        return "saturated"
    strength = re.search(r"(\d+(?:[.,]\d+)?)\s*-?\s*(?:m\b|mol|n\b|molar)", plain)
    if not strength:
        return "saturated" if couple in ("Cu/CuSO4", "Hg/Hg2SO4") else ""
    number = float(strength.group(1).replace(",", "."))
    return "3.33 M" if abs(number - 10 / 3) < 0.04 else f"{number:g} M"
