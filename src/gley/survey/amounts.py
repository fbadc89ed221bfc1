"""Concentrations as reported to mol/L, by unit and by what the number weighs; a unit is never guessed."""

from functools import cache

from gley.columns import Constituent
from gley.formula import molar_mass, parse
from gley.units import Unit, mol_per_L

_EQUIVALENTS = {"CaCO3": 2, "HCO3": 1, "CO3": 2}


def to_mol_L(value: float, unit: Unit, constituent: Constituent, basis: str) -> float:
    """mol/L (alkalinity: eq/L) of a reported value.

    Parameters
    ----------
    value : float
        As reported, in `unit`.
    unit : Unit
        Its unit; a basis in it (`mg/L as N`) wins over `basis`.
    constituent : Constituent
        What was analysed.
    basis : str
        Formula that the header says is weighed; '' = the constituent's own.

    Raises
    ------
    ValueError
        When the unit can't be one of this constituent.
    """
    if constituent.key == "alkalinity":
        return _equivalents(value, unit, basis)
    basis = unit.basis or basis or constituent.weighed
    stated = Unit(unit.kind, unit.factor, basis if unit.kind in ("mass", "amount") else "", unit.text)
    return mol_per_L(value, stated, constituent.formula, constituent.element, constituent.charge)


def _equivalents(value: float, unit: Unit, basis: str) -> float:
    """Alkalinity in eq/L: mmol/L of acid capacity count one each, mg/L are CaCO3 unless said otherwise."""
    if unit.kind == "charge":
        return value * unit.factor
    if unit.kind == "amount":
        return value * unit.factor * _EQUIVALENTS.get(unit.basis or basis, 1)
    if unit.kind != "mass":
        message = f"'{unit.text}' isn't a unit of alkalinity"
        raise ValueError(message)
    weighed = unit.basis or basis or "CaCO3"
    if weighed not in _EQUIVALENTS:
        message = f"alkalinity counted as {weighed} isn't known"
        raise ValueError(message)
    return value * unit.factor / molar_mass(weighed) * _EQUIVALENTS[weighed]


@cache
def slug(unit: Unit | None, basis: str, constituent: Constituent) -> str:
    """Unit as the end of a column name: `ug_L`, `mg_L_as_N`; a basis that is the constituent itself isn't repeated."""
    text = unit.text if unit else "as_delivered"
    own = basis and parse(basis).atoms == parse(constituent.formula).atoms
    if basis and not own and unit and not unit.basis:
        text += f" as {basis}"
    swap = str.maketrans({"µ": "u", "μ": "u", "/": "_", "%": "percent", " ": "_", "°": "", "·": "_", "(": "", ")": ""})
    return text.translate(swap).replace("mg_l", "mg_L").replace("ug_l", "ug_L").replace("__", "_")
