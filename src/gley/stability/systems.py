"""One element's competition: its pools, polynuclear forms and solids as straight lines in pe.

At fixed pH, temperature, ionic strength and ligands the element activity at which a candidate reaches its limit is
``log a = α + β pe``: a pool at its total, a polynuclear form at total/ν, a solid at saturation. The lowest line wins.
"""

from collections.abc import Iterable
from dataclasses import dataclass
from functools import cached_property, lru_cache

import numpy as np

from gley.constants import T0_K
from gley.stability.data import Species, select
from gley.stability.environment import Environment
from gley.stability.water import FEATURES, coefficients, log_sum, mean_by_amount, product

_NEAR_25 = 2.01 / T0_K**2


def away_from_25(X: np.ndarray) -> np.ndarray:
    """Which samples (n,) are further than 2 °C from 25 °C, where a species without temperature data isn't used."""
    return np.abs(X[:, FEATURES.index("1/T0 − 1/T")]) > _NEAR_25


@dataclass(frozen=True)
class System:
    """Candidates of one element. `members` are its S species; a candidate is a set of member indices:
    a pool (all mononuclear forms of one oxidation state), one polynuclear form, or one solid.
    """

    element: str
    members: tuple[Species, ...]
    channels: tuple[str, ...]
    matrix: np.ndarray
    slopes: np.ndarray
    counts: np.ndarray
    nu: np.ndarray
    candidates: tuple[np.ndarray, ...]
    protons: np.ndarray
    solid: np.ndarray
    only_at_25: np.ndarray

    def terms(self, X: np.ndarray, environment: Environment) -> tuple[np.ndarray, np.ndarray]:
        """log m of each member at pe = 0 and unit element activity (n, S), −inf where it can't be, and d/dpe (S,)."""
        q = product(X, self.matrix)
        if self.only_at_25.any():
            q[np.ix_(away_from_25(X), self.only_at_25)] = -np.inf
        slopes = self.slopes.copy()
        for c, channel in enumerate(self.channels):
            uses = np.flatnonzero(self.counts[:, c])
            level = environment.alpha.get(channel)
            if level is None:
                q[:, uses] = -np.inf
                continue
            # an absent ligand is left out by a mask, never multiplied through: 0 · (−inf)
            absent = ~np.isfinite(level)
            q[:, uses] += self.counts[uses, c] * np.where(absent, 0.0, level)[:, None]
            if absent.any():
                q[np.ix_(absent, uses)] = -np.inf
            slopes[uses] += self.counts[uses, c] * environment.beta[channel]
            if channel in environment.left_out:
                q[:, [s for s in uses if self.members[s].dissolved]] = -np.inf
        return q, slopes

    def lines(self, X: np.ndarray, log_total: np.ndarray, environment: Environment) -> "Lines":
        """All candidates' lines for n samples in one environment."""
        q, slopes = self.terms(X, environment)
        alpha = np.empty((len(self.candidates), len(X))).T
        beta = np.empty(len(self.candidates))
        for j, members in enumerate(self.candidates):
            first = members[0]
            if self.solid[j]:
                alpha[:, j] = -q[:, first] / self.nu[first]
            elif self.nu[first] > 1:
                alpha[:, j] = (log_total - np.log10(self.nu[first]) - q[:, first]) / self.nu[first]
            else:
                alpha[:, j] = log_total - log_sum(columns(q, members))
            beta[j] = -slopes[_prevailing(members, q)] / self.nu[first]
        return Lines(self, q, slopes, alpha, beta, log_total)

    @cached_property
    def candidate_of(self) -> np.ndarray:
        """Index of the candidate that each member belongs to (S,)."""
        found = np.empty(len(self.members), int)
        for j, members in enumerate(self.candidates):
            found[members] = j
        return found

    @cached_property
    def per_total(self) -> np.ndarray:
        """Change of each candidate's line per log10 unit of the total (J,): 1 for a pool, 1/ν, 0 for a solid."""
        first = np.array([members[0] for members in self.candidates])
        return np.where(self.solid, 0.0, 1.0 / self.nu[first])

    @cached_property
    def kin(self) -> np.ndarray:
        """Whether two different members are forms of one pool (S, S)."""
        same = self.candidate_of[:, None] == self.candidate_of[None, :]
        return same & ~np.eye(len(self.members), dtype=bool)

    @cached_property
    def sharing(self) -> np.ndarray:
        """Members that share a pool with others."""
        return np.flatnonzero(self.kin.any(axis=0))

    def index(self, name: str) -> int:
        """Index of a member by its name."""
        return [item.name for item in self.members].index(name)


def columns(table: np.ndarray, picked: np.ndarray) -> np.ndarray:
    """Some columns of a table whose columns are contiguous; the copy's are too."""
    return table.T[picked].T


def _prevailing(members: np.ndarray, q: np.ndarray) -> int:
    """A member that is present: all present forms of a pool share one slope, left-out ones may carry another."""
    for member in members:
        if np.isfinite(q[:, member]).any():
            return member
    return members[0]


@dataclass(frozen=True)
class Lines:
    """Lines of n samples: candidates' `alpha` (n, J) and `beta` (J,); members' `q` (n, S) and `slopes` (S,)."""

    system: System
    q: np.ndarray
    slopes: np.ndarray
    alpha: np.ndarray
    beta: np.ndarray
    log_total: np.ndarray

    def at(self, pe: np.ndarray) -> np.ndarray:
        """log a of every candidate at each sample's pe (n, J)."""
        return self.alpha + self.beta * pe[:, None]

    def forms(self, winner: np.ndarray) -> np.ndarray:
        """The member that names the winning candidate: the solid itself, or the largest form of the pool."""
        named = np.empty(len(winner), int)
        for j in np.unique(winner):
            rows = winner == j
            members = self.system.candidates[j]
            if len(members) == 1:
                named[rows] = members[0]
            else:
                named[rows] = members[self.q[np.ix_(rows, members)].argmax(axis=1)]
        return named

    def per_pH(self, environment: Environment) -> tuple[np.ndarray, np.ndarray]:
        """Change per pH at constant pe, temperature and totals: of each member's log m (n, S), of each line (n, J)."""
        target = self.system
        forms = np.tile(-target.protons[:, None], len(self.q)).T
        for c, channel in enumerate(target.channels):
            rate = environment.per_pH.get(channel)
            if rate is not None:
                uses = np.flatnonzero(target.counts[:, c])
                forms[:, uses] += target.counts[uses, c] * np.nan_to_num(rate)[:, None]
        lines = np.empty_like(self.alpha)
        for j, members in enumerate(target.candidates):
            first = members[0]
            if len(members) == 1:
                lines[:, j] = -forms[:, first] / target.nu[first]
            else:
                with np.errstate(invalid="ignore"):
                    whole = self.log_total - self.alpha[:, j]
                lines[:, j] = -mean_by_amount(columns(self.q, members), whole, columns(forms, members))
        return forms, lines


@lru_cache(maxsize=256)
def system(element: str, solids: str, with_names: tuple[str, ...] = (), without_names: tuple[str, ...] = ()) -> System:
    """The competition of an element with the chosen solids; see `data.select`."""
    return build(element, select(element, solids, with_names, without_names))


def build(element: str, members: Iterable[Species]) -> System:
    """A system from its species, in any order; ties are broken by the order given."""
    members = tuple(members)
    channels = tuple(sorted({channel for item in members for channel in item.others}))
    counts = np.array([[item.others.get(channel, 0) for channel in channels] for item in members], float)
    pools: dict[str, list[int]] = {}
    single: list[np.ndarray] = []
    for i, item in enumerate(members):
        if item.dissolved and item.nu == 1:
            pools.setdefault(item.oxidation_state, []).append(i)
        else:
            single.append(np.array([i]))
    candidates = tuple([np.array(found) for found in pools.values()] + single)
    return System(
        element=element, members=members, channels=channels, matrix=coefficients(members),
        slopes=np.array([-float(item.e) for item in members]), counts=counts.reshape(len(members), len(channels)),
        nu=np.array([float(item.nu) for item in members]), candidates=candidates,
        protons=np.array([float(item.h) for item in members]),
        solid=np.array([not members[found[0]].dissolved for found in candidates]),
        only_at_25=np.array([item.only_at_25 for item in members]),
    )  # fmt: skip
