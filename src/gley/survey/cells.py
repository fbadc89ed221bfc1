"""One reported value to the house form: field quantities in the unit of their column, concentrations to mol/L."""

from typing import Any

from gley.columns import Column, amount_column, constituents
from gley.findings import Findings, Place
from gley.survey import values
from gley.survey.amounts import slug, to_mol_L
from gley.survey.assemble import Record
from gley.survey.values import Reading
from gley.units import Unit, celsius

KINDS = {
    "mV": ("potential",),
    "°C": ("temperature", "fahrenheit"),
    "µS/cm": ("conductivity",),
    "cm": ("length",),
    "m": ("length",),
    "°": ("angle",),
    "%": ("percent",),
}
"""Kinds of unit that a column of this unit can be delivered in."""
_WEIGHED_OTHERWISE = ("NO3", "NO2", "NH4", "PO4", "Si", "DIC", "sulfide", "alkalinity")


def is_unit_of(unit: Unit, column: Column) -> bool:
    """Whether a field quantity can be delivered in this unit; columns without a unit take any."""
    return column.unit not in KINDS or unit.kind in KINDS[column.unit] or unit.text == "-"


def field_number(
    cell: Any, comma: bool, column: Column, unit: Unit | None, where: Place, findings: Findings
) -> float | None:
    """A field quantity in the unit of its column; None (with a finding, where there was one) when it can't be used."""
    reading = values.number(cell, comma)
    if reading.missing:
        return None
    shown = values.words(cell)
    if reading.problem:
        findings.add("survey.not_a_number", where, shown, column=column.name, problem=reading.problem)
        return None
    if reading.limit:
        findings.add("survey.limit_not_used", where, shown, column=column.name)
        return None
    _say_mark(reading, shown, column.name, where, findings)
    value, low, high = _house(reading.value, unit, column), column.minimum, column.maximum
    if (low is not None and value < low) or (high is not None and value > high):
        allowed = f"{low:g} to {high:g}" if high is not None else f"at least {low:g}"
        findings.add("survey.out_of_range", where, shown, column=column.name, allowed=allowed, unit=column.unit)
        return None
    return value


def _say_mark(reading: Reading, shown: str, column: str, where: Place, findings: Findings) -> None:
    if reading.mark:
        findings.add("survey.decimal_mark", where, shown, column=column, mark=reading.mark)


def _house(value: float, unit: Unit | None, column: Column) -> float:
    """A field value in the unit of its column."""
    if unit is None or unit.kind in ("none", "angle", "percent", "turbidity"):
        return value
    if column.unit == "°C":
        return celsius(value, unit)
    return value * unit.factor * (100.0 if column.unit == "cm" else 1.0)


def weighed(key: str, unit: Unit | None, basis: str) -> str:
    """What is taken as weighed where neither header nor unit says so and laboratories differ; '' where it's clear."""
    if key not in _WEIGHED_OTHERWISE or unit is None or unit.kind != "mass" or unit.basis or basis:
        return ""
    item = constituents()[key]
    return "CaCO3" if key == "alkalinity" else item.weighed or item.formula.split("^")[0]


def add_amount(
    record: Record, key: str, cell: Any, unit: Unit | None, basis: str, where: Place, comma: bool, findings: Findings
) -> None:
    """Put one reported concentration into a record: as delivered, and in mol/L with its limit where it can be used."""
    item, reading = constituents()[key], values.number(cell, comma)
    if reading.missing:
        return
    shown, amount = values.words(cell), None
    problem = reading.problem or ("a concentration can't be negative" if reading.value < 0 else "")
    if problem:
        findings.add("survey.not_a_number", where, shown, column=key, problem=problem)
    elif unit is not None:
        amount = _in_water(reading.value, unit, key, basis, where, shown, findings)
    record.reported[key] = (f"{key}_{slug(unit, basis, item)}", shown, "not used" if amount is None else reading.limit)
    record.places[key] = record.places[amount_column(key)] = where
    if amount is None:
        return
    record.amounts[key] = (amount, reading.limit)
    _say_mark(reading, shown, key, where, findings)
    if reading.flag and not reading.limit:
        findings.add("survey.flagged", where, shown, column=key, flag=reading.flag)


def _in_water(
    value: float, unit: Unit, key: str, basis: str, where: Place, shown: str, findings: Findings
) -> float | None:
    """mol/L (alkalinity eq/L), None with a finding where the unit or the number is impossible."""
    item = constituents()[key]
    try:
        amount = to_mol_L(value, unit, item, basis)
    except ValueError as error:
        findings.add("survey.unit_impossible", where, shown, column=key, problem=str(error))
        return None
    if amount > item.max_mol_L:
        findings.add("survey.too_high", where, shown, column=key, unit=unit.text, most=f"{item.max_mol_L:g}")
        return None
    return amount
