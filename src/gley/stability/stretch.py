"""How far a sample's own field holds its rivals off, along a stretch of pH at constant Eh: cubics between two looks.

A look gives each gap (to a rival, to another form of the pool, to the edge of the ligand's state) and its change per
pH. Over half a pH unit a gap follows the cubic through both ends' values and slopes to 0.005 log unit, the tolerance
that charts have too; Bézier's control points bound the cubic, so most gaps are seen to stay open without any search.
"""

from dataclasses import dataclass

import numpy as np

from gley.stability.environment import Environment
from gley.stability.systems import Lines

_SAMPLES = np.linspace(0.0, 1.0, 17)
_HALVINGS = 14


@dataclass(frozen=True)
class Gaps:
    """Gaps `value` (n, K) in log units, positive inside the own field, and their change `per_pH` (n, K)."""

    value: np.ndarray
    per_pH: np.ndarray


def gaps(
    lines: Lines, environment: Environment, pe: np.ndarray, member: np.ndarray, per_pH: tuple[np.ndarray, np.ndarray]
) -> Gaps:
    """Gaps of n samples whose fields are named by `member` (n,), in one ligand environment, from their lines and what
    `Lines.per_pH` gave: first to every candidate, then to the forms of the own pool, last to the state's fences.
    """
    target = lines.system
    forms_per_pH, lines_per_pH = per_pH
    level, rows, own = lines.at(pe), np.arange(len(pe)), target.candidate_of[member]
    values = [level - level[rows, own][:, None]]
    rates = [lines_per_pH - lines_per_pH[rows, own][:, None]]
    values[0][rows, own] = np.inf
    some = target.sharing
    if len(some):
        with np.errstate(invalid="ignore"):
            room = lines.q[rows, member][:, None] - lines.q[:, some]
        values.append(np.where(target.kin[np.ix_(member, some)], room, np.inf))
        rates.append(forms_per_pH[rows, member][:, None] - forms_per_pH[:, some])
    for (fence, slope), fence_per_pH in zip(environment.fences, environment.fences_per_pH, strict=True):
        values.append(-(fence + slope * pe)[:, None])
        rates.append(-fence_per_pH[:, None])
    value = np.hstack(values)
    return Gaps(np.where(np.isnan(value), np.inf, value), np.nan_to_num(np.hstack(rates)))


def control_points(here: Gaps, there: Gaps, width: np.ndarray) -> tuple[np.ndarray, ...]:
    """Bézier's four control points, each (n, K), of each gap's cubic over a stretch of signed width (n,)."""
    third = width[:, None] / 3.0
    return here.value, here.value + third * here.per_pH, there.value - third * there.per_pH, there.value


def first_closing(here: Gaps, there: Gaps, width: np.ndarray) -> np.ndarray:
    """Part of the stretch (n,) after which the first gap closes, 0 to 1; inf where all stay open."""
    points = control_points(here, there, width)
    least = np.minimum(np.minimum(points[0], points[1]), np.minimum(points[2], points[3]))
    row, gap = np.nonzero(least < 0)
    found = np.full(len(width), np.inf)
    if not len(row):
        return found
    cubic = np.array([part[row, gap] for part in points])
    # a rival that comes to be only on the way (an infinite gap at one end) is looked for at the far end alone
    cubic = np.where(np.isfinite(cubic), cubic, np.where(np.isfinite(cubic[3]), cubic[3], 1.0))
    values = _at(cubic, _SAMPLES[:, None])
    below = values < 0
    closes = below.any(axis=0)
    k = below.argmax(axis=0)
    lo, hi = _SAMPLES[np.maximum(k - 1, 0)], _SAMPLES[k]
    for _ in range(_HALVINGS):
        middle = 0.5 * (lo + hi)
        open_ = _at(cubic, middle) >= 0
        lo, hi = np.where(open_, middle, lo), np.where(open_, hi, middle)
    np.minimum.at(found, row[closes], hi[closes])
    return found


def _at(cubic: np.ndarray, s: np.ndarray) -> np.ndarray:
    """Value of cubics (4, m) given by control points at the part s of the stretch."""
    r = 1.0 - s
    return cubic[0] * r**3 + 3 * cubic[1] * r * r * s + 3 * cubic[2] * r * s * s + cubic[3] * s**3
