"""Units as surveys write them: recognised by spelling, converted by one factor, never guessed.

A concentration unit may name its basis: ``mg/L as N``, ``mg/L as CaCO3``, ``mg/L NO3``. Without one it is the
constituent's own formula (`columns.Constituent.formula`).
"""

import re
from dataclasses import dataclass
from functools import cache

from gley.errors import GleyError
from gley.formula import molar_mass, parse

_MICRO = str.maketrans(
    {"μ": "u", "µ": "u", "−": "-", "–": "-", "⁻": "-", "¹": "1", "²": "2", "³": "3", "º": "°", "⋅": "·"}
)

# kind, factor to the house unit (g/L, mol/L, eq/L, mV, °C, µS/cm, m, cm)
_SPELLINGS: dict[str, tuple[str, float]] = {
    "g/l": ("mass", 1.0), "mg/l": ("mass", 1e-3), "ug/l": ("mass", 1e-6), "ng/l": ("mass", 1e-9),
    "mg/dm3": ("mass", 1e-3), "ug/dm3": ("mass", 1e-6), "g/m3": ("mass", 1e-3), "mg/m3": ("mass", 1e-6),
    "ppm": ("mass", 1e-3), "ppb": ("mass", 1e-6), "mg/kg": ("solid", 1e-3), "ug/kg": ("solid", 1e-6),
    "mol/l": ("amount", 1.0), "mmol/l": ("amount", 1e-3), "umol/l": ("amount", 1e-6), "nmol/l": ("amount", 1e-9),
    "m": ("length", 1.0), "cm": ("length", 1e-2), "mm": ("length", 1e-3), "ft": ("length", 0.3048),
    "eq/l": ("charge", 1.0), "meq/l": ("charge", 1e-3), "ueq/l": ("charge", 1e-6), "mval/l": ("charge", 1e-3),
    "v": ("potential", 1e3), "volt": ("potential", 1e3), "volts": ("potential", 1e3), "mv": ("potential", 1.0),
    "us/cm": ("conductivity", 1.0), "micros/cm": ("conductivity", 1.0),
    "ms/cm": ("conductivity", 1e3), "ms/m": ("conductivity", 10.0),
    "s/m": ("conductivity", 1e4), "ds/m": ("conductivity", 1e3), "umho/cm": ("conductivity", 1.0),
    "umhos/cm": ("conductivity", 1.0), "s/cm": ("conductivity", 1e6),
    "c": ("temperature", 1.0), "degc": ("temperature", 1.0), "f": ("fahrenheit", 1.0), "degf": ("fahrenheit", 1.0),
    "deg": ("angle", 1.0), "%": ("percent", 1.0), "%sat": ("percent", 1.0), "-": ("none", 1.0),
    "none": ("none", 1.0), "ph": ("none", 1.0), "phunits": ("none", 1.0), "units": ("none", 1.0),
    "stdunits": ("none", 1.0), "su": ("none", 1.0),
    "mvolt": ("potential", 1.0), "mvolts": ("potential", 1.0), "celsius": ("temperature", 1.0),
    "degreesc": ("temperature", 1.0), "degcelsius": ("temperature", 1.0), "fahrenheit": ("fahrenheit", 1.0),
    "degrees": ("angle", 1.0), "dd": ("angle", 1.0), "decimaldegrees": ("angle", 1.0), "percent": ("percent", 1.0),
    "%saturation": ("percent", 1.0), "%saturatn": ("percent", 1.0), "ntu": ("turbidity", 1.0),
    "fnu": ("turbidity", 1.0), "mbgl": ("length", 1.0), "mbgs": ("length", 1.0), "masl": ("length", 1.0),
}  # fmt: skip

# mM differs from millimetre by case alone; a bare M is the metre of headers in capitals
_MOLAR = {"mM": 1e-3, "uM": 1e-6, "nM": 1e-9}
_EQUIVALENTS_OF_CaCO3 = 2


@dataclass(frozen=True)
class Unit:
    """A recognised unit: its kind, the factor to the house unit of that kind, the formula it counts, its spelling."""

    kind: str
    factor: float
    basis: str
    text: str


@cache
def recognise(text: str | None) -> Unit | None:
    """The unit a spelling means, or None when it isn't one we know (never a guess).

    Knows both micro signs, ``l-1`` and ``/litre`` for ``/l``, ``mM``, ``@25C`` behind conductivity, and a basis after
    ``as``, in parentheses, behind a space or before the litre: ``mg/L (as CaCO3)``, ``mg N/L``.
    """
    if text is None or not str(text).strip():
        return None
    shown = " ".join(str(text).split())
    plain = shown.translate(_MICRO)
    plain = re.sub(r"\s*(?:@|at)\s*25\s*°?\s*c$|\s*\(?25\s*°\s*c\)?$", "", plain, flags=re.IGNORECASE)
    plain = re.sub(r"(?i)/\s*lit(?:er|re)\b", "/L", plain)
    head, basis = _split_basis(plain)
    if head in _MOLAR:
        return Unit("amount", _MOLAR[head], basis, shown)
    key = re.sub(r"[\s°º.]", "", head).lower()
    key = re.sub(r"(?:\*|·)?l\^?-1$", "/l", key)
    key = re.sub(r"(?:\*|·)?cm\^?-1$", "/cm", key)
    if key in ("us", "ms") or key not in _SPELLINGS:
        return None
    kind, factor = _SPELLINGS[key]
    if basis and kind not in ("mass", "amount"):
        return None
    return Unit(kind, factor, basis, shown)


def _split_basis(text: str) -> tuple[str, str]:
    """`mg/L as N` → (`mg/L`, `N`); `mg NO3/L` → (`mg/L`, `NO3`). A basis that isn't a formula stays in the head."""
    found = re.match(r"^(\S+?/\s*[lL]|ppm|ppb|\S+/kg)\s*\(?\s*(?:-|as)?\s*\(?([A-Z][A-Za-z0-9]*(?:-[NPSC])?)\)*$", text)
    if not found:
        swapped = re.match(r"^([mun]?(?:g|mol))[\s-]*([A-Z][A-Za-z0-9]*)\s*/\s*([lL])$", text)
        if not swapped:
            return text, ""
        head, basis = f"{swapped.group(1)}/{swapped.group(3)}", swapped.group(2)
    else:
        # `NO3-N` counts the nitrogen of nitrate
        head, basis = found.group(1), found.group(2).rpartition("-")[2]
    try:
        parse(basis)
        molar_mass(basis)
    except GleyError:
        return text, ""
    return head, basis


def mol_per_L(value: float, unit: Unit, formula: str, element: str, charge: int) -> float:
    """Amount concentration in mol/L of a constituent from a value in a concentration unit.

    Parameters
    ----------
    value : float
        The reported number.
    unit : Unit
        Kind `mass`, `amount` or `charge`.
    formula : str
        What one mole of the constituent is (`NO3^-` for nitrate).
    element : str
        The element counted when the unit's basis holds a different number of its atoms than the formula.
    charge : int
        Charge number of the constituent, for eq/L.

    Counted as CaCO3 (hardness, bicarbonate alkalinity), one mole stands for two equivalents of an ion, as is usual;
    of an uncharged constituent for the atoms it holds.

    Raises
    ------
    ValueError
        When the unit isn't a concentration, the basis doesn't hold the element, or the constituent has no charge.
    """
    if unit.basis == "CaCO3" and unit.kind in ("mass", "amount") and charge:
        weight = molar_mass("CaCO3") if unit.kind == "mass" else 1.0
        return value * unit.factor / weight * _EQUIVALENTS_OF_CaCO3 / abs(charge)
    if unit.kind == "amount":
        return value * unit.factor
    if unit.kind == "charge":
        if charge == 0:
            message = f"{formula} carries no charge, '{unit.text}' says nothing about its amount"
            raise ValueError(message)
        return value * unit.factor / abs(charge)
    if unit.kind != "mass":
        message = f"'{unit.text}' isn't a unit of concentration"
        raise ValueError(message)
    basis = unit.basis or formula
    per_basis = parse(basis).atoms.get(element, 0)
    if not per_basis:
        message = f"'{unit.text}' counts {basis}, which holds no {element}"
        raise ValueError(message)
    per_formula = parse(formula).atoms.get(element, 1)
    return value * unit.factor / molar_mass(basis) * per_basis / per_formula


def celsius(value: float, unit: Unit) -> float:
    """Temperature in °C from a value in °C or °F."""
    return (value - 32.0) / 1.8 if unit.kind == "fahrenheit" else value
