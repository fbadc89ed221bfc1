"""The chart: stability fields of one element over the E-pH plane at one condition, exact polygons and their lines."""

from collections.abc import Mapping, Sequence
from difflib import get_close_matches

import numpy as np
import shapely

from gley.constants import nernst_slope_mV
from gley.errors import UsageError
from gley.stability.chart_types import Chart, Conditions, Field
from gley.stability.data import CHART_ONLY, COMPANION, FIXED, OFFERED, SETS, SULFUR, check_names
from gley.stability.edges import SNAP, Setting, boundaries
from gley.stability.solve import Bath, Choice
from gley.stability.strips import Piece, Plane, cut, pieces
from gley.stability.systems import System
from gley.stability.water import features, water_lines

WINDOW = (0.0, 14.0, -1.0, 1.5)
"""The whole plane: pH 0-14, −1.0 … +1.5 V."""

SMALLEST = 1e-6
"""Parts, holes and lines below this share of the window are rounding, not chemistry."""

LIGANDS = {
    **{short: channel for channel, (short, _) in FIXED.items()},
    **{name: name for name in ("S", *SULFUR, COMPANION)},
}
"""What `ligands` may name: `S` is tied by Eh, `S(VI)` and `S(-II)` stand side by side as measured."""

TEMPERATURES_C = (0.0, 100.0)


def chart(
    element: str, total_mol_L: float, temperature_C: float = 25.0, *, ionic_strength_M: float = 0.010,
    ligands: Mapping[str, float] | None = None, solids: str = "fresh", with_names: Sequence[str] = (),
    without_names: Sequence[str] = (), window: tuple[float, float, float, float] = WINDOW,
) -> Chart:  # fmt: skip
    """Stability fields of an element on the E-pH plane.

    Parameters
    ----------
    element : str
        Symbol: one whose samples are assigned, or N or C.
    total_mol_L : float
        Dissolved total [mol/L].
    temperature_C, ionic_strength_M : float
        Conditions [°C, mol/L].
    ligands : mapping of str to float, optional
        Totals [mol/L] of `C`, `S` (tied by Eh) or `S(VI)` and `S(-II)` (as measured), `Cl`, `P`, `Si`, `F`, `Ca`, `Mg`,
        `K`, `Fe`; absent = none.
    solids : str
        Solid set `fresh`, `aged` or `none`.
    with_names, without_names : sequence of str
        Species added or left out by name.
    window : tuple
        (pH_min, pH_max, E_min_V, E_max_V).

    Raises
    ------
    UsageError
        Naming the value that can't be used and what is allowed.
    """
    ligands = {name: float(total) for name, total in (ligands or {}).items() if total}
    _check(element, total_mol_L, temperature_C, ionic_strength_M, ligands, solids, window)
    check_names(with_names, without_names)
    choice = Choice(solids, tuple(with_names), tuple(without_names))
    volt = nernst_slope_mV(temperature_C) / 1000.0
    inside = (window[0], window[1], window[2] / volt, window[3] / volt)
    target = choice.system(element)
    unknown = [item.name for item in target.members if item.only_at_25]
    if unknown and abs(temperature_C - 25.0) > 2.0:
        message = (
            f"{', '.join(unknown)}: nothing tells how it changes with temperature, {temperature_C:g} °C is too far."
        )
        raise UsageError(message, "Draw the chart at 23 to 27 °C, or leave it out.")
    bath_at = _bath(ligands, temperature_C, ionic_strength_M)
    plane = cut(Plane(target, choice, bath_at, float(np.log10(total_mol_L))), inside)
    made = pieces(plane, *inside[2:])
    area = (window[1] - window[0]) * (window[3] - window[2])
    fields = _fields(made, target, volt, SMALLEST * area)
    kept = {item.name for item in fields}
    made = [item for item in made if target.members[item.member].name in kept]
    setting = Setting(plane, temperature_C, ionic_strength_M, _log_ligands(ligands))
    stated = Conditions(
        float(temperature_C), float(ionic_strength_M), float(total_mol_L), ligands, solids, tuple(with_names),
        tuple(without_names), "tied" if "S" in ligands or not {"S(VI)", "S(-II)"} & ligands.keys() else "measured",
    )  # fmt: skip
    lines = boundaries(made, setting, SMALLEST * (window[1] - window[0]))
    water = _water(temperature_C, window)
    return Chart(element, stated, window, fields, lines, water)


def chart_at(element: str, conditions: Conditions, window: tuple[float, float, float, float] = WINDOW) -> Chart:
    """The chart at conditions as another chart or a sample holds them."""
    return chart(
        element, conditions.total_mol_L, conditions.temperature_C, ionic_strength_M=conditions.ionic_strength_M,
        ligands=conditions.ligands_mol_L, solids=conditions.solids, with_names=conditions.with_names,
        without_names=conditions.without_names, window=window,
    )  # fmt: skip


def _check(element, total, temperature, strength, ligands, solids, window) -> None:
    """Refuse what can't be computed, all faults at once."""
    known = (*OFFERED, *CHART_ONLY)
    if element not in known:
        near = get_close_matches(element, known, 1, 0.3)
        message = f"There is no chart of '{element}'." + (f" Did you mean {near[0]}?" if near else "")
        raise UsageError(message, f"Choose from {', '.join(known)}.")
    low, high = TEMPERATURES_C
    pH_low, pH_high, E_low, E_high = window
    rules = (
        (0 < total <= 10, f"total {total:g} mol/L: above 0 and up to 10 mol/L is wanted"),
        (low <= temperature <= high, f"temperature {temperature:g} °C: {low:g} to {high:g} °C is wanted"),
        (0 <= strength <= 1, f"ionic strength {strength:g} mol/L: 0 to 1 mol/L is wanted"),
        (solids in SETS, f"solid set '{solids}': one of {', '.join(SETS)} is wanted"),
        (0 <= pH_low < pH_high <= 14, f"pH {pH_low:g} to {pH_high:g}: rising and within 0 to 14 is wanted"),
        (-2.5 <= E_low < E_high <= 2.5, f"E {E_low:g} to {E_high:g} V: rising and within ±2.5 V is wanted"),
    )
    problems = [words for holds, words in rules if not holds] + _ligand_faults(element, ligands)
    if problems:
        message = "; ".join(problems) + "."
        raise UsageError(message, "`gley chart --help` shows what is allowed.")


def _ligand_faults(element: str, ligands: Mapping[str, float]) -> list[str]:
    problems = [f"ligand '{name}': one of {', '.join(LIGANDS)} is wanted" for name in ligands if name not in LIGANDS]
    problems += [
        f"ligand {name} = {total:g} mol/L: above 0 and up to 10 mol/L is wanted"
        for name, total in ligands.items()
        if not 0 < total <= 10
    ]
    measured = SULFUR.keys() & ligands.keys()
    if "S" in ligands and measured:
        problems.append("ligand S is tied by Eh, S(VI) and S(-II) stand as measured: one or the other is wanted")
    if element in ligands or (element == "S" and measured):
        problems.append(f"ligand {element}: it is the chart's own element, whose amount is the total")
    return problems


def _bath(ligands: Mapping[str, float], temperature_C: float, ionic_strength_M: float):
    """Waters of the chart's composition at any pH."""
    tied = not SULFUR.keys() & ligands.keys()

    def at(pH: np.ndarray) -> Bath:
        X = features(pH, temperature_C, ionic_strength_M)
        totals = {LIGANDS[name]: np.full(len(pH), total) for name, total in ligands.items() if name != COMPANION}
        companions = {COMPANION: np.full(len(pH), ligands[COMPANION])} if COMPANION in ligands else {}
        return Bath(X, totals, companions, tied)

    return at


def _log_ligands(ligands: Mapping[str, float]) -> dict[str, float]:
    found = {LIGANDS[name]: float(np.log10(total)) for name, total in ligands.items()}
    if "S" in found:
        found |= {"S(VI)": found["S"], "S(-II)": found["S"]}
    return found


def _fields(made: list[Piece], target: System, volt: float, smallest: float) -> tuple[Field, ...]:
    """Pieces of one name joined to polygons in pH and V, rounding crumbs dropped."""
    by_name: dict[int, list[shapely.Polygon]] = {}
    for piece in made:
        by_name.setdefault(piece.member, []).append(shapely.polygons(piece.points * [1.0, volt]))
    found = []
    for member, parts in by_name.items():
        joined = shapely.union_all(parts, grid_size=SNAP)
        polygons = [_rings(part, smallest) for part in shapely.get_parts(joined) if part.area > smallest]
        if polygons:
            item = target.members[member]
            state = f"{item.element}({item.oxidation_state})"
            found.append(Field(item.name, item.formula, item.kind, state, tuple(polygons)))
    return tuple(found)


def _rings(polygon: shapely.Polygon, smallest: float) -> tuple[np.ndarray, ...]:
    """Outer ring first, holes after, without collinear points."""
    whole = shapely.simplify(polygon, SNAP * 10)
    holes = [hole for hole in whole.interiors if shapely.polygons(hole).area > smallest]
    return tuple(shapely.get_coordinates(ring) for ring in (whole.exterior, *holes))


def _water(temperature_C: float, window: tuple[float, float, float, float]) -> dict[str, np.ndarray]:
    ends = np.array(window[:2], float)
    return {name: np.column_stack([ends, line]) for name, line in water_lines(temperature_C, ends).items()}
