"""Which candidate wins at each sample's pe, with what beside it: the kernel shared by fields, margins and certainty."""

from collections.abc import Mapping
from dataclasses import dataclass, replace

import numpy as np

from gley.stability.data import COMPANION
from gley.stability.environment import Environment, PoolLine, environments, with_companion
from gley.stability.systems import Lines, System, log_sum, system


@dataclass(frozen=True)
class Choice:
    """What competes: solid set and names added or left out (all elements alike)."""

    solids: str = "fresh"
    with_names: tuple[str, ...] = ()
    without_names: tuple[str, ...] = ()

    def system(self, element: str) -> System:
        """The competition of an element."""
        return system(element, self.solids, self.with_names, self.without_names)

    @property
    def sulfur_solid(self) -> bool:
        """Whether elemental sulfur takes part when sulfur is tied by Eh."""
        return any(not item.dissolved for item in self.system("S").members)


@dataclass(frozen=True)
class Bath:
    """n samples that share one way of treating sulfur: features (n, 7), totals in mol/L of ligand channels
    (NaN = unknown) and of companion metals by symbol.
    """

    X: np.ndarray
    ligands: Mapping[str, np.ndarray]
    companions: Mapping[str, np.ndarray]
    tied: bool

    def take(self, rows: np.ndarray) -> "Bath":
        """The same for some of the samples."""
        return Bath(
            self.X[rows],
            {name: total[rows] for name, total in self.ligands.items()},
            {name: total[rows] for name, total in self.companions.items()},
            self.tied,
        )

    def at_pH(self, pH: np.ndarray) -> "Bath":
        """The same water at another pH; totals, temperature, ionic strength stay."""
        X = self.X.copy()
        X[:, 3] = pH
        return replace(self, X=X)

    def environments(
        self, target: System, choice: Choice, every: bool = False, rates: bool = False
    ) -> list[Environment]:
        """Ligand environments that a system's species need, companions (Fe before As) included; with `every` also
        those that no sample is in, so that the list is the same at any pH; with `rates` their changes per pH.
        """
        iron = choice.system(COMPANION) if COMPANION in target.channels else None
        needed = {*target.channels, *(iron.channels if iron else ())}
        found = environments(self.X, self.ligands, needed, self.tied, choice.sulfur_solid, rates)
        if iron is None or COMPANION not in self.companions:
            return found
        with np.errstate(divide="ignore", invalid="ignore"):
            log_total = np.log10(self.companions[COMPANION])
        known = np.isfinite(log_total)
        if not known.any() and not every:
            return found
        split = []
        for environment in found:
            lines = iron.lines(self.X, np.where(known, log_total, -np.inf), environment)
            per_pH = lines.per_pH(environment)[1] if rates else np.zeros_like(lines.alpha)
            own = [PoolLine(lines.alpha[:, j], float(lines.beta[j]), per_pH[:, j]) for j in range(len(lines.beta))]
            split += with_companion(environment, COMPANION, own, every)
        return split


@dataclass(frozen=True)
class Solved:
    """Per sample: index of its environment, the winning candidate, the member that names the field, and beside it the
    largest dissolved form with its share, and the solid with the highest SI (−1 = none).
    """

    environment: np.ndarray
    winner: np.ndarray
    field: np.ndarray
    form: np.ndarray
    share: np.ndarray
    SI: np.ndarray
    solid: np.ndarray


def locate(found: list[Environment], pe: np.ndarray) -> np.ndarray:
    """Index of the environment whose interval holds each pe (the nearest where rounding leaves a gap)."""
    off = np.array([np.maximum(np.maximum(item.lo - pe, pe - item.hi), 0.0) for item in found])
    empty = np.array([item.lo >= item.hi for item in found])
    return np.where(empty, np.inf, off).argmin(axis=0)


def solve(target: System, bath: Bath, pe: np.ndarray, log_total: np.ndarray, choice: Choice) -> Solved:
    """Fields of n samples: the lowest element activity wins, ties by order of the table.

    Parameters
    ----------
    target : System
        The element's competition.
    bath : Bath
        The waters.
    pe, log_total : ndarray (n,)
        Potential and log10 of the element's total in mol/L.
    choice : Choice
        What competes (for companions and sulfur).
    """
    found = bath.environments(target, choice)
    where = locate(found, pe)
    n = len(pe)
    winner, field, form, solid = (np.full(n, -1) for _ in range(4))
    share, SI = np.full(n, np.nan), np.full(n, np.nan)
    for e in np.unique(where):
        rows = np.flatnonzero(where == e)
        lines = target.lines(bath.X[rows], log_total[rows], found[e].take(rows))
        level = lines.at(pe[rows])
        winner[rows] = level.argmin(axis=1)
        field[rows] = lines.forms(winner[rows])
        form[rows], share[rows], SI[rows], solid[rows] = _beside(lines, level, pe[rows])
    return Solved(where, winner, field, form, share, SI, solid)


def fields(target: System, bath: Bath, pe: np.ndarray, log_total: np.ndarray, choice: Choice) -> np.ndarray:
    """Only the member that names the field of each sample (n,): `solve` without what stands beside."""
    found = bath.environments(target, choice)
    where = locate(found, pe)
    field = np.full(len(pe), -1)
    for e in np.unique(where):
        rows = np.flatnonzero(where == e)
        lines = target.lines(bath.X[rows], log_total[rows], found[e].take(rows))
        field[rows] = lines.forms(lines.at(pe[rows]).argmin(axis=1))
    return field


def _beside(lines: Lines, level: np.ndarray, pe: np.ndarray) -> tuple[np.ndarray, ...]:
    """Largest dissolved form, its share of all mononuclear dissolved forms, highest SI and its solid (−1 = none)."""
    target = lines.system
    liquid = np.flatnonzero(~target.solid)
    best = liquid[level[:, liquid].argmin(axis=1)]
    form = lines.forms(best)
    mononuclear = [i for i, item in enumerate(target.members) if item.dissolved and item.nu == 1]
    amount = lines.q[:, mononuclear] + lines.slopes[mononuclear] * pe[:, None]
    rows = np.arange(len(pe))
    own = lines.q[rows, form] + lines.slopes[form] * pe
    single = target.nu[form] == 1
    share = np.where(single, np.power(10.0, np.minimum(own - log_sum(amount), 0.0)), np.nan)
    solids = np.flatnonzero(target.solid)
    if not len(solids):
        return form, share, np.full(len(pe), np.nan), np.full(len(pe), -1)
    first = np.array([target.candidates[j][0] for j in solids])
    SI = target.nu[first] * (level[rows, best][:, None] - level[:, solids])
    SI = np.where(np.isfinite(SI), SI, -np.inf)
    top = SI.argmax(axis=1)
    value = SI[rows, top]
    known = np.isfinite(value)
    return form, share, np.where(known, value, np.nan), np.where(known, first[top], -1)
