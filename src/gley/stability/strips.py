"""The plane cut into pH strips in which everything is straight, and each candidate's convex piece in each of them.

Pool sums bend with pH only. Between nodes chosen so that no line strays by more than 0.005 log unit from its chord, and
placed exactly where the largest form of a pool changes, every candidate is a plane over (pH, pe): half-plane clipping
then gives its field exactly.
"""

from collections.abc import Callable
from dataclasses import dataclass, field, replace

import numpy as np

from gley.stability.environment import Environment
from gley.stability.solve import Bath, Choice
from gley.stability.systems import System
from gley.stability.water import pool, pool_terms

STRAIGHT_TO = 0.005
"""Largest distance of a line from its chord within a strip, log10 units (0.3 mV at one electron)."""

_SCAN = 0.01


@dataclass(frozen=True)
class Piece:
    """One candidate's convex piece in one strip and environment: `points` (n, 2) of pH and pe, closed implicitly;
    `labels` say what bounds each edge from point k to k + 1: ("rival", j), ("fence", k), ("left",), ("right",) or
    ("window",).
    """

    strip: int
    environment: int
    candidate: int
    member: int
    points: np.ndarray
    labels: tuple[tuple, ...]


@dataclass(frozen=True)
class Plane:
    """A system at one condition, evaluated at any pH: `bath_at` makes the waters, `nodes` are the strip limits."""

    target: System
    choice: Choice
    bath_at: Callable[[np.ndarray], Bath]
    log_total: float
    states: tuple[str, ...] = ()
    nodes: np.ndarray = field(default_factory=lambda: np.array([]))

    def environments(self, pH: np.ndarray) -> list[Environment]:
        """Ligand environments at each pH, the same list whatever the pH."""
        found = self.bath_at(pH).environments(self.target, self.choice, every=True)
        return [item for item in found if not self.states or item.state in self.states]

    def lines(self, pH: np.ndarray, environment: Environment):
        """Candidates' lines at each pH in an environment evaluated at the same pH."""
        return self.target.lines(self.bath_at(pH).X, np.full(len(pH), self.log_total), environment)


def cut(plane: Plane, window: tuple[float, float, float, float]) -> Plane:
    """The plane with its strip limits found; `window` is (pH_min, pH_max, pe_min, pe_max)."""
    pH_min, pH_max, pe_min, pe_max = window
    grid = np.linspace(pH_min, pH_max, int((pH_max - pH_min) / _SCAN) + 2)
    # environments that no part of the window is in would only cost time
    present = [
        item
        for item in plane.environments(grid)
        if ((item.lo < item.hi) & (item.lo < pe_max) & (item.hi > pe_min)).any()
    ]
    plane = replace(plane, states=tuple(item.state for item in present))
    exact = np.unique(np.concatenate([[pH_min, pH_max], _form_changes(plane, pH_min, pH_max)]))
    exact = exact[np.concatenate([[True], np.diff(exact) > 1e-9])]
    exact[-1] = pH_max
    nodes = _refine(lambda pH: _bending(plane, pH), exact)
    return replace(plane, nodes=np.unique(np.concatenate([nodes, _vertical_lines(plane, nodes)])))


def _vertical_lines(plane: Plane, nodes: np.ndarray) -> np.ndarray:
    """pH of the crossings of candidates with the same slope: where both bend alike a chord would misplace them."""
    found = []
    for e, environment in enumerate(plane.environments(nodes)):
        lines = plane.lines(nodes, environment)
        i, j = np.nonzero(np.triu(lines.beta[:, None] == lines.beta[None, :], 1))
        with np.errstate(invalid="ignore"):  # candidates that can't be are at infinity, their difference is none
            gap = lines.alpha[:, i] - lines.alpha[:, j]
            k, pair = np.nonzero(gap[:-1] * gap[1:] < 0)
        lo, hi, sign = nodes[k], nodes[k + 1], np.sign(gap[k, pair])
        for _ in range(48 if len(k) else 0):
            middle = 0.5 * (lo + hi)
            alpha = plane.lines(middle, plane.environments(middle)[e]).alpha
            each = np.arange(len(k))
            same = np.sign(alpha[each, i[pair]] - alpha[each, j[pair]]) == sign
            lo, hi = np.where(same, middle, lo), np.where(same, hi, middle)
        found.append(hi)
    return np.concatenate(found) if found else np.array([])


def _bending(plane: Plane, pH: np.ndarray) -> np.ndarray:
    """All quantities that must be straight within a strip, (n, quantities)."""
    parts = []
    for environment in plane.environments(pH):
        parts.append(plane.lines(pH, environment).alpha)
        parts += [level[:, None] for level, _ in environment.fences]
    return np.hstack(parts)


def _refine(evaluate: Callable[[np.ndarray], np.ndarray], nodes: np.ndarray) -> np.ndarray:
    """Halve every interval whose middle strays from the chord, until none does."""
    for _ in range(12):
        middle = 0.5 * (nodes[1:] + nodes[:-1])
        at_nodes, at_middle = evaluate(nodes), evaluate(middle)
        with np.errstate(invalid="ignore"):
            stray = np.abs(at_middle - 0.5 * (at_nodes[1:] + at_nodes[:-1]))
        bad = np.nan_to_num(stray, nan=0.0, posinf=0.0).max(axis=1) > STRAIGHT_TO
        if not bad.any():
            break
        nodes = np.sort(np.concatenate([nodes, middle[bad]]))
    return nodes


def _form_changes(plane: Plane, pH_min: float, pH_max: float) -> np.ndarray:
    """pH at which the largest form of any pool changes: of the element in each environment, and of each ligand."""

    def ranks(pH: np.ndarray) -> np.ndarray:
        X = plane.bath_at(pH).X
        columns = [pool_terms(channel, X).argmax(axis=1) for channel in _ligand_channels(plane)]
        for environment in plane.environments(pH):
            q, _ = plane.target.terms(X, environment)
            columns += [q[:, members].argmax(axis=1) for members in plane.target.candidates if len(members) > 1]
        return np.column_stack(columns) if columns else np.zeros((len(pH), 1), int)

    grid = np.linspace(pH_min, pH_max, int((pH_max - pH_min) / _SCAN) + 2)
    before = ranks(grid)
    k, c = np.nonzero(before[1:] != before[:-1])
    lo, hi, own, each = grid[k], grid[k + 1], before[k, c], np.arange(len(k))
    for _ in range(48 if len(k) else 0):
        middle = 0.5 * (lo + hi)
        same = ranks(middle)[each, c] == own
        lo, hi = np.where(same, middle, lo), np.where(same, hi, middle)
    return hi


def _ligand_channels(plane: Plane) -> list[str]:
    return [channel for channel in plane.target.channels if "(" in channel and len(pool(channel)) > 1]


def pieces(plane: Plane, pe_min: float, pe_max: float) -> list[Piece]:
    """Every candidate's piece in every strip and environment, within the pe range of the window."""
    nodes = plane.nodes
    found_at = plane.environments(nodes)
    middle = 0.5 * (nodes[1:] + nodes[:-1])
    found_mid = plane.environments(middle)
    made: list[Piece] = []
    for e, environment in enumerate(found_at):
        lines = plane.lines(nodes, environment)
        inside = plane.lines(middle, found_mid[e])
        named = np.column_stack([inside.forms(np.full(len(middle), j)) for j in range(len(lines.beta))])
        for s in range(len(nodes) - 1):
            cell = _rectangle(nodes[s], nodes[s + 1], pe_min, pe_max)
            for k, (level, slope) in enumerate(environment.fences):
                cell = _clip(cell, nodes[s : s + 2], level[s : s + 2], slope, ("fence", k))
            if cell is None:
                continue
            for j, points, labels in _candidates(cell, nodes[s : s + 2], lines.alpha[s : s + 2], lines.beta):
                made.append(Piece(s, e, j, int(named[s, j]), points, labels))
    return made


def _rectangle(x0: float, x1: float, y0: float, y1: float) -> tuple[np.ndarray, list]:
    corners = np.array([[x0, y0], [x1, y0], [x1, y1], [x0, y1]])
    return corners, [("window",), ("right",), ("window",), ("left",)]


def _candidates(cell, ends: np.ndarray, alpha: np.ndarray, beta: np.ndarray):
    """Candidates' pieces within a cell: alpha (2, J) at the strip's ends."""
    usable = np.flatnonzero(np.isfinite(alpha).all(axis=0))
    for j in usable:
        part = cell
        for i in usable:
            if i == j:
                continue
            level, slope = alpha[:, j] - alpha[:, i], beta[j] - beta[i]
            if slope == 0 and (level == 0).all():  # a tie: the one that comes first in the table wins
                if i < j:
                    part = None
                    break
                continue
            part = _clip(part, ends, level, slope, ("rival", int(i)))
            if part is None:
                break
        if part is not None:
            yield int(j), part[0], tuple(part[1])


def _clip(part, ends: np.ndarray, level: np.ndarray, slope: float, label: tuple):
    """A labelled convex polygon cut to level(pH) + slope · pe ≤ 0; None when nothing is left."""
    if part is None or not np.isfinite(level).all():
        return part
    points, labels = part
    run = (points[:, 0] - ends[0]) / (ends[1] - ends[0])
    value = level[0] + (level[1] - level[0]) * run + slope * points[:, 1]
    inside = value <= 0
    if inside.all():
        return part
    if not inside.any():
        return None
    kept, names = [], []
    n = len(points)
    for k in range(n):
        after = (k + 1) % n
        if inside[k]:
            kept.append(points[k])
            names.append(labels[k])
        if inside[k] != inside[after]:
            share = value[k] / (value[k] - value[after])
            kept.append(points[k] + share * (points[after] - points[k]))
            # leaving: the new edge runs along the cut; entering: the old edge goes on
            names.append(label if inside[k] else labels[k])
    kept_points = np.array(kept)
    x, y = kept_points.T
    area = 0.5 * abs(np.dot(x, np.roll(y, 1)) - np.dot(y, np.roll(x, 1)))
    return None if len(kept) < 3 or area < 1e-14 else (kept_points, names)
