"""How far a sample is from the next field along E.

Everything is straight within one ligand state, so the margin is exact: walk both ways to the nearer of the first
crossing with any rival and the next change of a ligand's state; there go on with the forms that hold beyond it.
"""

import numpy as np

from gley.constants import T0_K, ZERO_C_K, nernst_slope_mV
from gley.stability.solve import Bath, Choice, locate
from gley.stability.systems import System
from gley.stability.water import FEATURES

E_REACH_mV = 2000.0


def along_pe(
    target: System, bath: Bath, pe: np.ndarray, log_total: np.ndarray, field: np.ndarray, choice: Choice
) -> tuple[np.ndarray, np.ndarray]:
    """Signed change of pe to the nearest other field (+ = pe must rise; NaN beyond reach), its member (−1 = none)."""
    up, above = _walk(target, bath, pe, log_total, field, choice, +1)
    down, below = _walk(target, bath, pe, log_total, field, choice, -1)
    rising = up <= down
    distance = np.where(rising, up, -down)
    reached = np.minimum(up, down) <= _reach(bath.X)
    return np.where(reached, distance, np.nan), np.where(reached, np.where(rising, above, below), -1)


def _reach(X: np.ndarray) -> np.ndarray:
    """2 V in units of pe at the temperature of each sample."""
    T = 1.0 / (1.0 / T0_K - X[:, FEATURES.index("1/T0 − 1/T")])
    return E_REACH_mV / nernst_slope_mV(T - ZERO_C_K)


def _walk(target, bath, pe, log_total, field, choice, direction) -> tuple[np.ndarray, np.ndarray]:
    """Distance in pe to the first other field in one direction (inf = none) and that field's member."""
    found = bath.environments(target, choice)
    distance, beyond = np.full(len(pe), np.inf), np.full(len(pe), -1)
    position = pe.astype(float).copy()
    going, reach = np.arange(len(pe)), _reach(bath.X)
    for step in range(len(found) + 1):
        if not len(going):
            break
        # just beyond a ligand boundary, so that the environment on its far side is found
        probe = position[going] + (1e-9 * direction if step else 0.0)
        where = locate([item.take(going) for item in found], probe)
        still = []
        for e in np.unique(where):
            rows = going[where == e]
            here = found[e].take(rows)
            lines = target.lines(bath.X[rows], log_total[rows], here)
            level = lines.at(position[rows] + (1e-9 * direction if step else 0.0))
            winner = level.argmin(axis=1)
            named = lines.forms(winner)
            changed = named != field[rows]
            distance[rows[changed]] = np.abs(position[rows] - pe[rows])[changed]
            beyond[rows[changed]] = named[changed]
            rows, here_pick = rows[~changed], ~changed
            end = (here.hi if direction > 0 else here.lo)[here_pick]
            alpha = lines.alpha[here_pick]
            crossing, rival = _first_crossing(alpha, lines.beta, winner[here_pick], position[rows], direction)
            stops = np.isfinite(crossing) & (crossing * direction <= end * direction)
            distance[rows[stops]] = np.abs(crossing - pe[rows])[stops]
            beyond[rows[stops]] = _forms(lines, here_pick, rival)[stops]
            goes = ~stops & np.isfinite(end) & (np.abs(end - pe[rows]) <= reach[rows])
            position[rows[goes]] = end[goes]
            still.append(rows[goes])
        going = np.concatenate(still) if still else np.array([], int)
    return distance, beyond


def _forms(lines, pick: np.ndarray, rival: np.ndarray) -> np.ndarray:
    """Names of the rivals' fields for the picked rows."""
    full = np.zeros(len(pick), int)
    full[pick] = rival
    return lines.forms(full)[pick]


def _first_crossing(alpha, beta, winner, position, direction) -> tuple[np.ndarray, np.ndarray]:
    """pe at which the first rival overtakes the winner from `position` on, and which rival (±inf = none)."""
    rows = np.arange(len(winner))
    own_alpha, own_beta = alpha[rows, winner], beta[winner]
    gap = alpha + beta * position[:, None] - (own_alpha + own_beta * position)[:, None]
    closing = -(beta[None, :] - own_beta[:, None]) * direction
    with np.errstate(divide="ignore", invalid="ignore"):
        steps = np.where(closing > 0, np.maximum(gap, 0.0) / closing, np.inf)
    steps[rows, winner] = np.inf
    steps = np.where(np.isnan(steps), np.inf, steps)
    rival = steps.argmin(axis=1)
    return position + direction * steps[rows, rival], rival
