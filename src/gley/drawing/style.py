"""The look of all drawings: colours taken from soil (rust and ochre oxidised, gley blue-grey reduced), type, numbers.

A colour follows from an oxidation state within its element and from dissolved or solid alone, so it is the same in
every drawing. It never stands alone: fields are named, markers differ in shape too.
"""

import csv
from collections.abc import Iterator
from contextlib import contextmanager
from functools import cache
from importlib.resources import files

import matplotlib as mpl
import matplotlib.style
import numpy as np
from matplotlib.colors import to_hex, to_rgb

from gley.formula import molar_mass, typeset
from gley.stability import species

WIDTH_MM = 160.0
"""Width of a figure in a report, mm."""

INK = "#1d1a17"
LINE = "#4a4038"
WATER = "#2b5876"
OVER = "#5e1f5a"
FAINT = "#6d655d"

TITLE_PT, NAME_PT, SMALL_PT = 11.0, 8.0, 7.0
"""Sizes of type in points; nothing is set smaller than `SMALL_PT`."""

RC = {
    "font.family": "sans-serif", "font.sans-serif": ["DejaVu Sans"], "font.size": NAME_PT,
    "mathtext.fontset": "dejavusans", "mathtext.default": "regular", "axes.labelsize": NAME_PT,
    "xtick.labelsize": SMALL_PT, "ytick.labelsize": SMALL_PT, "axes.linewidth": 0.8, "axes.edgecolor": INK,
    "text.color": INK, "axes.labelcolor": INK, "xtick.color": INK, "ytick.color": INK, "axes.unicode_minus": True,
    "svg.hashsalt": "gley", "svg.fonttype": "path", "figure.dpi": 100.0, "text.usetex": False, "text.hinting": "none",
    "figure.facecolor": "white", "savefig.facecolor": "white", "hatch.linewidth": 0.4,
}  # fmt: skip

_ENDS = {
    "Fe": ("II", "III"), "Mn": ("II", "IV"), "As": ("III", "V"), "S": ("-II", "VI"), "N": ("-III", "V"),
    "C": ("-IV", "IV"), "U": ("IV", "VI"), "Cr": ("III", "VI"), "Se": ("-II", "VI"), "Cu": ("I", "II"),
    "V": ("III", "V"), "Pb": ("0", "IV"), "Zn": ("0", "IV"), "Cd": ("0", "IV"), "Ni": ("0", "IV"), "Co": ("I", "III"),
    "Mo": ("IV", "VI"), "Sb": ("III", "V"), "Hg": ("0", "II"), "Ag": ("0", "I"),
}  # fmt: skip
"""The oxidation states that read as reduced and oxidised in natural water; others lie between or just beyond."""

_STOPS = (-0.4, 0.0, 0.5, 1.0, 1.4)
_DISSOLVED = ("#bccad4", "#ccdadb", "#e3e4d3", "#f8ead8", "#f9dccb")
_SOLID = ("#7d92a3", "#8fabb1", "#bfc2a2", "#e5b88d", "#cf8f6d")
_ROMAN = {"I": 1, "V": 5, "X": 10}


@contextmanager
def look() -> Iterator[None]:
    """The house style for what is drawn or saved inside, whatever the caller's own matplotlib settings are."""
    with mpl.style.context(["default", RC]):
        yield


def oxidation_number(state: str) -> float:
    """Number of a state as the species table writes it: `III` → 3, `-II` → −2, `II,III` → 2.5 (the mean), `0` → 0."""
    return float(np.mean([_roman(part.strip()) for part in state.split(",")]))


def _roman(text: str) -> int:
    sign, digits = (-1, text[1:]) if text[:1] in "-−" else (1, text)
    values = [_ROMAN.get(letter, 0) for letter in digits]
    return sign * sum(-v if v < max(values[k:], default=0) else v for k, v in enumerate(values))


def bare_state(state: str) -> str:
    """`As(III)` → `III`; `III` stays."""
    return state.rpartition("(")[2].rstrip(")")


def tint(element: str, state: str, kind: str) -> str:
    """Fill of a field as a hex colour.

    Parameters
    ----------
    element : str
        Symbol.
    state : str
        Oxidation state within the element, `III` or `As(III)`.
    kind : str
        `dissolved` or `solid`; a solid is the deeper tint.
    """
    number = oxidation_number(bare_state(state))
    low, high = _ends(element)
    place = np.clip((number - low) / (high - low) if high > low else 0.5, _STOPS[0], _STOPS[-1])
    stops = np.array([to_rgb(colour) for colour in (_SOLID if kind == "solid" else _DISSOLVED)])
    red, green, blue = (float(np.interp(place, _STOPS, stops[:, channel])) for channel in range(3))
    return to_hex((red, green, blue))


@cache
def _ends(element: str) -> tuple[float, float]:
    """Reduced and oxidised end of an element: as chosen, else its lowest and highest state in the species table."""
    if element in _ENDS:
        low, high = _ENDS[element]
        return oxidation_number(low), oxidation_number(high)
    known = [oxidation_number(item.oxidation_state) for item in species().values() if item.element == element]
    return (min(known), max(known)) if known else (0.0, 0.0)


def field_state(name: str) -> tuple[str, str, str] | None:
    """Element, oxidation state as `As(III)`, and kind of the species a field is named for; None for other words."""
    item = species().get(name)
    if item is None or not item.element:
        return None
    return item.element, f"{item.element}({item.oxidation_state})", item.kind


def field_colour(name: str) -> str | None:
    """Fill of the field a species names; None for a name that isn't in the species table."""
    state = field_state(name)
    return None if state is None else tint(*state)


def key_of_tints(states: set[tuple[str, str, str]]) -> list[tuple[str, str]]:
    """Colour and label of each tint among (element, state, kind), reduced first; states of one tint share the label."""
    ordered = sorted(states, key=lambda key: (oxidation_number(bare_state(key[1])), key[2], key[0]))
    labels: dict[tuple[str, str], list[str]] = {}
    for element, state, kind in ordered:
        labels.setdefault((tint(element, state, kind), kind), []).append(state_text(state))
    return [(colour, f"{', '.join(found)} {kind}") for (colour, kind), found in labels.items()]


def shown_name(name: str, formula: str, kind: str) -> tuple[str, str]:
    """Name and formula as set in a drawing: a solid has both, a dissolved form only its formula (name empty), an
    uncharged one with its phase, so that it isn't taken for the solid of the same formula.
    """
    if kind != "dissolved":
        return name, typeset(formula)
    return "", typeset(formula) + ("" if "^" in formula else "(aq)")


def species_text(name: str) -> str:
    """One line for legends: a dissolved form by its formula, a solid by name and formula, other words as they are."""
    item = species().get(name)
    if item is None:
        return name
    word, formula = shown_name(name, item.formula, item.phase)
    return f"{word} {formula}".strip()


def state_text(state: str) -> str:
    """`S(-II)` with a true minus."""
    return state.replace("-", "−")


@cache
def element_name(symbol: str) -> str:
    """`As` → `Arsenic`; the symbol itself where the table of weights has no name."""
    text = (files("gley") / "data" / "atomic_weights.csv").read_text(encoding="utf-8")
    names = {row["symbol"]: row["name"] for row in csv.DictReader(text.splitlines())}
    return names.get(symbol, symbol).capitalize()


def amount_text(mol_L: float, element: str = "") -> str:
    """`1e-6` → `1.0 µmol/L`, with `element` also its mass: `1.0 µmol/L (75 µg/L)`. Two or three digits."""
    text = _prefixed(mol_L, "mol/L")
    return f"{text} ({_prefixed(mol_L * molar_mass(element), 'g/L')})" if element else text


def _prefixed(value: float, unit: str) -> str:
    for size, prefix in ((1.0, ""), (1e-3, "m"), (1e-6, "µ"), (1e-9, "n")):
        if value >= 0.9995 * size:
            return f"{_digits(value / size)}\u00a0{prefix}{unit}"
    return f"{value:.1e}\u00a0{unit}"


def _digits(value: float) -> str:
    """Two significant digits, three from 100 on: `1.0`, `75`, `112`."""
    return f"{value:.1f}" if value < 9.95 else f"{value:.0f}"
