"""How far a sample is from the next field along pH, at constant Eh.

From the sample outwards both ways, half a pH unit at a time: where a gap closes on the way the border is probed just
before and just behind; the nearer of the two borders is the margin.
"""

from dataclasses import dataclass

import numpy as np

from gley.stability.environment import Environment
from gley.stability.solve import Bath, Choice, fields, locate
from gley.stability.stretch import Gaps, first_closing, gaps
from gley.stability.systems import System

_STEP = 0.5
_PROBE = 0.0005
"""A border lies between two places this far before and behind it."""

_MOST_STEPS = 200  # 14 / 0.5 both ways, and what thin fields and changes of ligand state add


@dataclass
class _Walkers:
    """Who still walks: the sample's row, the way (+1, −1), where it stands, how far it looks, whether it is known that
    another field lies at the end of that look, and whether it has arrived.
    """

    row: np.ndarray
    way: np.ndarray
    position: np.ndarray
    step: np.ndarray
    other_ahead: np.ndarray
    arrived: np.ndarray

    def take(self, keep: np.ndarray) -> "_Walkers":
        return _Walkers(*(values[keep] for values in vars(self).values()))


def along_pH(
    target: System, bath: Bath, pe: np.ndarray, log_total: np.ndarray, field: np.ndarray, choice: Choice
) -> tuple[np.ndarray, np.ndarray]:
    """Signed change of pH at constant Eh to the nearest other field in pH 0-14 (NaN = none) and its member."""
    n, start = len(pe), bath.X[:, 3]
    nearest, beyond = np.full(n, np.nan), np.full(n, -1)

    def named(walkers: _Walkers, pH: np.ndarray) -> np.ndarray:
        return fields(target, bath.take(walkers.row).at_pH(pH), pe[walkers.row], log_total[walkers.row], choice)

    both = np.tile(np.arange(n), 2)
    walkers = _Walkers(both, np.repeat([1.0, -1.0], n), start[both], np.full(2 * n, _STEP), *np.zeros((2, 2 * n), bool))
    for _ in range(_MOST_STEPS):
        if not len(walkers.row):
            break
        limit = np.where(walkers.way > 0, 14.0, 0.0)
        far = walkers.position + walkers.way * np.minimum(walkers.step, np.abs(limit - walkers.position))
        part = _closing(target, bath, pe, log_total, field, choice, walkers, far)
        part = np.where(np.isinf(part) & walkers.other_ahead, 0.5, part)
        met = np.flatnonzero(np.isfinite(part))
        border = walkers.position + part * (far - walkers.position)
        walkers.position = np.where(np.isfinite(part), walkers.position, far)
        if len(met):
            _probe(walkers, met, border[met], named, field, start, nearest, beyond)
        reach = np.abs(np.where(np.isnan(nearest), np.inf, nearest))[walkers.row]
        gone = np.abs(walkers.position - start[walkers.row])
        walkers = walkers.take((gone < reach) & (walkers.position != limit) & ~walkers.arrived)
    return nearest, beyond


def _closing(target, bath, pe, log_total, field, choice, walkers: _Walkers, far: np.ndarray) -> np.ndarray:
    """Part of each walker's look after which a gap closes (inf = none)."""
    row = walkers.row
    own = bath.take(row)
    here, there = own.at_pH(walkers.position), own.at_pH(far)
    found_here = here.environments(target, choice, every=True, rates=True)
    found_there = there.environments(target, choice, every=True, rates=True)
    where = locate(found_here, pe[row])
    part = np.full(len(row), np.inf)
    for e in np.unique(where):
        some = np.flatnonzero(where == e)
        near, ahead = (
            _gaps(target, look.X[some], found.take(some), log_total[row[some]], pe[row[some]], field[row[some]])
            for look, found in ((here, found_here[e]), (there, found_there[e]))
        )
        part[some] = first_closing(near, ahead, far[some] - walkers.position[some])
    return part


def _gaps(target: System, X, environment: Environment, log_total, pe, field) -> Gaps:
    lines = target.lines(X, log_total, environment)
    return gaps(lines, environment, pe, field, lines.per_pH(environment))


def _probe(walkers, met, border, named, field, start, nearest, beyond) -> None:
    """Look just before and behind a border: found, or the own field goes on, or it ends earlier."""
    at = walkers.take(met)
    before = border - at.way * np.minimum(_PROBE, np.abs(border - at.position))
    behind = np.clip(border + at.way * _PROBE, 0.0, 14.0)
    own = field[at.row]
    name_before, name_behind = named(at, before), named(at, behind)
    early = name_before != own
    found = ~early & (name_behind != own)
    close = early & (np.abs(before - at.position) <= 2 * _PROBE)
    for sure, place, name in ((found, border, name_behind), (close, before, name_before)):
        for way in (1.0, -1.0):  # one row at a time: both walkers of a sample may arrive at once
            some = np.flatnonzero(sure & (at.way == way))
            rows, distance = at.row[some], (place - start[at.row])[some]
            nearer = ~(np.abs(nearest[rows]) <= np.abs(distance))
            nearest[rows[nearer]], beyond[rows[nearer]] = distance[nearer], name[some][nearer]
    goes_on = ~early & ~found
    walkers.position[met[goes_on]] = behind[goes_on]
    walkers.step[met] = np.where(early, np.abs(before - at.position), _STEP)
    walkers.other_ahead[met] = early & ~close
    walkers.arrived[met] = found | close
