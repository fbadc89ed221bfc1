"""Reactions for the tests, by means of their own: parse, count atoms and charge, log K and E° from formation energies.

Shares no code with the package; constants are typed again (SI 2019).
"""

import math
import re

R = 8.31446261815324  # J/(mol K)
F = 96485.3321233  # C/mol
LN10 = math.log(10.0)
T0 = 298.15  # K


def kelvin(temperature_C):
    return temperature_C + 273.15


def volt_per_decade(temperature_C):
    return R * kelvin(temperature_C) * LN10 / F


def composition(formula):
    """Atom counts and charge number of a formula such as `Fe6(OH)12CO3` or `HAsO4^2-`."""
    body, _, tail = formula.partition("^")
    charge = 0
    if tail:
        size, sign = tail[:-1], tail[-1]
        charge = (int(size) if size else 1) * {"+": 1, "-": -1}[sign]
    if body == "e":
        return {}, charge
    # brackets are multiplied out from the inside
    while "(" in body:
        found = re.search(r"\(([^()]*)\)(\d*)", body)
        body = body[: found.start()] + found.group(1) * int(found.group(2) or 1) + body[found.end() :]
    counts = {}
    for symbol, number in re.findall(r"([A-Z][a-z]?)(\d*)", body):
        counts[symbol] = counts.get(symbol, 0) + int(number or 1)
    assert "".join(a + b for a, b in re.findall(r"([A-Z][a-z]?)(\d*)", body)) == body, formula
    return counts, charge


def sides(text):
    """`a A + b B = c C` → list of (count, name), products positive, reactants negative."""
    left, right = text.split(" = ")
    found = []
    for side, sign in ((left, -1.0), (right, 1.0)):
        for term in side.split(" + "):
            number, _, rest = term.strip().partition(" ")
            try:
                found.append((sign * float(number), rest))
            except ValueError:
                found.append((sign, term.strip()))
    return found


def imbalance(terms, formula_of):
    """What isn't conserved by a reaction: {element or 'charge': surplus of the products}; empty = balanced."""
    total = {"charge": 0.0}
    for count, name in terms:
        atoms, charge = composition(formula_of(name))
        total["charge"] += count * charge
        for symbol, number in atoms.items():
            total[symbol] = total.get(symbol, 0.0) + count * number
    return {symbol: value for symbol, value in total.items() if abs(value) > 1e-9}


def log_K(terms, energy_kJ, temperature_C=25.0):
    """log10 K of a reaction from formation energies in kJ/mol at the temperature."""
    total = sum(count * energy_kJ(name) for count, name in terms)
    return -1000.0 * total / (R * kelvin(temperature_C) * LN10)


def standard_potential(terms, energy_kJ):
    """E° in V of a half reaction with its electrons on the left."""
    electrons = -sum(count for count, name in terms if name == "e^-")
    assert electrons > 0, "electrons belong on the left"
    return -1000.0 * sum(count * energy_kJ(name) for count, name in terms) / (electrons * F)
