"""Symbols of a map: colour, shape and words of each category; a species or process looks the same on all maps."""

import re
from collections.abc import Iterable
from dataclasses import dataclass

from matplotlib.colors import to_hex, to_rgb

from gley.drawing.style import bare_state, field_colour, field_state, oxidation_number, species_text
from gley.formula import typeset
from gley.stability import species

_ROUND = ("o", "^", "v", "p", "h", "<", ">", "8")
_SQUARE = ("s", "D", "P", "X", "d", "*")
_GENERAL = (*_ROUND, *_SQUARE)
_DEEPER = 2.2

_PROCESSES = {
    "O2": ("#c8682a", "o"), "O2-Mn(IV)": ("#d79a63", "8"), "O2-Fe(III)/SO4": ("#b98a7a", "*"),
    "NO3": ("#e0ad4c", "^"), "NO3-Mn(IV)": ("#cbb583", "<"), "NO3-Fe(III)/SO4": ("#a8977c", ">"),
    "suboxic": ("#ece3c8", "v"), "Mn(IV)": ("#a9ab6c", "D"), "Fe(III)": ("#8fb9ab", "s"),
    "Fe(III)-SO4": ("#7aa3ad", "p"), "Fe(III)/SO4": ("#7aa3ad", "h"), "SO4": ("#4d7a91", "P"),
    "CH4": ("#33495c", "X"),
}  # fmt: skip
"""Oxidised to reduced: rust, ochre, olive, gley blue-green, blue-grey, slate."""

HOLLOW = {"": "o", "not assigned": "o", "undetermined": "D"}
"""Categories without a colour of their own, and their shape."""


@dataclass(frozen=True)
class Symbol:
    """How one category is drawn; `fill` is None for a white one."""

    fill: str | None
    marker: str
    text: str


def symbols(categories: Iterable[str]) -> dict[str, Symbol]:
    """A symbol for each category present, most oxidised first, those not assigned last and white; no two alike."""
    present = sorted(set(categories), key=_order)
    used: set[str] = set()
    found = {}
    for name in present:
        if name in HOLLOW:
            found[name] = Symbol(None, HOLLOW[name], name or "not assigned")
            continue
        fill, wished = _wish(name)
        marker = next((shape for shape in wished if shape not in used), wished[0])
        used.add(marker)
        found[name] = Symbol(fill, marker, _text(name))
    return found


def _order(name: str) -> tuple:
    if name in HOLLOW:
        return 3, 0.0, name
    if name in _PROCESSES:
        return 0, list(_PROCESSES).index(name), name
    state = field_state(name)
    return (2, 0.0, name) if state is None else (1, -oxidation_number(bare_state(state[1])), name)


def _wish(name: str) -> tuple[str, tuple[str, ...]]:
    """Fill and shapes in order of preference: a process has its own, a species one by its place in the table."""
    if name in _PROCESSES:
        fill, marker = _PROCESSES[name]
        return fill, (marker,)
    state = field_state(name)
    if state is None:
        return "#b9b2a7", _GENERAL
    own = _ROUND if state[2] == "dissolved" else _SQUARE
    rest = [shape for shape in _GENERAL if shape not in own]
    states = {item: field_state(item) for item in species()}
    alike = [item for item, other in states.items() if other and (other[0], other[2]) == (state[0], state[2])]
    start = alike.index(name) % len(own)
    return deeper(field_colour(name) or "#b9b2a7"), (*own[start:], *own[:start], *rest)


def deeper(colour: str) -> str:
    """A field's tint made strong enough for a small marker on white."""
    red, green, blue = (part**_DEEPER for part in to_rgb(colour))
    return to_hex((red, green, blue))


def _text(name: str) -> str:
    """Species by name and formula; processes with their formulas set: `Fe(III)/SO4` → Fe(III)/SO₄²⁻."""
    if name not in _PROCESSES:
        return species_text(name)
    charged = {"NO3": "NO3^-", "SO4": "SO4^2-", "CH4": "CH4", "O2": "O2"}
    return re.sub("NO3|SO4|CH4|O2", lambda found: typeset(charged[found.group()]), name)
