"""What an element meets in the water: activities of ligand elements, as lines in pe that hold over an interval of pe.

Ligands are pools too and solved first. Carbonate and chloride keep one oxidation state. Sulfur stands as measured,
sulfate and sulfide side by side, or is tied by Eh: then each interval of pe has one sulfur state that takes the total,
solids keep their full dependence, and dissolved complexes with another state are left out there.
"""

from collections.abc import Collection, Mapping
from dataclasses import dataclass

import numpy as np

from gley.stability.data import FIXED, SULFUR, species
from gley.stability.water import coefficients, log_sum, pool, pool_terms


@dataclass(frozen=True)
class Environment:
    """Ligand activities log a = α + β pe by channel, valid for lo ≤ pe < hi (arrays of n samples).

    `state` says which state a tied ligand is in, for example `S(VI)`; NaN in `alpha` means absent or unknown.
    `fences` bound it on a chart: pairs of level (n,) and slope, and level + slope · pe ≤ 0 holds inside.
    """

    state: str
    alpha: Mapping[str, np.ndarray]
    beta: Mapping[str, float]
    lo: np.ndarray
    hi: np.ndarray
    left_out: frozenset[str] = frozenset()
    fences: tuple[tuple[np.ndarray, float], ...] = ()

    def take(self, rows: np.ndarray) -> "Environment":
        """The same for some of the samples."""
        alpha = {channel: level[rows] for channel, level in self.alpha.items()}
        fences = tuple((level[rows], slope) for level, slope in self.fences)
        return Environment(self.state, alpha, self.beta, self.lo[rows], self.hi[rows], self.left_out, fences)


def pool_line(channel: str, X: np.ndarray, total: np.ndarray) -> tuple[np.ndarray, float]:
    """α (n,) and β of the activity at which a channel's forms sum to its total; NaN where the total is 0 or unknown."""
    with np.errstate(divide="ignore", invalid="ignore"):
        level = np.log10(total) - log_sum(pool_terms(channel, X))
    return np.where(np.isfinite(level), level, np.nan), float(pool(channel)[0].e)


def environments(
    X: np.ndarray, totals: Mapping[str, np.ndarray], needed: Collection[str], tied: bool, sulfur_solid: bool
) -> list[Environment]:
    """Environments of n samples in order of rising pe.

    Parameters
    ----------
    X : ndarray (n, 7)
        Features.
    totals : mapping of channel to ndarray (n,)
        Totals in mol/L; NaN or 0 = not there. With `tied`, the channel `S` holds total sulfur.
    needed : collection of str
        Channels that somebody asks for; the others aren't worked out.
    tied : bool
        Sulfur tied by Eh instead of taken as measured.
    sulfur_solid : bool
        Whether elemental sulfur may take part when sulfur is tied.
    """
    alpha, beta = {}, {}
    for channel in (*FIXED, *(() if tied else SULFUR)):
        if channel in totals and channel in needed:
            alpha[channel], beta[channel] = pool_line(channel, X, totals[channel])
    n = len(X)
    always = (np.full(n, -np.inf), np.full(n, np.inf))
    if not tied or "S" not in totals or not SULFUR.keys() & needed:
        return [Environment("", alpha, beta, *always)]
    states = [(channel, *pool_line(channel, X, totals["S"])) for channel in SULFUR]
    if sulfur_solid:
        pure = -(X @ coefficients([species()["sulfur (rhombic)"]]))[:, 0]
        states.append(("S(0)", np.where(np.isfinite(states[0][1]), pure, np.nan), 0.0))
    found = []
    for name, level, slope in sorted(states, key=lambda state: -state[2]):
        fences = _fences(level, slope, [(a, b) for other, a, b in states if other != name])
        lo, hi = interval(fences, len(level))
        missing = np.isnan(level)
        lo, hi = np.where(missing, -np.inf, lo), np.where(missing, np.inf, hi)
        own_alpha, own_beta = {**alpha, **dict.fromkeys(SULFUR, level)}, {**beta, **dict.fromkeys(SULFUR, slope)}
        others = frozenset(channel for channel in SULFUR if channel != name)
        found.append(Environment(name, own_alpha, own_beta, lo, hi, others, fences))
    return found


def _fences(level: np.ndarray, slope: float, rivals: list[tuple[np.ndarray, float]]) -> tuple:
    """Where a line is the lowest: level − rival + (slope − rival's slope) pe ≤ 0 for every rival."""
    with np.errstate(invalid="ignore"):
        return tuple((level - other, slope - other_slope) for other, other_slope in rivals)


def interval(fences: tuple, n: int) -> tuple[np.ndarray, np.ndarray]:
    """Interval of pe inside all fences, for n samples; empty where lo ≥ hi. A fence of NaN is none."""
    lo, hi = np.full(n, -np.inf), np.full(n, np.inf)
    for level, slope in fences:
        if slope == 0:
            lo = np.where(level > 0, np.inf, lo)
            continue
        bound = -level / slope
        bound = np.where(np.isnan(bound), np.inf if slope > 0 else -np.inf, bound)
        if slope > 0:
            hi = np.minimum(hi, bound)
        else:
            lo = np.maximum(lo, bound)
    return lo, hi


def with_companion(
    environment: Environment, channel: str, alpha: np.ndarray, beta: np.ndarray, every: bool = False
) -> list[Environment]:
    """Split an environment by the winner of a companion metal: its lines α (n, J) and β (J,) become a channel.

    Without `every`, environments that are empty for all samples are left out.
    """
    found = []
    for j in range(len(beta)):
        rivals = [(alpha[:, i], float(beta[i])) for i in range(len(beta)) if i != j]
        fences = _fences(alpha[:, j], float(beta[j]), rivals)
        lo, hi = interval(fences, len(alpha))
        lo, hi = np.maximum(lo, environment.lo), np.minimum(hi, environment.hi)
        if every or (lo < hi).any():
            level = np.where(np.isfinite(alpha[:, j]), alpha[:, j], np.nan)
            state = f"{environment.state} {channel}{j}".strip()
            own_alpha = {**environment.alpha, channel: level}
            own_beta = {**environment.beta, channel: float(beta[j])}
            both = environment.fences + fences
            found.append(Environment(state, own_alpha, own_beta, lo, hi, environment.left_out, both))
    return found
