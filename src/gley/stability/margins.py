"""How far a sample is from the next field, along E and along pH.

Along E everything is straight within one ligand state, so the margin is exact: walk both ways to the nearer of the
first crossing with any rival and the next change of a ligand's state; there go on with the forms that hold beyond it.
Along pH the lines bend; steps are kept short enough that no rival can overtake unseen, then the root is bisected.
"""

import numpy as np

from gley.constants import T0_K, ZERO_C_K, nernst_slope_mV
from gley.stability.solve import Bath, Choice, fields, locate
from gley.stability.systems import System
from gley.stability.water import FEATURES

E_REACH_mV = 2000.0
PH_RESOLUTION = 0.0005
_SHORTEST_STEP = 0.01


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
    limit = 14.0 if direction > 0 else 0.0
    rate = _closing_rate(target, bath, choice)
    while len(going):
        step = _safe_step(target, bath.take(going).at_pH(position[going]), pe[going], log_total[going], choice, rate)
        ahead = position[going] + direction * step
        ahead = np.minimum(ahead, limit) if direction > 0 else np.maximum(ahead, limit)
        named = fields(target, bath.take(going).at_pH(ahead), pe[going], log_total[going], choice)
        changed = named != field[going]
        rows = going[changed]
        if len(rows):
            root, member = _bisect(target, bath, pe, log_total, field, choice, rows, position[rows], ahead[changed])
            distance[rows], beyond[rows] = np.abs(root - start[rows]), member
        position[going] = ahead
        going = going[~changed & (ahead != limit) & (np.abs(ahead - start[going]) < reach[going])]
    return distance, beyond


def _bisect(target, bath, pe, log_total, field, choice, rows, near, far) -> tuple[np.ndarray, np.ndarray]:
    """pH between `near` (own field) and `far` (another) where the field changes, and the field beyond."""
    near, far = near.copy(), far.copy()
    part = bath.take(rows)
    member = fields(target, part.at_pH(far), pe[rows], log_total[rows], choice)
    while np.abs(far - near).max() > PH_RESOLUTION:
        middle = 0.5 * (near + far)
        named = fields(target, part.at_pH(middle), pe[rows], log_total[rows], choice)
        same = named == field[rows]
        near, far = np.where(same, middle, near), np.where(same, far, middle)
        member = np.where(same, member, named)
    return 0.5 * (near + far), member


def _closing_rate(target: System, bath: Bath, choice: Choice) -> np.ndarray:
    """Upper bound (S,) on |d log m/dpH| of each member: protons plus those of the ligands it holds."""
    protons = np.abs(np.array([float(item.h) for item in target.members]))
    # a ligand element's activity moves with at most this many protons per atom: CO2 … CO3^2-, HSO4^- … HS^-, Fe^3+ …
    steepest = {"C(IV)": 6.0, "S(VI)": 8.0, "S(-II)": 2.0, "Cl(-I)": 0.0, "P(V)": 8.0, "Si(IV)": 8.0, "Fe": 12.0}
    per_channel = np.array([steepest[channel] for channel in target.channels])
    return protons + target.counts @ per_channel if len(per_channel) else protons


def _safe_step(target, bath, pe, log_total, choice, rate) -> np.ndarray:
    """A step in pH within which no rival candidate and no rival form can overtake, at least the shortest step."""
    found = bath.environments(target, choice)
    where = locate(found, pe)
    step = np.full(len(pe), np.inf)
    candidate_rate = np.array([rate[members].max() / target.nu[members[0]] for members in target.candidates])
    for e in np.unique(where):
        rows = np.flatnonzero(where == e)
        here = found[e].take(rows)
        lines = target.lines(bath.X[rows], log_total[rows], here)
        level = lines.at(pe[rows])
        winner = level.argmin(axis=1)
        index = np.arange(len(rows))
        gap = level - level[index, winner][:, None]
        closing = candidate_rate[None, :] + candidate_rate[winner][:, None]
        with np.errstate(divide="ignore", invalid="ignore"):
            room = np.where(closing > 0, gap / closing, np.inf)
        room[index, winner] = np.inf
        room = np.where(np.isnan(room), np.inf, room).min(axis=1)
        room = np.minimum(room, _form_room(lines, winner, rate))
        # distance to the next ligand state; sulfur's lines close at no more than 10 protons per 8 electrons or so
        ends = np.minimum(pe[rows] - here.lo, here.hi - pe[rows])
        step[rows] = np.minimum(room, np.maximum(ends, 0.0) / 2.5)
    return np.clip(step, _SHORTEST_STEP, 1.0)


def _form_room(lines, winner: np.ndarray, rate: np.ndarray) -> np.ndarray:
    """Step in pH within which the largest form of the winning pool stays the largest."""
    room = np.full(len(winner), np.inf)
    named = lines.forms(winner)
    for j in np.unique(winner):
        members = lines.system.candidates[j]
        if len(members) < 2:
            continue
        rows = np.flatnonzero(winner == j)
        q = lines.q[np.ix_(rows, members)]
        own = lines.q[rows, named[rows]]
        closing = rate[members][None, :] + rate[named[rows]][:, None]
        with np.errstate(invalid="ignore", divide="ignore"):
            steps = np.where(closing > 0, (own[:, None] - q) / closing, np.inf)
        steps[q == own[:, None]] = np.inf
        room[rows] = np.where(np.isnan(steps), np.inf, steps).min(axis=1)
    return room
