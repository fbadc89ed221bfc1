"""How far a sample is from the next field along pH, at constant Eh.

The lines bend with pH, but no faster than their forms allow: each line's change per pH lies between the least and the
greatest proton number of the forms it sums, ligands included. So a step is taken within which no rival can overtake
unseen; where a step ends in another field the border is bisected.
"""

from dataclasses import dataclass

import numpy as np

from gley.stability.data import COMPANION, SULFUR
from gley.stability.environment import Environment
from gley.stability.solve import Bath, Choice, fields, locate
from gley.stability.systems import Lines, System
from gley.stability.water import pool

_SHORTEST, _LONGEST = 0.01, 2.0
_HALVINGS = 12  # of at most the longest step: to 0.0005
_PAST = 1e-5  # where bounds are exact a step would end on the border itself, where rounding decides
_FENCE_RATE = 2.5  # sulfur's lines close at no more than 10 protons per 8 electrons, with room to spare


@dataclass(frozen=True)
class Rates:
    """Bounds on change per pH: of log m of each member (S,), and of each candidate's line (J,)."""

    low: np.ndarray
    high: np.ndarray
    line_low: np.ndarray
    line_high: np.ndarray


def along_pH(
    target: System, bath: Bath, pe: np.ndarray, log_total: np.ndarray, field: np.ndarray, choice: Choice
) -> tuple[np.ndarray, np.ndarray]:
    """Signed change of pH at constant Eh to the nearest other field in pH 0-14 (NaN = none) and its member."""
    up, above = _march(target, bath, pe, log_total, field, choice, +1, np.full(len(pe), np.inf))
    # beyond the nearer one nothing is asked
    down, below = _march(target, bath, pe, log_total, field, choice, -1, up)
    rising = up <= down
    reached = np.isfinite(np.minimum(up, down))
    distance = np.where(rising, up, -down)
    return np.where(reached, distance, np.nan), np.where(reached, np.where(rising, above, below), -1)


def _march(target, bath, pe, log_total, field, choice, direction, reach) -> tuple[np.ndarray, np.ndarray]:
    """Distance in pH to the first other field in one direction (inf = none to pH 0 or 14, or within `reach`), and
    that field's member.
    """
    start = bath.X[:, 3]
    distance, beyond = np.full(len(pe), np.inf), np.full(len(pe), -1)
    position, going = start.copy(), np.arange(len(pe))
    far, over = np.full(len(pe), np.nan), np.full(len(pe), -1)
    limit = 14.0 if direction > 0 else 0.0
    _, step = _look(target, bath, pe, log_total, choice, direction)
    while len(going):
        ahead = position[going] + direction * step
        ahead = np.minimum(ahead, limit) if direction > 0 else np.maximum(ahead, limit)
        there = bath.take(going).at_pH(ahead)
        named, step = _look(target, there, pe[going], log_total[going], choice, direction)
        changed = named != field[going]
        far[going[changed]], over[going[changed]] = ahead[changed], named[changed]
        position[going[~changed]] = ahead[~changed]
        goes = ~changed & (ahead != limit) & (np.abs(ahead - start[going]) < reach[going])
        going, step = going[goes], step[goes]
    rows = np.flatnonzero(~np.isnan(far))
    if len(rows):
        ends = (position[rows], far[rows], over[rows])
        root, beyond[rows] = _bisect(target, bath, pe, log_total, field, choice, rows, ends)
        distance[rows] = np.abs(root - start[rows])
    return distance, beyond


def _bisect(target, bath, pe, log_total, field, choice, rows, ends) -> tuple[np.ndarray, np.ndarray]:
    """pH where the field changes, and the field beyond; `ends` are a pH in the own field, one in another, its field."""
    near, far, member = ends
    part = bath.take(rows)
    for _ in range(_HALVINGS):  # always as many, so that the answer doesn't hang on a sample's neighbours
        middle = 0.5 * (near + far)
        named = fields(target, part.at_pH(middle), pe[rows], log_total[rows], choice)
        same = named == field[rows]
        near, far = np.where(same, middle, near), np.where(same, far, middle)
        member = np.where(same, member, named)
    return 0.5 * (near + far), member


def _look(target, bath, pe, log_total, choice, direction) -> tuple[np.ndarray, np.ndarray]:
    """The field at each sample's place, and a step within which no rival and no rival form can overtake."""
    found = bath.environments(target, choice)
    where = locate(found, pe)
    named, step = np.full(len(pe), -1), np.full(len(pe), np.inf)
    for e in np.unique(where):
        rows = np.flatnonzero(where == e)
        here = found[e].take(rows)
        lines = target.lines(bath.X[rows], log_total[rows], here)
        level = lines.at(pe[rows])
        winner = level.argmin(axis=1)
        named[rows] = lines.forms(winner)
        rates = _rates(target, here, choice)
        room = np.minimum(_rival_room(level, winner, rates, direction), _form_room(lines, winner, rates, direction))
        ends = np.minimum(pe[rows] - here.lo, here.hi - pe[rows])
        step[rows] = np.minimum(room, np.maximum(ends, 0.0) / _FENCE_RATE)
    return named, np.clip(step + _PAST, _SHORTEST, _LONGEST)


def _rival_room(level: np.ndarray, winner: np.ndarray, rates: Rates, direction: int) -> np.ndarray:
    """Step within which no candidate falls below the winner."""
    index = np.arange(len(winner))
    gap = level - level[index, winner][:, None]
    if direction > 0:
        closing = rates.line_high[winner][:, None] - rates.line_low[None, :]
    else:
        closing = rates.line_high[None, :] - rates.line_low[winner][:, None]
    with np.errstate(divide="ignore", invalid="ignore"):
        room = np.where(closing > 0, gap / closing, np.inf)
    room[index, winner] = np.inf
    return np.where(np.isnan(room), np.inf, room).min(axis=1)


def _form_room(lines: Lines, winner: np.ndarray, rates: Rates, direction: int) -> np.ndarray:
    """Step within which the largest form of the winning pool stays the largest."""
    room = np.full(len(winner), np.inf)
    named = lines.forms(winner)
    for j in np.unique(winner):
        members = lines.system.candidates[j]
        if len(members) < 2:
            continue
        rows = np.flatnonzero(winner == j)
        q, own = lines.q[np.ix_(rows, members)], lines.q[rows, named[rows]]
        if direction > 0:
            closing = rates.high[members][None, :] - rates.low[named[rows]][:, None]
        else:
            closing = rates.high[named[rows]][:, None] - rates.low[members][None, :]
        with np.errstate(invalid="ignore", divide="ignore"):
            steps = np.where(closing > 0, (own[:, None] - q) / closing, np.inf)
        steps[q == own[:, None]] = np.inf
        room[rows] = np.where(np.isnan(steps), np.inf, steps).min(axis=1)
    return room


def _rates(target: System, here: Environment, choice: Choice) -> Rates:
    """Bounds on change per pH in one ligand environment."""
    low = -np.array([float(item.h) for item in target.members])
    high = low.copy()
    for c, channel in enumerate(target.channels):
        least, most = _ligand_rate(channel, here, choice)
        low += target.counts[:, c] * least
        high += target.counts[:, c] * most
    line_low, line_high = np.empty(len(target.candidates)), np.empty(len(target.candidates))
    for j, members in enumerate(target.candidates):
        nu = target.nu[members[0]]
        line_low[j], line_high[j] = -high[members].max() / nu, -low[members].min() / nu
    return Rates(low, high, line_low, line_high)


def _ligand_rate(channel: str, here: Environment, choice: Choice) -> tuple[float, float]:
    """Least and greatest change per pH of a ligand element's log activity: the proton numbers of its forms."""
    state = here.state.partition(COMPANION)[0].strip()
    if channel == COMPANION:
        # all of iron's candidates: one may give way to another within the step, its activity goes on without a jump
        iron = _rates(choice.system(COMPANION), here, choice)
        return float(iron.line_low.min()), float(iron.line_high.max())
    if channel in SULFUR and state:
        channel = state
    if channel == "S(0)":
        return 0.0, 0.0
    protons = [float(item.h) for item in pool(channel)]
    return min(protons), max(protons)
