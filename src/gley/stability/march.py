"""How far a sample is from the next field along pH, at constant Eh.

From the sample outwards both ways, half a pH unit at a time: where a gap closes on the way the border is probed just
before and just behind; the nearer of the two borders is the margin.
"""

from dataclasses import dataclass

import numpy as np

from gley.stability.solve import Bath, Choice, fields, locate
from gley.stability.stretch import Gaps, first_closing, gaps
from gley.stability.systems import System

_STEP = 0.5
_PROBE = 0.0005
"""A border lies between two places this far before and behind it."""

_MOST_STEPS = 200  # 14 / 0.5 both ways, and what thin fields and changes of ligand state add


@dataclass(frozen=True)
class _Waters:
    """The samples, each with its own field."""

    target: System
    bath: Bath
    pe: np.ndarray
    log_total: np.ndarray
    field: np.ndarray
    choice: Choice

    def named(self, row: np.ndarray, pH: np.ndarray) -> np.ndarray:
        """Fields of some rows at other pH."""
        bath = self.bath.take(row).at_pH(pH)
        return fields(self.target, bath, self.pe[row], self.log_total[row], self.choice)

    def look(self, row: np.ndarray, pH: np.ndarray, state: np.ndarray | None = None) -> tuple[Gaps, np.ndarray]:
        """Gaps of some rows at other pH, in the ligand state (index) given or else in the one that holds there."""
        bath, pe = self.bath.take(row).at_pH(pH), self.pe[row]
        found = bath.environments(self.target, self.choice, every=True, rates=True)
        state = locate(found, pe) if state is None else state
        seen = []
        for e in range(len(found)):
            some = np.flatnonzero(state == e)
            if len(some):
                environment = found[e].take(some)
                lines = self.target.lines(bath.X[some], self.log_total[row[some]], environment)
                told = gaps(lines, environment, pe[some], self.field[row[some]], lines.per_pH(environment))
                seen.append((some, told))
        if len(seen) == 1:
            return seen[0][1], state
        value, per_pH = np.empty((2, len(row), seen[0][1].value.shape[1] if seen else 0))
        for some, told in seen:
            value[some], per_pH[some] = told.value, told.per_pH
        return Gaps(value, per_pH), state


@dataclass
class _Walkers:
    """Who still walks: the sample's row, the way (+1, −1), where it stands and in which ligand state, what it saw from
    there, how far it looks, whether it is known that another field lies at the end of that look, and whether it has
    arrived.
    """

    row: np.ndarray
    way: np.ndarray
    position: np.ndarray
    state: np.ndarray
    value: np.ndarray
    per_pH: np.ndarray
    step: np.ndarray
    other_ahead: np.ndarray
    arrived: np.ndarray

    @classmethod
    def of(cls, here: _Waters) -> "_Walkers":
        """Two for each sample, one each way."""
        n = len(here.pe)
        both = np.tile(np.arange(n), 2)
        seen, state = here.look(np.arange(n), here.bath.X[:, 3])
        return cls(
            both, np.repeat([1.0, -1.0], n), here.bath.X[both, 3], state[both], seen.value[both], seen.per_pH[both],
            np.full(2 * n, _STEP), *np.zeros((2, 2 * n), bool),
        )  # fmt: skip

    def take(self, keep: np.ndarray) -> "_Walkers":
        return _Walkers(*(values[keep] for values in vars(self).values()))

    def stand(self, some: np.ndarray, position: np.ndarray, seen: Gaps, state: np.ndarray) -> None:
        """Some go on to another place and see what is seen from there."""
        self.position[some], self.state[some] = position, state
        self.value[some], self.per_pH[some] = seen.value, seen.per_pH


def along_pH(
    target: System, bath: Bath, pe: np.ndarray, log_total: np.ndarray, field: np.ndarray, choice: Choice
) -> tuple[np.ndarray, np.ndarray]:
    """Signed change of pH at constant Eh to the nearest other field in pH 0-14 (NaN = none) and its member."""
    here, start = _Waters(target, bath, pe, log_total, field, choice), bath.X[:, 3]
    nearest, beyond = np.full(len(pe), np.nan), np.full(len(pe), -1)
    walkers = _Walkers.of(here)
    for _ in range(_MOST_STEPS):
        if not len(walkers.row):
            break
        limit = np.where(walkers.way > 0, 14.0, 0.0)
        far = walkers.position + walkers.way * np.minimum(walkers.step, np.abs(limit - walkers.position))
        ahead, _ = here.look(walkers.row, far, walkers.state)
        part = first_closing(Gaps(walkers.value, walkers.per_pH), ahead, far - walkers.position)
        part = np.where(np.isinf(part) & walkers.other_ahead, 0.5, part)
        border = walkers.position + np.where(np.isinf(part), 0.0, part) * (far - walkers.position)
        met, free = np.flatnonzero(np.isfinite(part)), np.flatnonzero(np.isinf(part))
        walkers.stand(free, far[free], Gaps(ahead.value[free], ahead.per_pH[free]), walkers.state[free])
        if len(met):
            _probe(here, walkers, met, border[met], nearest, beyond)
        reach = np.abs(np.where(np.isnan(nearest), np.inf, nearest))[walkers.row]
        gone = np.abs(walkers.position - start[walkers.row])
        walkers = walkers.take((gone < reach) & (walkers.position != limit) & ~walkers.arrived)
    return nearest, beyond


def _probe(here: _Waters, walkers: _Walkers, met: np.ndarray, border: np.ndarray, nearest, beyond) -> None:
    """Look just before and behind a border: found, or the own field goes on, or it ends earlier."""
    at, start = walkers.take(met), here.bath.X[:, 3]
    before = border - at.way * np.minimum(_PROBE, np.abs(border - at.position))
    behind = np.clip(border + at.way * _PROBE, 0.0, 14.0)
    own = here.field[at.row]
    name_before, name_behind = here.named(at.row, before), here.named(at.row, behind)
    early = name_before != own
    found = ~early & (name_behind != own)
    close = early & (np.abs(before - at.position) <= 2 * _PROBE)
    for sure, place, name in ((found, border, name_behind), (close, before, name_before)):
        for way in (1.0, -1.0):  # one row at a time: both walkers of a sample may arrive at once
            some = np.flatnonzero(sure & (at.way == way))
            rows, distance = at.row[some], (place - start[at.row])[some]
            nearer = ~(np.abs(nearest[rows]) <= np.abs(distance))
            nearest[rows[nearer]], beyond[rows[nearer]] = distance[nearer], name[some][nearer]
    on = np.flatnonzero(~early & ~found)
    if len(on):
        walkers.stand(met[on], behind[on], *here.look(at.row[on], behind[on]))
    walkers.step[met] = np.where(early, np.abs(before - at.position), _STEP)
    walkers.other_ahead[met] = early & ~close
    walkers.arrived[met] = found | close
