"""Probability of a field, given the model: quasi-random points over Eh, pH, total and the solids' log K.

Ligands are solved again where a point can change their state. Systematic choices (which solids form, sulfur tied or
not, an offset that all readings of a day share) are no noise and are not drawn here: see the scenarios.
"""

from dataclasses import dataclass, replace

import numpy as np

from gley.settings import StabilitySettings
from gley.stability.draws import Points, Spread
from gley.stability.solve import Bath, Choice, fields, locate
from gley.stability.sweep import offsets, shares, sweep
from gley.stability.systems import System

_CHUNK = 512
"""Samples whose points are held at a time: keeps the tables of samples × points in the processor's cache."""


@dataclass(frozen=True)
class Odds:
    """Probabilities (n, S) of the members as fields."""

    share: np.ndarray

    def of(self, member: np.ndarray) -> np.ndarray:
        """Probability of one member per sample (NaN where −1)."""
        value = self.share[np.arange(len(member)), member]
        return np.where(member >= 0, value, np.nan)

    def second(self, first: np.ndarray) -> np.ndarray:
        """The most probable member other than `first` (−1 where none has any probability)."""
        rest = self.share.copy()
        rest[np.arange(len(first)), first] = -1.0
        best = rest.argmax(axis=1)
        return np.where(rest.max(axis=1) > 0, best, -1)


def probabilities(
    target: System, bath: Bath, pe: np.ndarray, log_total: np.ndarray, field: np.ndarray, spread: Spread,
    choice: Choice, stated: StabilitySettings,
) -> Odds:  # fmt: skip
    """Probability of each member as the field of each sample; `field` (n,) is the one at the measured values.

    Solids' log K are drawn for the element's own solids. A sample none of whose gaps can close anywhere in the box that
    holds all points has its field for certain. Where gaps can close but no ligand changes its state, cubics in pH
    through five looks serve all points; elsewhere each point is solved anew.
    """
    points = Points.of(target, stated.draws)
    share = np.zeros((len(pe), len(target.members)))
    moved = [bath.at_pH(bath.X[:, 3] + offset * spread.pH) for offset in offsets(points)]
    found = [item.environments(target, choice, every=True, rates=True) for item in moved]
    where = locate(bath.environments(target, choice, every=True), pe)
    anew = []
    for e in np.unique(where):
        rows = np.flatnonzero(where == e)
        looks = [(item.X[rows], states[e].take(rows)) for item, states in zip(moved, found, strict=True)]
        own = spread.take(rows)
        swept = sweep(target, looks, pe[rows], log_total[rows], field[rows], own, points)
        clear = ~swept.rivals_close.any(axis=1) & ~swept.fence_closes
        share[rows[clear], field[rows[clear]]] = 1.0
        anew.append(rows[swept.fence_closes])
        open_ = np.flatnonzero(~clear & ~swept.fence_closes)
        for start in range(0, len(open_), _CHUNK):
            some = open_[start : start + _CHUNK]
            at = rows[some]
            share[at] = shares(swept, some, pe[at], field[at], spread.take(at), points)
    rows = np.concatenate(anew)
    if len(rows):
        share[rows] = _solved_anew(
            target, bath.take(rows), pe[rows], log_total[rows], spread.take(rows), choice, points
        )
    return Odds(share)


def _solved_anew(target: System, bath: Bath, pe, log_total, spread: Spread, choice: Choice, points: Points):
    """Share of the points (n, S) at which each member is the field, ligands solved again at every point."""
    n = len(pe)
    counts = np.zeros((n, len(target.members)))
    for z_pe, z_pH, z_total, log_K in zip(points.pe, points.pH, points.log_total, points.log_K, strict=True):
        moved = bath.at_pH(bath.X[:, 3] + z_pH * spread.pH)
        matrix = target.matrix.copy()
        matrix[0] += log_K
        shifted = replace(target, matrix=matrix)
        field = fields(shifted, moved, pe + z_pe * spread.pe, log_total + z_total * spread.log_total, choice)
        counts[np.arange(n), field] += 1
    return counts / len(points.pe)
