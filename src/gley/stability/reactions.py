"""The balanced reaction on the line between two species, and the straight line it gives on the E-pH plane."""

from collections.abc import Mapping
from dataclasses import dataclass
from math import gcd, lcm

import numpy as np

from gley.stability.data import Species
from gley.stability.water import coefficients

_NOTHING = 1e-9


@dataclass(frozen=True)
class Reaction:
    """`left` and its protons, electrons, water and ligands in equilibrium with `right`; counts on the left side.

    The line at the stated totals is ``electrons · pe = constant − protons · pH``.
    """

    left: Species
    right: Species
    text: str
    protons: float
    electrons: float
    constant: float

    @property
    def kind(self) -> str:
        """vertical, horizontal or sloped."""
        if abs(self.electrons) < _NOTHING:
            return "vertical"
        return "horizontal" if abs(self.protons) < _NOTHING else "sloped"

    @property
    def slope(self) -> float | None:
        """d pe/d pH of the line; None on a vertical one."""
        return None if self.kind == "vertical" else -self.protons / self.electrons

    @property
    def pe_at_pH0(self) -> float | None:
        """Where the straight line meets pH 0; None on a vertical one."""
        return None if self.kind == "vertical" else self.constant / self.electrons

    @property
    def pH(self) -> float | None:
        """Where a vertical line stands; None on others, and where no proton takes part."""
        vertical = self.kind == "vertical" and abs(self.protons) > _NOTHING
        return self.constant / self.protons if vertical else None


def between(
    a: Species, b: Species, forms: Mapping[str, Species], log_total: float, log_ligands: Mapping[str, float],
    X0: np.ndarray,
) -> Reaction:  # fmt: skip
    """The reaction of `a` to `b`, turned so that electrons (or, without them, the acid) stand on the left.

    Parameters
    ----------
    a, b : Species
        Two forms of the same element.
    forms : mapping of channel to Species
        The form in which each ligand element is on the line.
    log_total : float
        log10 of the element's total in mol/L.
    log_ligands : mapping of channel to float
        log10 of each ligand's total in mol/L; a solid ligand form (sulfur) counts as pure.
    X0 : ndarray (1, 7)
        Features at pH 0 and the chart's temperature and ionic strength.
    """
    n_a, n_b = (lcm(a.nu, b.nu) // item.nu for item in (a, b))
    ligands = {c: n_b * b.others.get(c, 0) - n_a * a.others.get(c, 0) for c in {**a.others, **b.others}}
    scale = _whole(ligands, forms)
    n_a, n_b = n_a * scale, n_b * scale
    used: dict[str, tuple[Species, float]] = {}
    for channel, count in ligands.items():
        if count:
            form = forms[channel]
            before = used.get(form.name, (form, 0.0))[1]
            used[form.name] = (form, before + count * scale / form.nu)
    sums = [
        n_b * getattr(b, word) - n_a * getattr(a, word) - sum(n * getattr(form, word) for form, n in used.values())
        for word in ("h", "e", "n_O")
    ]
    constant = n_b * _kappa(b, X0) - n_a * _kappa(a, X0) - sum(n * _kappa(form, X0) for form, n in used.values())
    constant += n_a * _log_m(a, log_total) - n_b * _log_m(b, log_total)
    for channel, count in ligands.items():
        if count and forms[channel].dissolved:
            constant += count * scale * (log_ligands[channel] - np.log10(forms[channel].nu)) / forms[channel].nu
    protons, electrons, water = sums
    turned = electrons < -_NOTHING or (abs(electrons) < _NOTHING and protons > _NOTHING)
    if turned:
        a, b, n_a, n_b, protons, electrons, water, constant = b, a, n_b, n_a, -protons, -electrons, -water, -constant
        used = {name: (form, -n) for name, (form, n) in used.items()}
    text = _write(a, n_a, b, n_b, protons, electrons, water, list(used.values()))
    return Reaction(a, b, text, protons + 0.0, electrons + 0.0, float(constant))


def _whole(ligands: Mapping[str, int], forms: Mapping[str, Species]) -> int:
    """Factor that makes all counts whole when a ligand form holds several atoms of its element."""
    scale = 1
    for channel, count in ligands.items():
        if count:
            nu = forms[channel].nu
            scale = lcm(scale, nu // gcd(nu, abs(count)))
    return scale


def _kappa(item: Species, X0: np.ndarray) -> float:
    """log m at pH 0, pe 0 and unit element activities."""
    return float((X0 @ coefficients([item]))[0, 0])


def _log_m(item: Species, log_total: float) -> float:
    return log_total - np.log10(item.nu) if item.dissolved else 0.0


def shown(item: Species) -> str:
    """Formula as it stands in a reaction: solids and uncharged dissolved forms carry their phase."""
    if not item.dissolved:
        return f"{item.formula}(s)"
    return item.formula if item.charge else f"{item.formula}(aq)"


def _write(a, n_a, b, n_b, protons, electrons, water, ligands) -> str:
    left, right = [(n_a, shown(a))], [(n_b, shown(b))]
    for form, n in ligands:
        if abs(n) > _NOTHING:
            (left if n > 0 else right).append((abs(n), shown(form)))
    for n, name in ((protons, "H^+"), (electrons, "e^-"), (water, "H2O")):
        if abs(n) > _NOTHING:
            (left if n > 0 else right).append((abs(n), name))
    sides = [" + ".join(name if n == 1 else f"{n:g} {name}" for n, name in side) for side in (left, right)]
    return " = ".join(sides)
