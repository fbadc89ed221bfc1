"""What a chart is: fields, boundaries and the conditions they hold for; plain data, no drawing."""

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Any

import numpy as np


@dataclass(frozen=True)
class Conditions:
    """What a chart was computed for. Totals in mol/L by element; ligands by element, absent = not in the water."""

    temperature_C: float
    ionic_strength_M: float
    total_mol_L: float
    ligands_mol_L: Mapping[str, float] = field(default_factory=dict)
    solids: str = "fresh"
    with_names: tuple[str, ...] = ()
    without_names: tuple[str, ...] = ()
    sulfur: str = "tied"

    def as_dict(self) -> dict[str, Any]:
        """Plain values for JSON."""
        return {
            "temperature_C": self.temperature_C, "ionic_strength_M": self.ionic_strength_M,
            "total_mol_L": self.total_mol_L, "ligands_mol_L": dict(self.ligands_mol_L), "solids": self.solids,
            "with": list(self.with_names), "without": list(self.without_names), "sulfur": self.sulfur,
        }  # fmt: skip


@dataclass(frozen=True)
class Field:
    """One stability field. `polygons` is a tuple of polygons, each a tuple of rings, outer first, holes after;
    a ring is an array (n, 2) of pH and E in V on the hydrogen scale, closed (first point repeated last).
    """

    name: str
    formula: str
    kind: str
    oxidation_state: str
    polygons: tuple[tuple[np.ndarray, ...], ...]

    def as_dict(self) -> dict[str, Any]:
        """Plain values for JSON."""
        return {
            "name": self.name, "formula": self.formula, "kind": self.kind, "oxidation_state": self.oxidation_state,
            "polygons": [[ring.tolist() for ring in polygon] for polygon in self.polygons],
        }  # fmt: skip


@dataclass(frozen=True)
class Boundary:
    """One line between two fields, with the reaction that balances on it.

    `protons` and `electrons` are counts on the left side of the reaction (electrons ≥ 0, protons negative when
    released). `kind` is vertical (no electron), horizontal (no proton) or sloped. `slope_mV_per_pH` and
    `E_mV_at_pH0` describe the straight line where the named forms prevail; None on a vertical line, whose `pH` stands.
    `points` is an array (n, 2) of pH and E in V along the line as drawn.
    """

    between: tuple[str, str]
    ligand_forms: str
    reaction: str
    protons: float
    electrons: float
    kind: str
    slope_mV_per_pH: float | None
    E_mV_at_pH0: float | None
    pH: float | None
    points: np.ndarray

    def as_dict(self) -> dict[str, Any]:
        """Plain values for JSON."""
        return {
            "between": list(self.between), "ligand_forms": self.ligand_forms, "reaction": self.reaction,
            "protons": self.protons, "electrons": self.electrons, "kind": self.kind,
            "slope_mV_per_pH": self.slope_mV_per_pH, "E_mV_at_pH0": self.E_mV_at_pH0, "pH": self.pH,
            "points": self.points.tolist(),
        }  # fmt: skip


@dataclass(frozen=True)
class Chart:
    """Stability fields of one element on the E-pH plane.

    `window` is (pH_min, pH_max, E_min_V, E_max_V); `water` holds the two limits of water's stability as arrays (n, 2)
    of pH and E in V under the names `O2/H2O` and `H2O/H2` (1 bar of gas).
    """

    element: str
    conditions: Conditions
    window: tuple[float, float, float, float]
    fields: tuple[Field, ...]
    boundaries: tuple[Boundary, ...]
    water: Mapping[str, np.ndarray]

    def as_dict(self) -> dict[str, Any]:
        """Plain values for JSON: all that is needed to draw the chart again."""
        return {
            "element": self.element, "conditions": self.conditions.as_dict(), "window": list(self.window),
            "fields": [item.as_dict() for item in self.fields],
            "boundaries": [item.as_dict() for item in self.boundaries],
            "water": {name: line.tolist() for name, line in self.water.items()},
        }  # fmt: skip

    @classmethod
    def from_dict(cls, data: Mapping[str, Any]) -> "Chart":
        """A chart from what `as_dict` gave."""
        words = dict(data["conditions"])
        conditions = Conditions(with_names=tuple(words.pop("with")), without_names=tuple(words.pop("without")), **words)
        fields = tuple(
            Field(**{**item, "polygons": tuple(tuple(np.array(ring) for ring in rings) for rings in item["polygons"])})
            for item in data["fields"]
        )
        boundaries = tuple(
            Boundary(**{**item, "between": tuple(item["between"]), "points": np.array(item["points"])})
            for item in data["boundaries"]
        )
        water = {name: np.array(line) for name, line in data["water"].items()}
        return cls(data["element"], conditions, tuple(data["window"]), fields, boundaries, water)
