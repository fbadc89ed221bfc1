"""Reference half-cells against the hydrogen electrode: the table, its range, and names as people write them."""

import csv
import re
from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from difflib import get_close_matches
from functools import cache
from importlib.resources import files
from types import MappingProxyType
from typing import Any

import numpy as np

from gley.errors import UsageError
from gley.probe import naming
from gley.probe.naming import FILL_UNKNOWN, HYDROGEN

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
    """The table as plain values, one record an electrode.

    `name`, `couple`, `fill`, potential at 25 °C [mV], published range [°C], `source`, `seen`, `grade`, `note`.
    """
    found = []
    for item in half_cells().values():
        couple, _, fill = item.name.partition(", ")
        at_25 = float(item.at(np.array([25.0]))[0][0])
        found.append({**described(item), "couple": couple, "fill": fill, "E_25C_mV": at_25})
    return found


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
        For an unknown electrode, an unknown strength, a missing filling solution, or a text that names two; names
        the choices, near names first.
    """
    wanted, known = _squeezed(text), {_squeezed(name): name for name in half_cells()}
    if wanted in known:
        return known[wanted]
    named = naming.couples(str(text))
    if not named:
        near = [known[key] for key in get_close_matches(wanted, known, 2, 0.6)]
        message = f"'{text}' isn't a reference electrode in the table."
        raise UsageError(message, _choose(half_cells(), near))
    if len(named) > 1:
        message = f"'{text}' names {' and '.join(named)}."
        cure = f"Write one: the electrode if the readings are raw, '{HYDROGEN}' if they have been converted."
        raise UsageError(message, cure)
    return named[0] if named[0] == HYDROGEN else _filled(str(text), named[0])


def _filled(text: str, couple: str) -> str:
    """The table's name for a couple with the filling solution a text states."""
    own = [name for name in half_cells() if name.startswith(couple)]
    try:
        fill = naming.fill(text, couple)
    except ValueError:
        message = f"'{text}' states two filling solutions."
        raise UsageError(message, _choose(own)) from None
    if not fill:
        message = f"'{text}' leaves the filling solution open."
        raise UsageError(message, _choose(own))
    name = f"{couple}, {fill}"
    if name not in own:
        message = f"'{text}': there is no {couple} with this filling solution in the table."
        raise UsageError(message, _choose(own).rstrip(".") + "; or give offset_mV under [probe] in the settings.")
    return name


def _squeezed(text: str) -> str:
    return re.sub(r"[\s,]", "", str(text).lower())


def _choose(names: Iterable[str], meant: Sequence[str] = ()) -> str:
    """The cure that lists the choices, after the near names."""
    asked = f"Did you mean {' or '.join(meant)}? " if meant else ""
    return f"{asked}Choose from: {'; '.join(names)}."
