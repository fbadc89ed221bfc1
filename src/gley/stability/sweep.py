"""The lines of samples in one ligand state across the spread of their pH: five looks, cubics between.

Eh, total and log K enter every line linearly, pH bends it. So a few looks along pH serve all points that are drawn.
"""

from dataclasses import dataclass
from itertools import pairwise

import numpy as np

from gley.stability.draws import Points, Spread
from gley.stability.environment import Environment
from gley.stability.stretch import Gaps, control_points, gaps
from gley.stability.systems import Lines, System

LOOKS = 5


@dataclass(frozen=True)
class Sweep:
    """n samples at `LOOKS` values of pH: lines at pe = 0 `alpha` (L, n, J) and members' `q` (L, n, S), each with its
    change per look; slopes `beta` (J,); whether gaps to rivals and forms `(n, K)` and to the state's fences may close.
    """

    target: System
    alpha: np.ndarray
    alpha_step: np.ndarray
    q: np.ndarray
    q_step: np.ndarray
    beta: np.ndarray
    rivals_close: np.ndarray
    fence_closes: np.ndarray


def offsets(points: Points) -> np.ndarray:
    """Where the looks stand, in standard deviations of pH: they span all points."""
    reach = np.abs(points.pH).max()
    return np.linspace(-reach, reach, LOOKS)


def sweep(
    target: System, looks: list[tuple[np.ndarray, Environment]], pe: np.ndarray, log_total: np.ndarray,
    field: np.ndarray, spread: Spread, points: Points,
) -> Sweep:  # fmt: skip
    """Look at samples in one ligand environment: `looks` are features (n, 7) and environment at each offset of pH."""
    seen: list[Gaps] = []
    parts: list[list[np.ndarray]] = [[], [], [], []]
    at = offsets(points)
    step = spread.pH * float(at[1] - at[0])
    for X, environment in looks:
        lines = target.lines(X, log_total, environment)
        forms_per_pH, lines_per_pH = lines.per_pH(environment)
        told = (lines.alpha, lines_per_pH * step[:, None], lines.q, forms_per_pH * step[:, None])
        for part, values in zip(parts, told, strict=True):
            part.append(values)
        seen.append(gaps(lines, environment, pe, field, (forms_per_pH, lines_per_pH)))
    least = np.full(seen[0].value.shape, np.inf)
    for here, there in pairwise(seen):
        for control in control_points(here, there, step):
            least = np.minimum(least, control)
    closes = least < _room(lines, looks[0][1], field, spread, points, seen[0].value.shape[1])
    fences = len(looks[0][1].fences)
    own = closes.shape[1] - fences
    alpha, alpha_step, q, q_step = (np.array(part) for part in parts)
    fence_closes = np.any(closes[:, own:], axis=1)
    return Sweep(
        target, alpha, alpha_step, q, q_step, lines.beta, closes[:, :own], fence_closes
    )  # fmt: skip


def _room(lines: Lines, environment, field, spread: Spread, points: Points, count: int) -> np.ndarray:
    """How far Eh, total and log K can close each gap (n, count) anywhere in the box that holds all points."""
    target = lines.system
    own = target.candidate_of[field]
    first = np.array([members[0] for members in target.candidates])
    log_K = np.abs(points.log_K).max(axis=0)[first] / target.nu[first]
    room = np.zeros((len(field), count))
    by_pe = np.abs(points.pe).max() * spread.pe[:, None]
    by_total = np.abs(points.log_total).max() * spread.log_total[:, None]
    J = len(first)
    room[:, :J] = by_pe * np.abs(lines.beta[None, :] - lines.beta[own][:, None]) + log_K[None, :] + log_K[own][:, None]
    room[:, :J] += by_total * np.abs(target.per_total[None, :] - target.per_total[own][:, None])
    for k, (_, slope) in enumerate(environment.fences):
        room[:, count - len(environment.fences) + k] = by_pe[:, 0] * abs(slope)
    return room


def shares(swept: Sweep, rows: np.ndarray, pe: np.ndarray, field: np.ndarray, spread: Spread, points: Points):
    """Share of the points (m, S) at which each member names the field, for some rows; pe, field, spread are theirs."""
    target = swept.target
    weights = _weights(points)
    own = target.candidate_of[field]
    J = len(target.candidates)
    contend = swept.rivals_close[rows][:, :J].copy()
    contend[np.arange(len(rows)), own] = True
    shape = (len(rows), len(points.pe))
    best, winner = np.full(shape, np.inf), np.full(shape, -1, np.int16)
    for j in np.flatnonzero(contend.any(axis=0)):
        some = np.flatnonzero(contend[:, j])
        first = target.candidates[j][0]
        level = _along(swept.alpha[:, rows[some], j], swept.alpha_step[:, rows[some], j], weights)
        level += swept.beta[j] * (pe[some][:, None] + np.outer(spread.pe[some], points.pe))
        if target.per_total[j]:
            level += target.per_total[j] * np.outer(spread.log_total[some], points.log_total)
        if target.solid[j]:
            level -= points.log_K[:, first] / target.nu[first]
        lower = level < best[some]
        best[some] = np.where(lower, level, best[some])
        winner[some] = np.where(lower, j, winner[some])
    return _counted(swept, rows, winner, weights) / shape[1]


def _counted(swept: Sweep, rows: np.ndarray, winner: np.ndarray, weights: np.ndarray) -> np.ndarray:
    """Number of points (m, S) at which each member names the winning candidate (m, D)."""
    target = swept.target
    found = np.zeros((len(rows), len(target.members)))
    for j, members in enumerate(target.candidates):
        won = winner == j
        some = np.flatnonzero(won.any(axis=1))
        if not len(some):
            continue
        named = members[swept.q[:, rows[some]][:, :, members].argmax(axis=2)]
        same = (named == named[0]).all(axis=0)
        found[some[same], named[0, same]] += won[some[same]].sum(axis=1)
        mixed = some[~same]
        if len(mixed):
            forms = [_along(swept.q[:, rows[mixed], i], swept.q_step[:, rows[mixed], i], weights) for i in members]
            largest = np.array(forms).argmax(axis=0)
            for k, i in enumerate(members):
                found[mixed, i] += (won[mixed] & (largest == k)).sum(axis=1)
    return found


def _weights(points: Points) -> np.ndarray:
    """Hermite's weights (D, 2 L) of values and steps at the looks for each point's pH."""
    at = offsets(points)
    k = np.clip(np.searchsorted(at, points.pH, side="right") - 1, 0, LOOKS - 2)
    s = (points.pH - at[k]) / (at[1] - at[0])
    weights = np.zeros((len(s), 2 * LOOKS))
    row = np.arange(len(s))
    weights[row, k], weights[row, k + 1] = (1 + 2 * s) * (1 - s) ** 2, s * s * (3 - 2 * s)
    weights[row, LOOKS + k], weights[row, LOOKS + k + 1] = s * (1 - s) ** 2, s * s * (s - 1)
    return weights


def _along(values: np.ndarray, steps: np.ndarray, weights: np.ndarray) -> np.ndarray:
    """Cubic through values and steps (L, m) at each point's pH (m, D); −inf where a form can't be."""
    known = np.isfinite(values).all(axis=0)
    nodes = np.where(known, np.vstack([values, steps]), 0.0)
    found = nodes.T @ weights.T
    found[~known] = values[0, ~known][:, None]
    return found
